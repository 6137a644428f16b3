#include "bind/bind.h"
#include "bind/fraction.h"

static const luaL_Reg functions[] = {{NULL, NULL}};

int lbr_open_base(lua_State *L) {
  luaL_newlib(L, functions);
  lbr_add_numbers(L);
  return 1;
}
