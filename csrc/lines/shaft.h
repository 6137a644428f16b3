/* A shaft's angle from the times of its pulses, orders of it in a record, and
 * averages over its turns.
 *
 * Between pulses the angle is a cubic with the pulse's angles and slopes (a
 * slope is that of the parabola through a pulse and its neighbours), so that
 * steady speed and steady acceleration are met exactly.
 */
#ifndef LBR_LINES_SHAFT_H
#define LBR_LINES_SHAFT_H

#include <stddef.h>

#include "base/status.h"

#define LBR_ORDERS_MOST 64

typedef struct lbr_shaft {
  const double *pulse; /* times of pulses, samples from the record's first,
                          rising */
  size_t pulses;       /* 3 or more */
  double per_turn;     /* pulses in a turn */
} lbr_shaft;

/* LBR_DOMAIN unless the pulses are finite, rise, and are 3 or more. */
LBR_CHECKED lbr_status lbr_shaft_check(const lbr_shaft *shaft);

/* Turns since the first pulse at samples first .. first + n - 1, all of which
 * must lie between the first and the last pulse. */
void lbr_shaft_turns(const lbr_shaft *shaft, size_t first, size_t n,
                     double *turns);

typedef struct lbr_order {
  double amplitude;   /* peak, the samples' unit */
  double phase;       /* rad, of the cosine, at shaft angle 0: first pulse */
  double u_amplitude; /* standard uncertainties, from the residual */
  double u_phase;
} lbr_order;

/* Least squares fit of an offset and count orders (multiples of the shaft,
 * need not be whole) to n samples at the angles `turns`.  LBR_DOMAIN: fewer
 * than 2 count + 2 samples or orders that cannot be told apart; *which is then
 * the number of one, from 0. */
LBR_CHECKED lbr_status lbr_order_fit(const double *x, const double *turns,
                                     size_t n, const double *orders,
                                     size_t count, lbr_order *out,
                                     double *offset, double *rms,
                                     size_t *which);

/* Half width, in samples, of what an interpolated value is made of: a sinc
 * under a Kaiser window of beta 10, good to 1e-5 of a tone's amplitude up to
 * 0.4 of the rate. */
#define LBR_SHAFT_TAPS 24

/* The mean over whole turns of the record at `points` angles of a turn, from
 * the first turn that lies inside it on, and the standard deviation of the
 * turns at each angle (n - 1 in the denominator; 0 for one turn).  *turns is
 * their number.  LBR_DOMAIN: no whole turn lies LBR_SHAFT_TAPS inside. */
LBR_CHECKED lbr_status lbr_shaft_average(const lbr_shaft *shaft,
                                         const double *x, size_t n,
                                         size_t points, double *mean,
                                         double *deviation, size_t *turns);

#endif
