/* Orders of a driver whose speed follows straight lines between points.
 *
 *   x[n] = sum over orders of  amplitude (f[n] / reference)^power
 *                              cos(2 pi times turns[n] + phase)
 *
 * where f is the speed and turns[n] its integral from the first point.  Before
 * the first and after the last point the speed stays as it is there.  Turns
 * are kept in 64 bits of mantissa, below 1e-9 turns of error for 1e10 turns, at
 * multiples of LBR_SPREAD_BLOCK and at the points; the samples between follow
 * in doubles.
 */
#ifndef LBR_SYNTH_PROFILE_H
#define LBR_SYNTH_PROFILE_H

#include "synth/spread.h"

typedef struct lbr_knot {
  double at;         /* sample number, increasing */
  double speed;      /* turns per sample, >= 0 */
  long double turns; /* since the first knot; set by lbr_profile_set */
} lbr_knot;

typedef struct lbr_order {
  double times;     /* cycles per turn of the driver, >= 0 */
  double amplitude; /* peak, any unit, at the reference speed */
  double phase;     /* at the first knot, rad, |phase| < 1e9 */
  double power;     /* how the amplitude follows the speed; 0: not */
} lbr_order;

typedef struct lbr_profile {
  const lbr_knot *knots; /* n_knots > 0 */
  size_t n_knots;
  const lbr_order *orders; /* n_orders */
  size_t n_orders;
  double reference; /* speed, turns per sample, > 0 */
} lbr_profile;

/* Fills in the turns; LBR_DOMAIN where a field of a knot is out of range. */
LBR_CHECKED lbr_status lbr_profile_set(lbr_knot *knots, size_t n);

/* LBR_DOMAIN where an order or the reference is out of range. */
LBR_CHECKED lbr_status lbr_profile_check(const lbr_profile *profile);

/* An lbr_adder; `profile` points to a checked lbr_profile. */
void lbr_profile_add(const void *profile, int64_t first, double *out,
                     size_t n);

/* Turns since the first knot and speed (turns per sample) at sample t. */
long double lbr_profile_turns(const lbr_profile *profile, long double t,
                              double *speed);

#endif
