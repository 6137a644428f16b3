/* Runs Lua code in a state whose own allocator fails on demand.
 *
 *   host SCRIPT [ARGUMENT ...]     like lua5.4, with one global table more:
 *   starved.run(n, f)   calls f() while the first n requests of the state that
 *                       grow memory succeed and all later ones fail; gives
 *                       status ("ok", "memory", "error"), message, requests
 *                       refused
 *   starved.used()      bytes that the state holds
 */
#include <lauxlib.h>
#include <lua.h>
#include <lualib.h>
#include <stddef.h>
#include <stdio.h>
#include <stdlib.h>

typedef struct purse {
  long long allowance; /* requests that still succeed; < 0: all */
  long long refused;   /* requests refused in this run */
  size_t used;         /* bytes held */
} purse;

static void *allocate(void *context, void *block, size_t before, size_t after) {
  purse *p = context;
  size_t had = block ? before : 0;
  if (after == 0) {
    free(block);
    p->used -= had;
    return NULL;
  }
  if (after > had && p->allowance == 0) {
    p->refused++;
    return NULL;
  }
  if (after > had && p->allowance > 0) p->allowance--;
  void *moved = realloc(block, after);
  if (moved) p->used += after - had;
  return moved;
}

static purse *purse_of(lua_State *L) {
  void *context;
  lua_getallocf(L, &context);
  return context;
}

static int starved_run(lua_State *L) {
  purse *p = purse_of(L);
  lua_Integer n = luaL_checkinteger(L, 1);
  luaL_checktype(L, 2, LUA_TFUNCTION);
  lua_settop(L, 2);
  luaL_checkstack(L, 8, NULL);
  p->refused = 0;
  p->allowance = n;
  int status = lua_pcall(L, 0, 0, 0);
  p->allowance = -1;
  lua_pushstring(L, status == LUA_OK ? "ok"
                    : status == LUA_ERRMEM ? "memory" : "error");
  if (status == LUA_OK) lua_pushnil(L);
  else luaL_tolstring(L, 2, NULL);
  lua_pushinteger(L, (lua_Integer)p->refused);
  return 3;
}

static int starved_used(lua_State *L) {
  lua_pushinteger(L, (lua_Integer)purse_of(L)->used);
  return 1;
}

static const luaL_Reg functions[] = {
    {"run", starved_run}, {"used", starved_used}, {NULL, NULL}};

static int with_traceback(lua_State *L) {
  luaL_traceback(L, L, luaL_tolstring(L, 1, NULL), 1);
  return 1;
}

static int run_script(lua_State *L, int argc, char **argv) {
  luaL_openlibs(L);
  luaL_newlib(L, functions);
  lua_setglobal(L, "starved");
  lua_newtable(L);
  for (int i = 0; i + 1 < argc; i++) {
    lua_pushstring(L, argv[i + 1]);
    lua_seti(L, -2, i);
  }
  lua_setglobal(L, "arg");
  lua_pushcfunction(L, with_traceback);
  if (luaL_loadfile(L, argv[1]) == LUA_OK && lua_pcall(L, 0, 0, 1) == LUA_OK)
    return 0;
  fprintf(stderr, "%s\n", lua_tostring(L, -1));
  return 1;
}

int main(int argc, char **argv) {
  purse p = {.allowance = -1, .refused = 0, .used = 0};
  if (argc < 2) {
    fprintf(stderr, "usage: host SCRIPT [ARGUMENT ...]\n");
    return 2;
  }
  lua_State *L = lua_newstate(allocate, &p);
  if (!L) return 2;
  int status = run_script(L, argc, argv);
  lua_close(L);
  if (p.used != 0) {
    fprintf(stderr, "%zu bytes left after the state was closed\n", p.used);
    status = 1;
  }
  return status;
}
