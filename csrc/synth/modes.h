/* Damped modes struck by impulses: decays, impact series, damaged bearings.
 *
 *   x[n] = sum over hits and modes of  strength amplitude
 *          exp(-decay d) sin(2 pi cycles d + phase),   d = n - at >= 0
 *
 * A hit is forgotten once it has decayed by exp(-40), 4e-18.  Samples are made
 * in blocks that start at multiples of LBR_SPREAD_BLOCK: the state at the
 * start of a block is summed over the hits anew, inside it is rotated, so that
 * x[n] has the same bits whatever is asked for around it.
 */
#ifndef LBR_SYNTH_MODES_H
#define LBR_SYNTH_MODES_H

#include "synth/spread.h"

typedef struct lbr_mode {
  double amplitude; /* peak per unit of strength */
  double cycles;    /* damped frequency, cycles per sample, >= 0 */
  double decay;     /* nepers per sample, > 0 */
  double phase;     /* of the sine when struck, rad, |phase| < 1e9 */
} lbr_mode;

typedef struct lbr_struck {
  const lbr_mode *modes; /* n_modes */
  size_t n_modes;
  const double *at;       /* n_hits instants, samples, not decreasing */
  const double *strength; /* n_hits strengths */
  size_t n_hits;
} lbr_struck;

/* LBR_DOMAIN where a field is out of range. */
LBR_CHECKED lbr_status lbr_struck_check(const lbr_struck *struck);

/* An lbr_adder; `struck` points to a checked lbr_struck. */
void lbr_struck_add(const void *struck, int64_t first, double *out, size_t n);

#endif
