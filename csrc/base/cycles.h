/* Sine and cosine of angles counted in cycles, written so that compilers turn
 * loops over it into vector code: no branches, no calls, no tables.  The same
 * bits on every processor (no fused steps, fixed order).
 */
#ifndef LBR_BASE_CYCLES_H
#define LBR_BASE_CYCLES_H

#include <stdint.h>
#include <string.h>

/* Adding it rounds |x| < 2^51 to an integer, left in the low mantissa bits. */
#define LBR_ROUNDER 0x1.8p52

static inline uint64_t lbr_bits_of(double x) {
  uint64_t bits;
  memcpy(&bits, &x, sizeof bits);
  return bits;
}

static inline double lbr_of_bits(uint64_t bits) {
  double x;
  memcpy(&x, &bits, sizeof x);
  return x;
}

/* x minus the nearest integer, |x| < 2^51; exact. */
static inline double lbr_fraction_part(double x) {
  return x - ((x + LBR_ROUNDER) - LBR_ROUNDER);
}

/* *c = cos(2 pi x), *s = sin(2 pi x), |x| < 2^49; absolute error below 3e-16
 * for the x given (the Taylor polynomials on a quarter cycle end below 1e-16).
 */
static inline void lbr_cos_sin_cycles(double x, double *c, double *s) {
  double shifted = 4 * x + LBR_ROUNDER;
  uint64_t quarter = lbr_bits_of(shifted);
  double y = (4 * x - (shifted - LBR_ROUNDER)) * 0x1.921fb54442d18p0;
  double z = y * y;
  double sine =
      y + y * (z * (-1.0 / 6 +
                    z * (1.0 / 120 +
                         z * (-1.0 / 5040 +
                              z * (1.0 / 362880 +
                                   z * (-1.0 / 39916800 +
                                        z * (1.0 / 6227020800.0 +
                                             z * (-1.0 /
                                                  1307674368000.0))))))));
  double tail =
      z * z * (1.0 / 24 +
               z * (-1.0 / 720 +
                    z * (1.0 / 40320 +
                         z * (-1.0 / 3628800 +
                              z * (1.0 / 479001600 +
                                   z * (-1.0 / 87178291200.0 +
                                        z * (1.0 / 20922789888000.0)))))));
  double half = 0.5 * z, head = 1 - half;
  double cosine = head + (((1 - head) - half) + tail);
  uint64_t swap = 0 - (quarter & 1);
  uint64_t bc = lbr_bits_of(cosine), bs = lbr_bits_of(sine);
  uint64_t rc = (bc & ~swap) | (bs & swap), rs = (bs & ~swap) | (bc & swap);
  *c = lbr_of_bits(rc ^ (((quarter + 1) & 2) << 62));
  *s = lbr_of_bits(rs ^ ((quarter & 2) << 62));
}

#endif
