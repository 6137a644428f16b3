/* luaopen_libration_core: one table, one field per room. */
#include "bind/bind.h"

static const luaL_Reg rooms[] = {
    {"bands", lbr_open_bands},
    {"base", lbr_open_base},         {"filter", lbr_open_filter},
    {"lines", lbr_open_lines},       {"plan", lbr_open_plan},
    {"proof", lbr_open_proof},       {"reading", lbr_open_reading},
    {"samples", lbr_open_samples},   {"spectrum", lbr_open_spectrum},
    {"store", lbr_open_store},       {"synth", lbr_open_synth},
    {"window", lbr_open_window},     {NULL, NULL},
};

int lbr_refuse(lua_State *L, lbr_status status, const char *what) {
  lua_pushnil(L);
  lua_pushfstring(L, "%s: %s", what, lbr_status_text(status));
  lua_pushstring(L, lbr_status_code(status));
  return 3;
}

int lbr_raise(lua_State *L, lbr_status status, const char *what) {
  return luaL_error(L, "%s: %s", what, lbr_status_text(status));
}

void lbr_set_class(lua_State *L, const char *name, const luaL_Reg *methods,
                   const luaL_Reg *meta) {
  if (luaL_newmetatable(L, name)) {
    lua_newtable(L);
    luaL_setfuncs(L, methods, 0);
    lua_setfield(L, -2, "__index");
    luaL_setfuncs(L, meta, 0);
  }
  lua_setmetatable(L, -2);
}

size_t lbr_check_count(lua_State *L, int arg, size_t least, size_t most) {
  lua_Integer value = luaL_checkinteger(L, arg);
  if (value < 0 || (size_t)value < least || (size_t)value > most)
    luaL_argerror(L, arg,
                  lua_pushfstring(L, "%I is not a count between %I and %I",
                                  (LUAI_UACINT)value, (LUAI_UACINT)least,
                                  (LUAI_UACINT)most));
  return (size_t)value;
}

__attribute__((visibility("default"))) int luaopen_libration_core(lua_State *L);

int luaopen_libration_core(lua_State *L) {
  luaL_checkversion(L);
  lua_newtable(L);
  for (const luaL_Reg *room = rooms; room->name; room++) {
    room->func(L);
    lua_setfield(L, -2, room->name);
  }
  return 1;
}
