/* What the files of the synthesis door share.
 */
#ifndef LBR_BIND_SYNTH_H
#define LBR_BIND_SYNTH_H

#include "bind/bind.h"

/* Functions of synth_signal.c, synth_motion.c and synth_damage.c, NULL-ended.
 */
extern const luaL_Reg lbr_synth_signal_functions[];
extern const luaL_Reg lbr_synth_motion_functions[];
extern const luaL_Reg lbr_synth_damage_functions[];

/* A field of the table at `table` (an absolute index); absent: the default.
 * All raise errors that name the field. */

/* A number; loose: it may be infinite. */
double lbr_field(lua_State *L, int table, const char *name, double absent);
double lbr_loose_field(lua_State *L, int table, const char *name,
                       double absent);

lua_Integer lbr_whole_field(lua_State *L, int table, const char *name,
                            lua_Integer absent);

/* The field `workers`, 0 .. 256. */
unsigned lbr_workers_field(lua_State *L, int table);

/* Pushes a field that is a list or nil; its length. */
size_t lbr_list_field(lua_State *L, int table, const char *name, size_t most);

/* Pushes item i (from 1) of the list at the top. */
void lbr_push_item(lua_State *L, size_t i, const char *name);

#endif
