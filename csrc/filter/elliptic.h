/* Elliptic low-pass by Landen's transformation of the Jacobian functions.
 */
#ifndef LBR_FILTER_ELLIPTIC_H
#define LBR_FILTER_ELLIPTIC_H

#include "base/status.h"
#include "filter/analog.h"

/* Fills pole, zero, poles, zeros, ripple, floor, ceiling, selectivity, turn
 * of a filter whose order, ripple_db and stop_db have been checked.
 * LBR_NO_CONVERGE where the transition is too narrow for double precision. */
LBR_CHECKED lbr_status lbr_design_elliptic(lbr_filter *f);

#endif
