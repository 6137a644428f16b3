/* Parts of core.spectrum that have a file of their own; each adds functions
 * to the table at the top of the stack.
 */
#ifndef LBR_BIND_SPECTRUM_H
#define LBR_BIND_SPECTRUM_H

#include "bind/bind.h"

void lbr_add_averages(lua_State *L);
void lbr_add_statistics(lua_State *L);

#endif
