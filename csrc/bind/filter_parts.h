/* What the files of core.filter share: words for bands and ends, and the
 * tables of functions that filter.c registers.
 */
#ifndef LBR_BIND_FILTER_PARTS_H
#define LBR_BIND_FILTER_PARTS_H

#include "bind/samples.h"
#include "filter/digital.h"

/* "low", "high", "pass" or "stop"; raises otherwise. */
lbr_band lbr_check_band(lua_State *L, int arg);

/* "turn", "mirror", "hold" or "bare", or what an absent one means. */
lbr_ends lbr_check_ends(lua_State *L, int arg, lbr_ends absent);

/* A frequency in Hz, 0 to half the rate, as a share of the rate. */
double lbr_check_share(lua_State *L, int arg, double rate);

extern const luaL_Reg lbr_sections_methods[];   /* filter_sections.c */
extern const luaL_Reg lbr_sections_functions[]; /* filter_sections.c */
extern const luaL_Reg lbr_taps_methods[];       /* filter_taps.c */
extern const luaL_Reg lbr_taps_functions[];     /* filter_taps.c */

#endif
