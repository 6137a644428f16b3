/* Chances of noise: the chi-square law of averaged spectra, and the threshold
 * over a floor that was itself estimated from noise.
 */
#ifndef LBR_LINES_CHANCE_H
#define LBR_LINES_CHANCE_H

#include <stddef.h>

#include "base/status.h"

/* Regularised upper incomplete gamma function Q(a, x), a > 0, x >= 0:
 * relative error below 1e-13 for a up to 1e4. */
double lbr_gamma_upper(double a, double x);

/* The chance that a chi-square variable with nu degrees of freedom, divided by
 * nu, exceeds y; and the y that it exceeds with chance p, 0 < p < 1. */
double lbr_chi_square_above(double nu, double y);
double lbr_chi_square_level(double nu, double p);

/* The factor over a local floor that noise exceeds with chance p.  The floor
 * is the median of `cells` independent powers (need not be whole, 3 or more)
 * divided by the median of their law; the power tested and the cells have nu
 * degrees of freedom.  In the limit of many cells this is
 * lbr_chi_square_level(nu, p). */
double lbr_floor_factor(double nu, double cells, double p);

#endif
