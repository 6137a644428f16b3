/* Least squares fits of one sine wave and an offset, with three parameters
 * (known frequency) and with four (IEEE Std 1057-2017, clause on sine-wave
 * fits: the four-parameter fit repeats the three-parameter one with a column
 * for the frequency).
 *
 *   x[n] = amplitude cos(2 pi frequency t + phase) + offset
 *
 * t counts samples from the record's centre.  All inner products of columns
 * are closed sums, so a round of the iteration is one pass over the samples.
 */
#ifndef LBR_LINES_SINE_H
#define LBR_LINES_SINE_H

#include <stddef.h>

#include "base/status.h"

#define LBR_SINE_LEAST 8 /* samples that a fit needs */

/* Standard uncertainties are those of least squares with independent errors
 * of equal variance, estimated from the residual: rms^2 n / (n - 3 or 4). */
typedef struct lbr_sine {
  double amplitude;     /* peak, the samples' unit, 0 or more */
  double frequency;     /* cycles per sample */
  double phase;         /* rad, of the cosine, at the centre of the record */
  double start_phase;   /* the same at the first sample, -pi .. pi */
  double offset;        /* the samples' unit */
  double rms;           /* of the residual: noise and distortion */
  double u_amplitude, u_frequency, u_phase, u_start_phase, u_offset;
  double rounds;        /* of the iteration; 0 when the frequency is known */
} lbr_sine;

/* Frequency known: 0 < f mod 1 < 1, not 1/2, else LBR_DOMAIN; also for fewer
 * than LBR_SINE_LEAST samples or samples that are not finite. */
LBR_CHECKED lbr_status lbr_sine_fit3(const double *x, size_t n, double f,
                                     lbr_sine *out);

/* Frequency fitted too, from a start within about half a bin of it.
 * LBR_NO_CONVERGE: the iteration left the start by more than 1.5 bins or did
 * not settle to steps of 1e-8 bins in 60 rounds. */
LBR_CHECKED lbr_status lbr_sine_fit4(const double *x, size_t n, double start,
                                     lbr_sine *out);

/* A place to look for the strongest line of records of n samples. */
typedef struct lbr_finder lbr_finder;

LBR_CHECKED lbr_status lbr_finder_new(size_t n, lbr_finder **out);
void lbr_finder_free(lbr_finder *finder); /* NULL is fine */

/* Cycles per sample of the strongest line between 0 and 1/2: the highest bin
 * of the transform (0 and 1/2 left out) and its neighbours, by the ratio of
 * Hann-windowed bins; below five cycles the best of a grid of fits. */
double lbr_finder_run(lbr_finder *finder, const double *x);

/* count records of n samples, one after the other, each fitted with four
 * parameters on its own; starts NULL: found.  out[i].rounds is NAN where a
 * record has no fit, and all its values are.  workers 0: one per core. */
LBR_CHECKED lbr_status lbr_sine_batch(const double *x, size_t n, size_t count,
                                      const double *starts, unsigned workers,
                                      lbr_sine *out);

#endif
