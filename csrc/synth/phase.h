/* Phases modulo one cycle in 128-bit fixed point: exact at any sample number.
 */
#ifndef LBR_SYNTH_PHASE_H
#define LBR_SYNTH_PHASE_H

#include <math.h>
#include <stdint.h>

/* A share of a cycle, in units of 2^-128 cycles; wraps as phases do. */
__extension__ typedef unsigned __int128 lbr_turn;

/* x modulo 1, exact for |x| >= 2^-75 or so, else rounded to 2^-128. */
static inline lbr_turn lbr_turn_of(double x) {
  int exponent;
  double mantissa = frexp(fabs(x), &exponent);
  lbr_turn whole = (uint64_t)(mantissa * 0x1p53), turn = 0;
  int shift = exponent - 53 + 128;
  if (shift >= 0 && shift < 128) turn = whole << shift;
  if (shift < 0 && shift > -64) turn = ((whole >> (-shift - 1)) + 1) >> 1;
  return x < 0 ? 0 - turn : turn;
}

/* rad to cycles modulo 1; the quotient is kept to 64 bits of mantissa. */
static inline lbr_turn lbr_turn_of_radians(double x) {
  long double cycles = (long double)x / 6.283185307179586476925286766559L;
  long double part = cycles - rintl(cycles);
  double high = (double)part;
  return lbr_turn_of(high) + lbr_turn_of((double)(part - (long double)high));
}

/* In cycles, [-1/2, 1/2], rounded to 2^-54. */
static inline double lbr_turn_cycles(lbr_turn turn) {
  return (double)(int64_t)(uint64_t)(turn >> 64) * 0x1p-64;
}

#endif
