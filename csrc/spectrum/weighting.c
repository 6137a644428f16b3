#include "spectrum/weighting.h"

#include <math.h>
#include <string.h>

/* Pole frequencies of Annex E, Hz, from f_L = 10^1.5, f_H = 10^3.9, f_A =
 * 10^2.45, f_r = 1000 and D = sqrt(1/2); tests/bands_spec.lua derives them. */
#define F1 20.598997057618316
#define F2 107.65264864304629
#define F3 737.8622307362901
#define F4 12194.217147998012

lbr_status lbr_weighting_of(const char *name, lbr_weighting *out) {
  static const char *const names[] = {"A", "C", "Z"};
  for (int i = 0; i < 3; i++)
    if (strcmp(name, names[i]) == 0) {
      *out = (lbr_weighting)i;
      return LBR_OK;
    }
  return LBR_UNKNOWN;
}

/* Not yet 1 at 1 kHz. */
static double raw_c(double f2) {
  return F4 * F4 * f2 / ((f2 + F1 * F1) * (f2 + F4 * F4));
}

static double raw_a(double f2) {
  return raw_c(f2) * f2 / sqrt((f2 + F2 * F2) * (f2 + F3 * F3));
}

double lbr_weighting_gain(lbr_weighting weighting, double hz) {
  double f2 = hz * hz;
  if (weighting == LBR_WEIGHTING_A) return raw_a(f2) / raw_a(1e6);
  if (weighting == LBR_WEIGHTING_C) return raw_c(f2) / raw_c(1e6);
  return 1;
}

void lbr_weigh_powers(lbr_weighting weighting, const double *power, size_t n,
                      double step_hz, double *out) {
  for (size_t k = 0; k < n; k++) {
    double gain = lbr_weighting_gain(weighting, (double)k * step_hz);
    out[k] = power[k] * gain * gain;
  }
}
