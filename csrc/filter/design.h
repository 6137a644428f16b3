/* Where the poles and zeros of the low-pass shapes lie, for a corner of
 * 1 rad/s.  Complex pairs come first and adjacent (upper half plane first), a
 * real pole last.
 */
#ifndef LBR_FILTER_DESIGN_H
#define LBR_FILTER_DESIGN_H

#include "base/status.h"
#include "filter/analog.h"

/* Each fills pole, zero, poles, zeros, and what else its shape needs
 * (ripple, floor, ceiling, selectivity, turn) of a filter whose order,
 * ripple_db and stop_db have been checked. */
LBR_CHECKED lbr_status lbr_design_butterworth(lbr_filter *f);
LBR_CHECKED lbr_status lbr_design_chebyshev(lbr_filter *f);

/* sqrt(10^(db/10) - 1): the ripple factor of an attenuation. */
double lbr_design_ripple(double db);

#endif
