/* The two readings of a line, several lines of one record in one call.
 *
 *   amplitude = 2 |sum_n w[n] x[n] exp(-2 pi i f t_n)| / sum w
 *
 * at a fixed frequency (lo == hi), or at the frequency of the search interval
 * [lo, hi] where this is largest, ends included, found to convergence.  The
 * interval is searched on a grid so fine that the highest point lies on the
 * lobe of a grid maximum that is refined; all grid maxima that could hold it
 * are.  Frequencies are in cycles per sample and may lie beyond 1/2: a record
 * is the same at f and f + 1, so a line of a higher zone is read at its true
 * frequency.
 */
#ifndef LBR_LINES_TRACKER_H
#define LBR_LINES_TRACKER_H

#include <stddef.h>

#include "base/status.h"

typedef struct lbr_search {
  double lo, hi; /* cycles per sample, lo <= hi; equal: a fixed frequency */
} lbr_search;

typedef struct lbr_measured {
  double amplitude; /* peak, in the record's unit */
  double frequency; /* cycles per sample, within its search interval */
  double phase;     /* rad, of the cosine, at the centre of the record */
} lbr_measured;

typedef struct lbr_tracker lbr_tracker;

/* A tracker for records of n samples with window w (n samples, copied; its sum
 * must not vanish) and count searches (copied).  It holds all its workspace
 * and belongs to one thread at a time.  LBR_DOMAIN: n < 4, a window sum that
 * vanishes, or an interval that is not finite, not in order, or wider than
 * one cycle per sample. */
LBR_CHECKED lbr_status lbr_tracker_new(const double *w, size_t n,
                                       const lbr_search *searches,
                                       size_t count, lbr_tracker **out);
void lbr_tracker_free(lbr_tracker *tracker); /* NULL is fine */

/* Reads every line of record x (n samples) into tones (count). */
void lbr_tracker_run(lbr_tracker *tracker, const double *x,
                     lbr_measured *tones);

#endif
