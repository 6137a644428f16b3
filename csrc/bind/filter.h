/* An analog response out of the table that Lua describes it with.
 */
#ifndef LBR_BIND_FILTER_H
#define LBR_BIND_FILTER_H

#include "bind/bind.h"
#include "filter/analog.h"

/* Argument `arg`: nil (no filter), a prepared filter, or a table with shape
 * ("none", "butterworth", "chebyshev", "bessel", "elliptic", "points"),
 * order, corner (Hz, or a share of the rate when corner_of_rate), ripple_db,
 * stop_db, points = { {at=, db=}, ... }; other fields are left to the caller.
 * Fills and prepares *out; raises an argument error that names the field. */
void lbr_check_filter(lua_State *L, int arg, lbr_filter *out);

#endif
