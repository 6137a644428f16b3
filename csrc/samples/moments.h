/* How a run of samples is distributed: moments, percentiles, histograms.
 *
 * Sums are pairwise over runs of 128 samples in eight lanes, like those of
 * measure.h.  Samples that are not numbers make the figure not a number.
 */
#ifndef LBR_SAMPLES_MOMENTS_H
#define LBR_SAMPLES_MOMENTS_H

#include <stddef.h>

typedef struct lbr_moments {
  double mean;   /* of the samples, in their unit */
  double second; /* mean of (x - mean)^2 */
  double third;  /* mean of (x - mean)^3 */
  double fourth; /* mean of (x - mean)^4 */
} lbr_moments;

/* Central moments of n > 0 samples, in two passes; what rounding left in the
 * mean is taken out of the others. */
lbr_moments lbr_moments_of(const double *x, size_t n);

/* The sample that would stand at `rank` (0 .. n - 1) were x sorted.  Puts x in
 * another order: smaller samples come before place `rank`, larger ones behind.
 * x holds no nan; n > 0. */
double lbr_select(double *x, size_t n, size_t rank);

/* The value that `percent` (0 .. 100) of the samples lie below: linear between
 * the two order statistics at rank percent / 100 (n - 1) (definition 7 of
 * Hyndman and Fan, The American Statistician 50 (1996) 361).  Puts x in
 * another order; nan where a sample is nan; n > 0. */
double lbr_percentile(double *x, size_t n, double percent);

typedef struct lbr_tails {
  size_t below; /* samples < low */
  size_t above; /* samples > high */
  size_t odd;   /* samples that are not numbers */
} lbr_tails;

/* Adds to count[0 .. bins - 1] how many samples lie in equal bins over low to
 * high (finite, low < high, bins / (high - low) finite); a bin holds its lower
 * edge, the last one both.  Edges are where rounding puts them. */
void lbr_histogram(const double *x, size_t n, double low, double high,
                   double *count, size_t bins, lbr_tails *tails);

#endif
