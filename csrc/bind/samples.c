#include "bind/samples.h"

#include <stdint.h>
#include <string.h>

#define ALIGNMENT 64
#define MOST_SAMPLES (SIZE_MAX / 16)

double *lbr_push_samples(lua_State *L, size_t n) {
  if (n > MOST_SAMPLES) lbr_raise(L, LBR_OVERFLOW, "samples");
  lbr_view *view = lua_newuserdatauv(L, sizeof *view, 1);
  *view = (lbr_view){NULL, 0};
  void *block = lua_newuserdatauv(L, n * sizeof(double) + ALIGNMENT, 0);
  uintptr_t address = (uintptr_t)block;
  address = (address + ALIGNMENT - 1) & ~(uintptr_t)(ALIGNMENT - 1);
  view->data = (double *)address;
  memset(view->data, 0, n * sizeof(double));
  view->n = n;
  lua_setiuservalue(L, -2, 1);
  luaL_setmetatable(L, LBR_SAMPLES_CLASS);
  return view->data;
}

const double *lbr_check_samples(lua_State *L, int arg, size_t *n) {
  const lbr_view *view = luaL_checkudata(L, arg, LBR_SAMPLES_CLASS);
  *n = view->n;
  return view->data;
}

static int samples_new(lua_State *L) {
  lbr_push_samples(L, lbr_check_count(L, 1, 0, MOST_SAMPLES));
  return 1;
}

static int samples_length(lua_State *L) {
  size_t n;
  lbr_check_samples(L, 1, &n);
  lua_pushinteger(L, (lua_Integer)n);
  return 1;
}

static const luaL_Reg functions[] = {{"new", samples_new}, {NULL, NULL}};
static const luaL_Reg meta[] = {{"__len", samples_length}, {NULL, NULL}};

int lbr_open_samples(lua_State *L) {
  luaL_newmetatable(L, LBR_SAMPLES_CLASS);
  luaL_setfuncs(L, meta, 0);
  lua_pop(L, 1);
  luaL_newlib(L, functions);
  return 1;
}
