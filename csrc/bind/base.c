#include "bind/bind.h"

static const luaL_Reg functions[] = {{NULL, NULL}};

int lbr_open_base(lua_State *L) {
  luaL_newlib(L, functions);
  return 1;
}
