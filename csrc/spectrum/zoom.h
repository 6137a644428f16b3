/* A narrow band of the transform of a long real record, as fine as wanted:
 *
 *   X[k] = sum_n x[n] exp(-2 pi i (first + k step) n),  k = 0 .. points - 1
 *
 * The band is shifted to 0, the record thinned out in one or two stages by
 * filters whose zeros lie where the rest would fold into the band (running
 * means, many times over), the filters' own response taken out, and the short
 * rest transformed by a chirp.  What folds in is below 1e-15 of sum |x|.
 */
#ifndef LBR_SPECTRUM_ZOOM_H
#define LBR_SPECTRUM_ZOOM_H

#include <stddef.h>

#include "base/status.h"
#include "spectrum/chirp.h"

typedef struct lbr_zoom lbr_zoom;

/* first, step: cycles per sample, |first| <= 1, |step| <= 1; n and points as
 * for lbr_chirp_new.  One run at a time. */
LBR_CHECKED lbr_status lbr_zoom_new(size_t n, double first, double step,
                                    size_t points, unsigned workers,
                                    lbr_zoom **out);
void lbr_zoom_free(lbr_zoom *zoom); /* NULL is fine */

size_t lbr_zoom_samples(const lbr_zoom *zoom);
size_t lbr_zoom_points(const lbr_zoom *zoom);

/* By how much the record is thinned out before the chirp; 1: not at all. */
size_t lbr_zoom_decimation(const lbr_zoom *zoom);

/* x: n samples; re, im: as many values as there are points. */
LBR_CHECKED lbr_status lbr_zoom_run(lbr_zoom *zoom, const double *x,
                                    double *re, double *im);

#endif
