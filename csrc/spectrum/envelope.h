/* A band of a record as an analytic signal, and its envelope.
 *
 * The band is cut out of the transform of the whole record by sharp edges (both
 * included) and the negative frequencies are dropped (D. Gabor, "Theory of
 * communication", 1946); 0 Hz and half the rate, where they lie inside, count
 * once and have no quadrature part.  The record is taken as one period.
 */
#ifndef LBR_SPECTRUM_ENVELOPE_H
#define LBR_SPECTRUM_ENVELOPE_H

#include "spectrum/transform.h"

/* re: the record, points values; gets the in-phase part; im gets the
 * quadrature part; low, high in cycles per sample, 0 <= low <= high <= 1/2.
 * bins, spare: points / 2 + 1 values.  All from lbr_transform_buffer.
 * LBR_DOMAIN: edges out of range or no bin between them. */
LBR_CHECKED lbr_status lbr_analytic(const lbr_transform *transform, double low,
                                    double high, double *re, double *im,
                                    double complex *bins,
                                    double complex *spare);

/* out[i] = sqrt(re^2 + im^2) */
void lbr_magnitudes(const double *re, const double *im, size_t n, double *out);

#endif
