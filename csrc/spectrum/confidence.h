/* What an averaged spectrum is worth: effective averages, degrees of freedom,
 * confidence limits, random errors.
 */
#ifndef LBR_SPECTRUM_CONFIDENCE_H
#define LBR_SPECTRUM_CONFIDENCE_H

#include <stddef.h>

#include "base/status.h"

/* Averages of independent segments that scatter as `segments` overlapping
 * ones do: K / (1 + 2 sum_{j < K} (1 - j / K) rho_j^2), where rho_j is the
 * correlation of the window w (n values) with itself j steps later.
 * Welch 1967 (IEEE Trans. AU-15, 70-73), equations 13 ff; Harris 1978,
 * equation 18.  n, step, segments >= 1. */
double lbr_effective_averages(const double *w, size_t n, size_t step,
                              size_t segments);

/* The share p (0 < p < 1) of a chi-square distribution with dof > 0 degrees
 * of freedom (any real number) lies below *out.  LBR_DOMAIN for other
 * arguments, LBR_NO_CONVERGE should the search not settle. */
LBR_CHECKED lbr_status lbr_chi_square_quantile(double dof, double p,
                                               double *out);

/* The regularised incomplete gamma function P(a, x), a > 0, x >= 0; *upper
 * becomes 1 - P without the loss of a subtraction. */
double lbr_gamma_share(double a, double x, double *upper);

/* The median of n powers of noise (two degrees of freedom each) over their
 * mean, n >= 1 and real: sum_{l <= n} (-1)^(l + 1) / l for odd n (Allen,
 * Anderson, Brady, Brown, Creighton 2012, Phys. Rev. D 85, 122006, appendix
 * B), continued as ln 2 + (psi(n / 2 + 1) - psi((n + 1) / 2)) / 2. */
double lbr_median_bias(double n);

#endif
