/* Files that are read through feeds: rows of text and packed samples.
 */
#ifndef LBR_BIND_STORE_FILES_H
#define LBR_BIND_STORE_FILES_H

#include "bind/bind.h"

/* Adds `rows` and `packed` to the table at the top of the stack. */
void lbr_add_files(lua_State *L);

#endif
