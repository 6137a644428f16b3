/* Symmetric positive definite systems as normal equations make them: small,
 * dense, stored by rows with `width` numbers a row; the lower triangle counts.
 */
#ifndef LBR_LINES_NORMAL_H
#define LBR_LINES_NORMAL_H

#include <stddef.h>

#include "base/status.h"

/* What a pivot may lose of its diagonal before columns count as one: below it
 * half of a double's digits are left. */
#define LBR_NORMAL_LEAST 1e-10

/* g becomes its Cholesky factor.  LBR_DOMAIN: column *column is, but for a
 * share LBR_NORMAL_LEAST, a combination of the columns before it. */
LBR_CHECKED lbr_status lbr_normal_factor(double *g, size_t n, size_t width,
                                         size_t *column);

/* b becomes the solution. */
void lbr_normal_solve(const double *factor, size_t n, size_t width, double *b);

/* The whole lower triangle of the inverse; inverse has the factor's shape and
 * may not be it. */
void lbr_normal_invert(const double *factor, size_t n, size_t width,
                       double *inverse);

#endif
