/* Fields of option tables, for the files of the synthesis door. */
#include <math.h>

#include "bind/synth.h"

double lbr_loose_field(lua_State *L, int table, const char *name,
                       double absent) {
  lua_pushstring(L, name);
  int kind = lua_rawget(L, table);
  double value = lua_tonumber(L, -1);
  lua_pop(L, 1);
  if (kind == LUA_TNIL) return absent;
  if (kind != LUA_TNUMBER || isnan(value))
    luaL_error(L, "%s is not a number", name);
  return value;
}

double lbr_field(lua_State *L, int table, const char *name, double absent) {
  double value = lbr_loose_field(L, table, name, absent);
  if (!isfinite(value)) luaL_error(L, "%s is not finite", name);
  return value;
}

lua_Integer lbr_whole_field(lua_State *L, int table, const char *name,
                            lua_Integer absent) {
  int whole;
  lua_pushstring(L, name);
  int kind = lua_rawget(L, table);
  lua_Integer value = lua_tointegerx(L, -1, &whole);
  lua_pop(L, 1);
  if (kind == LUA_TNIL) return absent;
  if (kind != LUA_TNUMBER || !whole)
    luaL_error(L, "%s is not a whole number", name);
  return value;
}

size_t lbr_list_field(lua_State *L, int table, const char *name,
                      size_t most) {
  lua_pushstring(L, name);
  int kind = lua_rawget(L, table);
  if (kind == LUA_TNIL) return 0;
  if (kind != LUA_TTABLE) luaL_error(L, "%s is not a list", name);
  size_t n = lua_rawlen(L, -1);
  if (n > most)
    luaL_error(L, "%s has %I items; at most %I", name, (LUAI_UACINT)n,
               (LUAI_UACINT)most);
  return n;
}

void lbr_push_item(lua_State *L, size_t i, const char *name) {
  if (lua_rawgeti(L, -1, (lua_Integer)i) != LUA_TTABLE)
    luaL_error(L, "%s[%I] is not a table", name, (LUAI_UACINT)i);
}

unsigned lbr_workers_field(lua_State *L, int table) {
  lua_Integer workers = lbr_whole_field(L, table, "workers", 0);
  if (workers < 0 || workers > 256)
    luaL_error(L, "workers is outside 0 .. 256");
  return (unsigned)workers;
}
