/* Averages of the spectra of overlapping segments, of one or many channels,
 * with all cross spectra if they are wanted.
 *
 * Samples are fed in blocks of any size.  Segments are put together in groups
 * whose size depends on the length of a segment alone, groups are added in
 * order: the sums have the same bits for any block size and any number of
 * workers.  Results may be looked at between blocks.
 *
 * Powers are bare: |X[k]|^2 of the transform of w[n] x[n], k = 0 .. bins - 1,
 * bins = points / 2 + 1.  Scaling to lines or densities is the caller's.
 */
#ifndef LBR_SPECTRUM_AVERAGE_H
#define LBR_SPECTRUM_AVERAGE_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/status.h"
#include "samples/feed.h"
#include "spectrum/segment.h"

#define LBR_AVERAGE_MOST_CHANNELS 1024
#define LBR_MEDIAN_MOST ((size_t)1 << 28) /* powers a median keeps at most */

typedef enum lbr_averaging {
  LBR_AVERAGE_MEAN,   /* arithmetic mean of the powers */
  LBR_AVERAGE_MEDIAN, /* their median; keeps all of them */
  LBR_AVERAGE_PEAK,   /* the largest of them */
  LBR_AVERAGE_KINDS
} lbr_averaging;

typedef struct lbr_average_setting {
  size_t length;       /* samples in a segment, 1 or more */
  size_t step;         /* samples from segment to segment, 1 .. length */
  size_t points;       /* of a transform, zeros added; length or more */
  size_t channels;     /* 1 .. LBR_AVERAGE_MOST_CHANNELS */
  const double *window; /* length values; copied */
  lbr_detrend detrend; /* taken from every segment */
  lbr_averaging kind;
  bool cross;          /* the cross spectra too (mean alone) */
  unsigned workers;    /* threads; 0: one per core */
} lbr_average_setting;

typedef struct lbr_average lbr_average;

/* LBR_DOMAIN: a setting outside what is said above. */
LBR_CHECKED lbr_status lbr_average_new(const lbr_average_setting *setting,
                                       lbr_average **out);
void lbr_average_free(lbr_average *average); /* NULL is fine */

/* Appends count samples of the feed from number `first` (from 0), from its
 * channels channel[0 .. channels - 1].  After a failure the average is of no
 * more use: LBR_STOPPED from then on. */
LBR_CHECKED lbr_status lbr_average_feed(lbr_average *average,
                                        const lbr_feed *feed,
                                        const int *channel, int64_t first,
                                        int64_t count);

/* What is fed from now on does not follow what was fed before: no segment
 * reaches across.  Samples after the last whole segment are left out. */
LBR_CHECKED lbr_status lbr_average_break(lbr_average *average);

/* Samples fed since the last break, and whole segments in all. */
int64_t lbr_average_samples(const lbr_average *average);
size_t lbr_average_segments(const lbr_average *average);
size_t lbr_average_bins(const lbr_average *average);

/* Averaged power of a channel into bins values.  LBR_INFEASIBLE: no whole
 * segment yet. */
LBR_CHECKED lbr_status lbr_average_power(lbr_average *average, size_t channel,
                                         double *out);

/* Mean of conj(X) Y, X of channel `from`, Y of channel `to`, from != to, into
 * bins values.  LBR_DOMAIN where cross spectra were not asked for. */
LBR_CHECKED lbr_status lbr_average_cross(lbr_average *average, size_t from,
                                         size_t to, double complex *out);

#endif
