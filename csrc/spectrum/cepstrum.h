/* The cepstrum: what a spectrum's logarithm repeats with.
 *
 *   real   c[n] = inverse transform of ln |X[k]|
 *   power  c[n] = (inverse transform of ln |X[k]|^2)^2
 *
 * (B. P. Bogert, M. J. R. Healy and J. W. Tukey, 1963; A. V. Oppenheim and
 * R. W. Schafer, 1975.)  Quefrency n is n sample intervals; both halves are
 * given.
 */
#ifndef LBR_SPECTRUM_CEPSTRUM_H
#define LBR_SPECTRUM_CEPSTRUM_H

#include <stdbool.h>

#include "spectrum/transform.h"

/* x: the record, points values; gets the cepstrum.  bins: points / 2 + 1.
 * Both from lbr_transform_buffer.  Magnitudes below floor times the largest
 * count as that; LBR_DOMAIN when a magnitude is 0 with floor = 0, or all are.
 */
LBR_CHECKED lbr_status lbr_cepstrum(const lbr_transform *transform, double *x,
                                    double complex *bins, double floor,
                                    bool power);

#endif
