/* Bessel low-pass: the roots of the reverse Bessel polynomial, scaled to a
 * magnitude of 1/sqrt(2) at 1 rad/s.
 */
#ifndef LBR_FILTER_BESSEL_H
#define LBR_FILTER_BESSEL_H

#include "base/status.h"
#include "filter/analog.h"

/* Fills pole, poles, zeros of a filter whose order has been checked. */
LBR_CHECKED lbr_status lbr_design_bessel(lbr_filter *f);

#endif
