#include "spectrum/calculus.h"

#include <math.h>

#define PI 3.14159265358979323846

static double share_of(const lbr_calculus *c, double hz) {
  if (hz <= c->low || hz > c->high) return 0;
  if (hz >= c->full) return 1;
  return 0.5 - 0.5 * cos(PI * (hz - c->low) / (c->full - c->low));
}

/* (2 pi hz)^times, without the power of i. */
static double power_of(double hz, int times) {
  double factor = 1, w = 2 * PI * hz;
  for (int i = 0; i < (times < 0 ? -times : times); i++) factor *= w;
  return times < 0 ? 1 / factor : factor;
}

void lbr_calculus_apply(const lbr_calculus *c, double complex *bins,
                        size_t n) {
  static const double turn[4][2] = {{1, 0}, {0, 1}, {-1, 0}, {0, -1}};
  const double *t = turn[c->times & 3];
  double complex i_power = CMPLX(t[0], t[1]);
  for (size_t k = 0; k <= n / 2; k++) {
    double hz = c->rate * (double)k / (double)n, share = share_of(c, hz);
    if (share > 0)
      bins[k] *= i_power * (share * power_of(hz, c->times));
    else
      bins[k] = 0;
  }
  if (n % 2 == 0 && c->times & 1) bins[n / 2] = 0;
}
