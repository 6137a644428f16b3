/* Coherence: which record durations put every line onto a bin, and which
 * (divider, length) pairs of a clock last that long.
 *
 * A line f is on a bin exactly when f T is whole, T = N / rate; so coherence
 * is a matter of durations alone.  They are found line by line (the lowest
 * first) as intervals, and each interval is then a run of whole numbers
 * M = N D of clock periods to be split into a divider and a length.
 */
#ifndef LBR_PLAN_COHERENT_H
#define LBR_PLAN_COHERENT_H

#include <stddef.h>
#include <stdint.h>

#include "base/fraction.h"
#include "base/status.h"

typedef struct lbr_span {
  double from, to; /* durations, s, inclusive */
} lbr_span;

typedef struct lbr_spans {
  lbr_span *item; /* ascending, disjoint */
  size_t count, room;
} lbr_spans;

void lbr_spans_free(lbr_spans *spans);

/* The shortest duration in which every frequency makes whole cycles,
 * 1 / gcd, exactly.  LBR_OVERFLOW where it does not fit 64 bits. */
LBR_CHECKED lbr_status lbr_coherent_period(const lbr_fraction *hz, size_t n,
                                           lbr_fraction *seconds);

/* All durations in [from, to] at which every hz[i] * T is within `off` of a
 * whole number (0 < off < 0.5).  hz ascending and > 0.  `period`: a duration
 * in which all of them make whole cycles, so that the pattern repeats; 0 when
 * none is known.  LBR_OVERFLOW when there are more than a few million. */
LBR_CHECKED lbr_status lbr_coherent_spans(const double *hz, size_t n,
                                          double off, double period,
                                          double from, double to,
                                          lbr_spans *spans);

typedef struct lbr_grid { /* what a clocked digitizer can do */
  double clock;               /* Hz */
  uint32_t divider_least, divider_most;
  uint64_t samples_least, samples_most;
  double most_duration;       /* s; may be INFINITY */
} lbr_grid;

typedef struct lbr_pair_demand {
  const double *line; /* Hz, n_lines, ascending */
  size_t n_lines;
  double off;         /* most distance of a line from its bin, bins */
  double period;      /* lbr_coherent_period of the lines, s; 0: unknown */
  const double *away; /* interferers, Hz, n_away */
  size_t n_away;
  double bins;        /* their folds stand more than this off every line */
} lbr_pair_demand;

typedef struct lbr_setting {
  uint32_t divider;
  uint32_t samples;
} lbr_setting;

/* By divider, then by samples, in pieces: fresh memory is dearer than the
 * search, so they are only joined when somebody asks. */
typedef struct lbr_settings {
  struct lbr_settings_piece {
    lbr_setting *item;
    size_t count, room;
  } *piece;
  size_t pieces;
  size_t count; /* of all pieces together */
} lbr_settings;

void lbr_settings_free(lbr_settings *settings);

/* Copies all of them to `out`, which has room for settings->count. */
void lbr_settings_join(const lbr_settings *settings, lbr_setting *out);

/* Every (divider, samples) that keeps the lines below half the rate, on their
 * bins, and the folded interferers away.  `workers`: as in lbr_workers_run. */
LBR_CHECKED lbr_status lbr_coherent_settings(const lbr_grid *grid,
                                             const lbr_pair_demand *demand,
                                             unsigned workers,
                                             lbr_settings *out);

#endif
