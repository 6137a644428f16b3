#include "filter/design.h"

#include <math.h>

#define PI 3.14159265358979323846

double lbr_design_ripple(double db) {
  return sqrt(expm1(db * (log(10.0) / 10.0)));
}

/* The angle of pair i of a response of this order, off the imaginary axis. */
static double pair_angle(int order, int i) {
  return PI * (2 * i + 1) / (2.0 * order);
}

/* Butterworth, S. (1930): poles evenly spaced on the unit circle. */
lbr_status lbr_design_butterworth(lbr_filter *f) {
  size_t n = 0;
  for (int i = 0; i < f->order / 2; i++) {
    double angle = pair_angle(f->order, i);
    f->pole[n++] = CMPLX(-sin(angle), cos(angle));
    f->pole[n++] = CMPLX(-sin(angle), -cos(angle));
  }
  if (f->order % 2) f->pole[n++] = -1.0;
  f->poles = n;
  f->zeros = 0;
  return LBR_OK;
}

/* Poles of 1 + e^2 T_n(w)^2, on an ellipse (Zverev, Handbook of Filter
 * Synthesis, 1967). */
lbr_status lbr_design_chebyshev(lbr_filter *f) {
  size_t n = 0;
  f->ripple = lbr_design_ripple(f->ripple_db);
  f->floor = pow(10.0, -f->ripple_db / 20.0);
  double bend = asinh(1.0 / f->ripple) / f->order;
  for (int i = 0; i < f->order / 2; i++) {
    double angle = pair_angle(f->order, i);
    double re = -sinh(bend) * sin(angle), im = cosh(bend) * cos(angle);
    f->pole[n++] = CMPLX(re, im);
    f->pole[n++] = CMPLX(re, -im);
  }
  if (f->order % 2) f->pole[n++] = -sinh(bend);
  f->poles = n;
  f->zeros = 0;
  for (int m = 0; m < f->order; m++)
    f->turn[m] = cos(PI * m / (2.0 * f->order));
  f->turn[f->order] = 0.0;
  return LBR_OK;
}
