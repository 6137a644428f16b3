/* Harmonic and interharmonic groups of a mains spectrum: IEC 61000-4-7:2002
 * with Amendment 1:2008, clause 5.6 and Annex A (from memory of the text).
 *
 * The window holds a whole number N of mains cycles (10 at 50 Hz, 12 at 60 Hz),
 * so that harmonic h lies on line h N.  With C^2 the squared rms of a line:
 *   group of h         C^2[hN - N/2] / 2 + sum_{|i| < N/2} C^2[hN + i]
 *                      + C^2[hN + N/2] / 2
 *   subgroup of h      sum_{|i| <= 1} C^2[hN + i]
 *   between h and h+1  sum_{i = 1 .. N-1} C^2[hN + i]      (group)
 *                      sum_{i = 2 .. N-2} C^2[hN + i]      (centred subgroup)
 */
#ifndef LBR_SPECTRUM_GROUPS_H
#define LBR_SPECTRUM_GROUPS_H

#include <stddef.h>

#include "base/status.h"

typedef struct lbr_groups {
  double *group;       /* of harmonics 1 .. orders: squared rms */
  double *subgroup;    /* of harmonics 1 .. orders */
  double *inter;       /* between harmonics h and h + 1, h = 0 .. orders - 1 */
  double *inter_centred;
} lbr_groups;

/* power: squared rms of lines 0 .. bins - 1; cycles: N, even, 4 or more; each
 * result has `orders` values.  LBR_DOMAIN: a line that is needed is not there
 * (the last is orders N + N / 2). */
LBR_CHECKED lbr_status lbr_groups_of(const double *power, size_t bins,
                                     size_t cycles, size_t orders,
                                     const lbr_groups *out);

#endif
