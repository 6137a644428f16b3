/* Drafts of files as Lua sees them.
 */
#ifndef LBR_BIND_DRAFT_H
#define LBR_BIND_DRAFT_H

#include "bind/bind.h"
#include "store/plain.h"

/* Adds `draft` to the table at the top of the stack. */
void lbr_add_drafts(lua_State *L);

/* The table at `arg` with bits, integer, unsigned, big, zero as a coding that
 * can be read; raises otherwise. */
void lbr_check_coding(lua_State *L, int arg, lbr_coding *coding);

#endif
