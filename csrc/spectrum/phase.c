#include "spectrum/phase.h"

#include <math.h>

#define HALF_PI 1.57079632679489661923

/* The nearest quarter is taken off, so that sine and cosine see small angles
 * and multiples of a quarter come out exact. */
double complex lbr_phase_at(double turns) {
  double quarters = rint(4 * turns);
  double rest = fma(-0.25, quarters, turns) * 4 * HALF_PI;
  double c = cos(rest), s = sin(rest);
  switch ((int)quarters & 3) {
    case 0: return CMPLX(c, -s);
    case 1: return CMPLX(-s, -c);
    case 2: return CMPLX(-c, s);
    default: return CMPLX(s, c);
  }
}

double complex lbr_phase_root(uint64_t k, uint64_t n) {
  return lbr_phase_at((double)k / (double)n);
}

double complex lbr_phase_product(double f, double m) {
  double turns = f * m, rest = fma(f, m, -turns);
  return lbr_phase_at(turns - rint(turns) + rest);
}
