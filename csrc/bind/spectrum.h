/* Parts of core.spectrum that have a file of their own; each adds functions
 * to the table at the top of the stack.
 */
#ifndef LBR_BIND_SPECTRUM_H
#define LBR_BIND_SPECTRUM_H

#include "bind/bind.h"

void lbr_add_averages(lua_State *L);
void lbr_add_singles(lua_State *L);
void lbr_add_statistics(lua_State *L);
void lbr_add_zoom(lua_State *L);

/* The transform of w[n] x[n] (w NULL: no window) into re and im, by an object
 * that is kept for the next of the same length; raises when memory is out. */
void lbr_run_single(lua_State *L, const double *x, const double *w, size_t n,
                    size_t points, double *re, double *im);

#endif
