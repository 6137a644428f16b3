/* What the files of core.lines share.
 */
#ifndef LBR_BIND_LINES_H
#define LBR_BIND_LINES_H

#include "bind/bind.h"

/* Functions that live in the files of these names, NULL-ended. */
extern const luaL_Reg lbr_lines_fit_functions[];
extern const luaL_Reg lbr_lines_list_functions[];
extern const luaL_Reg lbr_lines_shaft_functions[];

/* t[field] = value for the table at the top of the stack. */
void lbr_put_number(lua_State *L, const char *field, double value);

#endif
