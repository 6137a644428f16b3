/* Open sound files as Lua sees them, and what functions on files share.
 */
#ifndef LBR_BIND_SOUND_H
#define LBR_BIND_SOUND_H

#include "bind/bind.h"
#include "store/why.h"

/* Pushes nil, "path: why", code and returns 3. */
int lbr_refuse_file(lua_State *L, lbr_status status, const char *path,
                    const lbr_why *why);

/* Argument `arg` as a path; raises an argument error otherwise. */
const char *lbr_check_path(lua_State *L, int arg);

/* Adds `open` to the table at the top of the stack. */
void lbr_add_sounds(lua_State *L);

#endif
