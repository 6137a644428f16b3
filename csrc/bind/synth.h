/* What the files of the synthesis door share: fields of option tables and
 * handles for memory of the core.
 */
#ifndef LBR_BIND_SYNTH_H
#define LBR_BIND_SYNTH_H

#include <stdbool.h>
#include <stdint.h>

#include "base/random.h"
#include "bind/bind.h"
#include "synth/noise.h"

/* Field of the table at `table` (absolute index) as a finite number (infinite
 * where told); absent: the default.  Raises an error that names the field. */
double lbr_field(lua_State *L, int table, const char *name, double absent);
double lbr_field_or_infinite(lua_State *L, int table, const char *name,
                             double absent);
lua_Integer lbr_whole_field(lua_State *L, int table, const char *name,
                            lua_Integer absent);

/* Field `name`: a list of tables or nil; pushes it (or nil), returns its
 * length. */
size_t lbr_list_field(lua_State *L, int table, const char *name, size_t most);

/* Item i (from 1) of the list at the top, pushed; raises unless a table. */
void lbr_push_item(lua_State *L, size_t i, const char *name);

/* Field `name`: samples that are the taps of a shape, or nil (false). */
bool lbr_shape_field(lua_State *L, int table, const char *name,
                     lbr_shape *shape);

/* Functions of synth_signal.c. */
extern const luaL_Reg lbr_synth_signal_functions[];

#endif
