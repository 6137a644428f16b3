/* What the files of this room share: how a status becomes Lua values, and the
 * list of rooms.  The only room that includes lua.h.
 */
#ifndef LBR_BIND_BIND_H
#define LBR_BIND_BIND_H

#include <lauxlib.h>
#include <lua.h>
#include <stddef.h>

#include "base/status.h"

/* The world refused: pushes nil, message, code and returns 3.  `what` says
 * what was being done; "what: status text". */
int lbr_refuse(lua_State *L, lbr_status status, const char *what);

/* Misuse or lack of memory inside a function that cannot refuse: raises
 * "what: status text".  Call it only when no C local owns a resource. */
int lbr_raise(lua_State *L, lbr_status status, const char *what);

/* Pushes a new metatable `name` with the given methods as __index, or the
 * registered one, and sets it on the userdata at the top of the stack. */
void lbr_set_class(lua_State *L, const char *name, const luaL_Reg *methods,
                   const luaL_Reg *meta);

/* Argument `arg` as a count between least and most; raises otherwise. */
size_t lbr_check_count(lua_State *L, int arg, size_t least, size_t most);

/* One opener per room; each pushes one table of functions. */
int lbr_open_bands(lua_State *L);
int lbr_open_base(lua_State *L);
int lbr_open_filter(lua_State *L);
int lbr_open_lines(lua_State *L);
int lbr_open_plan(lua_State *L);
int lbr_open_proof(lua_State *L);
int lbr_open_reading(lua_State *L);
int lbr_open_samples(lua_State *L);
int lbr_open_spectrum(lua_State *L);
int lbr_open_store(lua_State *L);
int lbr_open_synth(lua_State *L);
int lbr_open_window(lua_State *L);

#endif
