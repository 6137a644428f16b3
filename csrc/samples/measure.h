/* Figures of a run of samples.
 *
 * Sums are pairwise over runs of 128 samples, each run in eight lanes: the
 * rounding error grows with log n, and the bits are the same on every
 * processor.  Samples that are not numbers make the figure not a number.
 */
#ifndef LBR_SAMPLES_MEASURE_H
#define LBR_SAMPLES_MEASURE_H

#include <stddef.h>

/* sum x[i]; 0 for n = 0. */
double lbr_sum(const double *x, size_t n);

/* sum x[i] y[i]; 0 for n = 0. */
double lbr_dot(const double *x, const double *y, size_t n);

/* sqrt(mean of squares), n > 0; squares out of a double's range are met by
 * scaling. */
double lbr_rms(const double *x, size_t n);

/* Smallest, largest and largest |x|, n > 0. */
typedef struct lbr_extremes {
  double least, most, peak;
} lbr_extremes;

lbr_extremes lbr_extremes_of(const double *x, size_t n);

#endif
