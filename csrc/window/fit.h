/* A smooth even shape as a cosine series on twice its length.
 *
 * cos(pi j u) for whole j spans far more than the even functions of period 1:
 * smooth functions on |u| <= 1/2 are had to rounding with a few dozen terms
 * (a Fourier extension).  The terms are found by least squares on points that
 * crowd at the ends, with an orthogonal factorisation that takes columns in
 * the order of what they add and stops where they add nothing.
 */
#ifndef LBR_WINDOW_FIT_H
#define LBR_WINDOW_FIT_H

#include "base/status.h"
#include "window/series.h"

typedef double (*lbr_even_shape)(const void *context, double u);

/* Fits shape on 0 <= u <= 1/2 with 2 * pairs terms; samples > 0: the shape is
 * only known at the inner samples of that length.  out->misfit is the largest
 * difference on other points, doubled, with rounding, over the mean. */
LBR_CHECKED lbr_status lbr_fit_series(lbr_even_shape shape, const void *context,
                                      size_t pairs, size_t samples,
                                      lbr_series *out);

/* The fitted shape at u. */
double lbr_fit_value(const lbr_series *s, double u);

#endif
