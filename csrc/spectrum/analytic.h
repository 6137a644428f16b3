/* The quadrature of a record: what turns it into its analytic signal.
 */
#ifndef LBR_SPECTRUM_ANALYTIC_H
#define LBR_SPECTRUM_ANALYTIC_H

#include <stddef.h>

#include "base/status.h"

/* out[i]: x with every line turned back by a quarter turn (the discrete
 * Hilbert transform over n samples, taken as a period); x + i out is the
 * analytic signal.  1 <= n <= LBR_TRANSFORM_MOST; out may be x. */
LBR_CHECKED lbr_status lbr_quadrature(const double *x, size_t n, double *out);

#endif
