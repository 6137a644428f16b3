/* Wander: what a source becomes whose frequency moves sinusoidally, one period
 * per record: a carrier and pairs of sidebands, one bin apart, of amplitudes
 * |J_k(b)|.  How deep it wanders is not known, only the most: bounds here
 * hold for every index b from 0 to that.
 */
#ifndef LBR_READING_WANDER_H
#define LBR_READING_WANDER_H

#include <stdbool.h>
#include <stddef.h>

#define LBR_SIDEBANDS 48 /* orders that are followed, the carrier included */
#define LBR_DEPTHS 4     /* parts into which the depths are cut */

typedef struct lbr_wander {
  size_t count;   /* orders that count; 1: steady, the carrier alone */
  bool whole;     /* all further orders together are negligible */
  double carrier; /* least |J_0| at any depth */
  /* upper bounds of |J_k| for depths within each part */
  double most[LBR_DEPTHS][LBR_SIDEBANDS];
} lbr_wander;

/* index: most swing of the phase, rad, at least 0. */
void lbr_wander_of_index(double index, lbr_wander *out);

/* Upper bound of |J_k| at any depth. */
double lbr_wander_order(const lbr_wander *wander, size_t k);

/* Upper bound of sum_k |J_k| weight[k] at any one depth; weight: count. */
double lbr_wander_sum(const lbr_wander *wander, const double *weight);

#endif
