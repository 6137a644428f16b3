/* Spectral kurtosis: which frequencies are impulsive.
 *
 * From the powers P of K independent segments, bin by bin:
 *   plain     K sum P^2 / (sum P)^2 - 2          mean -2 / (K + 1) for noise
 *   unbiased  K / (K - 1) ((K + 1) sum P^2 / (sum P)^2 - 2)     mean 0
 * for stationary Gaussian noise (V. D. Vrabie, P. Granjon and C. Serviere,
 * "Spectral kurtosis: from definition to application", 2003); a steady tone has
 * -1, impulses are above 0.  Variance of the unbiased one for noise:
 * 4 K^2 / ((K - 1) (K + 2) (K + 3)) (G. M. Nita and D. E. Gary, "The
 * generalized spectral kurtosis estimator", 2010).  All this holds for complex
 * bins: the first and, for even lengths, the last bin are real and have other
 * figures.
 */
#ifndef LBR_SPECTRUM_KURTOSIS_H
#define LBR_SPECTRUM_KURTOSIS_H

#include <stdbool.h>

#include "spectrum/transform.h"

/* Adds a segment: sum[k] += P, squares[k] += P^2.  x: as many samples as the
 * transform has points; w: its window; scratch, bins from
 * lbr_transform_buffer. */
void lbr_kurtosis_add(const lbr_transform *transform, const double *x,
                      const double *w, double *scratch, double complex *bins,
                      double *sum, double *squares);

/* out[k] from the sums of `segments` segments; nan where a bin never had power.
 * LBR_DOMAIN: fewer than 2 segments. */
LBR_CHECKED lbr_status lbr_kurtosis_of(const double *sum, const double *squares,
                                       size_t bins, size_t segments,
                                       bool unbiased, double *out);

#endif
