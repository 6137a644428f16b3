/* Tones whose frequency runs from one value to another, once or for ever.
 *
 * With u the time since the start and L the length of a pass, in samples:
 *   linear       f(u) = from + (to - from) u / L
 *   exponential  f(u) = from (to / from)^(u / L)
 * and phase(u) is the integral of f.  Phases are kept in 64 bits of mantissa:
 * below 1e-9 cycles of error for passes of up to 1e10 cycles.
 */
#ifndef LBR_SYNTH_CHIRP_H
#define LBR_SYNTH_CHIRP_H

#include <stdbool.h>

#include "synth/spread.h"

typedef struct lbr_chirp {
  double amplitude;  /* peak, any unit */
  double phase;      /* of the cosine at the start, rad */
  double from, to;   /* frequency at both ends of a pass, cycles per sample */
  double start;      /* when the first pass starts, samples */
  double length;     /* of a pass, samples, > 0 */
  double fade;       /* raised-cosine rise and fall of a single pass, samples,
                        0 .. length / 2 */
  bool exponential;  /* from and to must be > 0 */
  bool repeats;      /* one pass after the other without a jump of phase,
                        before `start` as well; else silence outside the pass */
  bool back;         /* with repeats: every other pass runs backwards */
} lbr_chirp;

/* LBR_DOMAIN where a field is out of range. */
LBR_CHECKED lbr_status lbr_chirp_check(const lbr_chirp *chirp);

/* An lbr_adder; `chirp` points to a checked lbr_chirp. */
void lbr_chirp_add(const void *chirp, int64_t first, double *out, size_t n);

#endif
