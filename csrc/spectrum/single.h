/* The transform of one real record of any length: short ones in one piece,
 * long ones in pieces on several threads, lengths with large prime factors by
 * a chirp (Bluestein 1970, IEEE Trans. AU-18, 451-455).
 *
 *   X[k] = sum_n w[n] x[n] exp(-2 pi i k n / points),  k = 0 .. points / 2
 */
#ifndef LBR_SPECTRUM_SINGLE_H
#define LBR_SPECTRUM_SINGLE_H

#include <stddef.h>

#include "base/status.h"

typedef struct lbr_single lbr_single;

/* points: 1 .. LBR_TRANSFORM_MOST; workers: 0: one per core.  The object has
 * its own workspace and runs one transform at a time. */
LBR_CHECKED lbr_status lbr_single_new(size_t points, unsigned workers,
                                      lbr_single **out);
void lbr_single_free(lbr_single *single); /* NULL is fine */

size_t lbr_single_points(const lbr_single *single);

/* n <= points samples (zeros follow), w NULL: no window; re and im: points / 2
 * + 1 values each. */
LBR_CHECKED lbr_status lbr_single_run(lbr_single *single, const double *x,
                                      const double *w, size_t n, double *re,
                                      double *im);

#endif
