/* One stage of thinning out: a running mean of `by` samples, `times` over,
 * and every by-th of its output.  Private to this room.
 */
#ifndef LBR_SPECTRUM_THIN_H
#define LBR_SPECTRUM_THIN_H

#include <complex.h>
#include <stddef.h>

#include "base/status.h"

typedef struct lbr_thin {
  size_t by, times, taps; /* taps = times (by - 1) + 1 */
  double shift;           /* the band's centre, cycles/sample, goes to 0 */
  double *re, *im;        /* taps values, in the order of the samples; im NULL
                           * where the shift is 0 */
} lbr_thin;

/* A stage by which what folds into |nu| <= half cycles per sample is below
 * 1e-15; half * by <= 1/8.  Frees nothing on failure: lbr_thin_free does. */
LBR_CHECKED lbr_status lbr_thin_make(lbr_thin *thin, size_t by, double half,
                                     double shift);
void lbr_thin_free(lbr_thin *thin);

/* Samples that come of n. */
size_t lbr_thin_count(const lbr_thin *thin, size_t n);

/* Outputs from .. from + count - 1 of real samples: sum_j h[j] x[q - j]
 * exp(-2 pi i shift (q - j)), q = m by, but for the factor
 * exp(-2 pi i shift q), which is the caller's. */
void lbr_thin_real(const lbr_thin *thin, const double *x, size_t n,
                   size_t from, size_t count, double *re, double *im);

/* One part of complex samples by a stage without shift. */
void lbr_thin_part(const lbr_thin *thin, const double *x, size_t n,
                   size_t from, size_t count, double *out);

/* The response at nu cycles per sample from the centre; 1 there. */
double complex lbr_thin_response(const lbr_thin *thin, double nu);

#endif
