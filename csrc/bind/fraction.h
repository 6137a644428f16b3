/* Fractions as Lua sees them: userdata of class "libration.fraction". */
#ifndef LBR_BIND_FRACTION_H
#define LBR_BIND_FRACTION_H

#include "base/fraction.h"
#include "bind/bind.h"

#define LBR_FRACTION_CLASS "libration.fraction"

/* Pushes a fraction; its fields are copied. */
void lbr_push_fraction(lua_State *L, lbr_fraction value);

/* Argument `arg` as a fraction: a fraction, an integer, a float (its shortest
 * decimal) or a text ("7/2"); raises an argument error otherwise. */
lbr_fraction lbr_check_fraction(lua_State *L, int arg);

/* Adds the functions on numbers to the table at the top of the stack. */
void lbr_add_numbers(lua_State *L);

#endif
