/* The transform of complex samples at equally spaced frequencies of any
 * spacing (Rabiner, Schafer and Rader 1969, Bell Syst. Tech. J. 48, 1249-1292):
 *
 *   X[k] = sum_n x[n] exp(-2 pi i (first + k step) n),  k = 0 .. points - 1
 *
 * with frequencies in cycles per sample.
 */
#ifndef LBR_SPECTRUM_CHIRP_H
#define LBR_SPECTRUM_CHIRP_H

#include <complex.h>
#include <stddef.h>

#include "base/status.h"

#define LBR_CHIRP_MOST ((size_t)1 << 26) /* samples, and points */

typedef struct lbr_chirp lbr_chirp;

/* n samples, 1 .. LBR_CHIRP_MOST as the points are; frequencies finite, of any
 * size (LBR_DOMAIN otherwise).  One run at a time. */
LBR_CHECKED lbr_status lbr_chirp_new(size_t n, double first, double step,
                                     size_t points, unsigned workers,
                                     lbr_chirp **out);
void lbr_chirp_free(lbr_chirp *chirp); /* NULL is fine */

/* x: n values; out: as many as there are points. */
LBR_CHECKED lbr_status lbr_chirp_run(lbr_chirp *chirp, const double complex *x,
                                     double complex *out);

#endif
