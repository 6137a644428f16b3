/* Complex transforms of long records: rows and columns of a matrix that fit
 * the caches, on several threads.
 *
 *   X[k] = sum_j x[j] exp(-2 pi i k j / n),   n = n1 n2
 *
 * by n2 transforms of n1 points, twiddle factors, n1 transforms of n2 points
 * (Gentleman and Sande 1966; the "four-step" form, Bailey 1990, J.
 * Supercomputing 4, 23-35).  Short ones are one transform.
 */
#ifndef LBR_SPECTRUM_FOURIER_H
#define LBR_SPECTRUM_FOURIER_H

#include <complex.h>
#include <stddef.h>

#include "base/status.h"

typedef struct lbr_fourier lbr_fourier;

/* n: 1 .. LBR_TRANSFORM_MOST (LBR_DOMAIN), best a product of small primes;
 * workers: 0: one per core.  The object has its own workspace and runs one
 * transform at a time. */
LBR_CHECKED lbr_status lbr_fourier_new(size_t n, unsigned workers,
                                       lbr_fourier **out);
void lbr_fourier_free(lbr_fourier *fourier); /* NULL is fine */

/* From in to out, n values each, not the same memory; out from
 * lbr_transform_buffer.  weights: NULL, or 2 n numbers, one for each real and
 * imaginary part of the input (a window of a real record read as complex
 * pairs).  `in` survives. */
LBR_CHECKED lbr_status lbr_fourier_run(lbr_fourier *fourier,
                                       const double complex *in,
                                       const double *weights,
                                       double complex *out);

#endif
