#include "bind/proof_setup.h"

#include <math.h>
#include <string.h>

#include "base/checked.h"
#include "bind/filter.h"
#include "bind/samples.h"

#define MOST_ITEMS 4096

/* Where a number is read, for messages: "sources[3]." or "". */
typedef struct place {
  int arg;
  const char *list; /* NULL: the table itself */
  lua_Integer item; /* 0: a table of its own, no list */
} place;

static int complain(lua_State *L, place at, const char *field,
                    const char *what) {
  const char *path =
      !at.list ? field
      : at.item == 0 ? lua_pushfstring(L, "%s.%s", at.list, field)
                     : lua_pushfstring(L, "%s[%I].%s", at.list,
                                       (LUAI_UACINT)at.item, field);
  return luaL_argerror(L, at.arg, lua_pushfstring(L, "%s %s", path, what));
}

/* The number `field` of the table at the top; `absent` when it is nil. */
static double number(lua_State *L, place at, const char *field, double least,
                     double absent) {
  int is_number;
  lua_getfield(L, -1, field);
  double value = lua_tonumberx(L, -1, &is_number);
  if (lua_isnil(L, -1)) {
    value = absent;
    if (isnan(absent)) complain(L, at, field, "is missing");
  } else if (!is_number) {
    complain(L, at, field, "is not a number");
  }
  lua_pop(L, 1);
  if (!(value >= least)) complain(L, at, field, "is out of its range");
  return value;
}

/* Pushes the list `field` of the table at arg and gives its length. */
static size_t push_list(lua_State *L, int arg, const char *field) {
  if (lua_getfield(L, arg, field) != LUA_TTABLE)
    luaL_argerror(L, arg, lua_pushfstring(L, "%s is not a list", field));
  lua_Integer count = luaL_len(L, -1);
  if (count < 0 || count > MOST_ITEMS)
    luaL_argerror(L, arg, lua_pushfstring(L, "%s has more than %d items",
                                          field, MOST_ITEMS));
  return (size_t)count;
}

static place push_item(lua_State *L, int arg, const char *list, size_t i) {
  if (lua_geti(L, -1, (lua_Integer)i + 1) != LUA_TTABLE)
    luaL_argerror(L, arg, lua_pushfstring(L, "%s[%I] is not a table", list,
                                          (LUAI_UACINT)(i + 1)));
  return (place){arg, list, (lua_Integer)i + 1};
}

static void *room(lua_State *L, size_t count, size_t size) {
  void *memory = lbr_alloc(count, size);
  if (!memory) lbr_raise(L, LBR_NO_MEMORY, "proof");
  return memory;
}

static void read_spread(lua_State *L, int arg, lbr_setup *s) {
  s->scene.n_drivers = push_list(L, arg, "spread");
  s->spread = room(L, s->scene.n_drivers, sizeof *s->spread);
  for (size_t i = 0; i < s->scene.n_drivers; i++) {
    int is_number;
    lua_geti(L, -1, (lua_Integer)i + 1);
    s->spread[i] = lua_tonumberx(L, -1, &is_number);
    if (!is_number || !(s->spread[i] >= 0 && s->spread[i] < 1))
      luaL_argerror(L, arg, lua_pushfstring(
          L, "spread[%I] is not a number from 0 to below 1",
          (LUAI_UACINT)(i + 1)));
    lua_pop(L, 1);
  }
  lua_pop(L, 1);
  s->scene.spread = s->spread;
}

static void read_source(lua_State *L, place at, const lbr_scene *scene,
                        lbr_source *out) {
  out->hz = number(L, at, "hz", 0, NAN);
  out->lock_hz = number(L, at, "lock_hz", -HUGE_VAL, 0);
  out->free_hz = number(L, at, "free_hz", 0, 0);
  out->wander = number(L, at, "wander", 0, 0);
  out->least = number(L, at, "least", 0, NAN);
  out->most = number(L, at, "most", out->least, NAN);
  double driver = number(L, at, "driver", 1, NAN);
  if (driver > (double)scene->n_drivers || driver != floor(driver))
    complain(L, at, "driver", "is not an index into spread");
  out->driver = (size_t)driver - 1;
}

static void read_sources(lua_State *L, int arg, lbr_setup *s) {
  lbr_scene *scene = &s->scene;
  scene->n_sources = push_list(L, arg, "sources");
  s->sources = room(L, scene->n_sources, sizeof *s->sources);
  for (size_t i = 0; i < scene->n_sources; i++) {
    place at = push_item(L, arg, "sources", i);
    read_source(L, at, scene, &s->sources[i]);
    lua_pop(L, 1);
  }
  lua_pop(L, 1);
  scene->sources = s->sources;
}

static void read_claim(lua_State *L, place at, lbr_claim *out) {
  out->own = number(L, at, "own", 0, NAN);
  out->others = number(L, at, "others", 0, NAN);
  out->sigma = number(L, at, "sigma", 0, 0);
  out->hz = number(L, at, "hz", 0, INFINITY);
  out->f_lo = number(L, at, "f_lo", 0, NAN);
  out->f_hi = number(L, at, "f_hi", out->f_lo, NAN);
  out->gain = number(L, at, "gain", 0, NAN);
  if (!(out->gain > 0)) complain(L, at, "gain", "is not positive");
}

static void read_claims(lua_State *L, int arg, lbr_setup *s) {
  s->scene.n_lines = push_list(L, arg, "claims");
  luaL_argcheck(L, s->scene.n_lines >= 1, arg, "claims is empty");
  luaL_argcheck(L, s->scene.n_lines <= s->scene.n_sources, arg,
                "claims has more items than sources");
  s->claims = room(L, s->scene.n_lines, sizeof *s->claims);
  for (size_t i = 0; i < s->scene.n_lines; i++) {
    place at = push_item(L, arg, "claims", i);
    read_claim(L, at, &s->claims[i]);
    lua_pop(L, 1);
  }
  lua_pop(L, 1);
}

static void read_front(lua_State *L, int arg, lbr_front_end *out) {
  place at = {arg, "front", 0};
  if (lua_getfield(L, arg, "front") != LUA_TTABLE)
    luaL_argerror(L, arg, "front is not a table");
  out->flatness = number(L, at, "flatness", 0, 0);
  out->accuracy = number(L, at, "accuracy", 0, 0);
  out->timebase = number(L, at, "timebase", 0, 0);
  out->jitter_s = number(L, at, "jitter_s", 0, 0);
  out->range = number(L, at, "range", 0, INFINITY);
  out->step = number(L, at, "step", 0, 0);
  out->noise = number(L, at, "noise", 0, 0);
  lua_getfield(L, -1, "filter");
  lbr_check_filter(L, lua_gettop(L), &out->filter);
  lua_pop(L, 2);
}

static void read_window(lua_State *L, int arg, lbr_setup *s) {
  size_t n;
  lua_getfield(L, arg, "window");
  const double *w = lbr_check_samples(L, lua_gettop(L), &n);
  luaL_argcheck(L, n >= 4, arg, "window has fewer than 4 samples");
  s->window = room(L, n, sizeof *w);
  memcpy(s->window, w, n * sizeof *w);
  lua_pop(L, 1);
  s->proof.n = n;
}

void lbr_check_setup(lua_State *L, int arg, lbr_setup *s) {
  place at = {arg, NULL, 0};
  luaL_checktype(L, arg, LUA_TTABLE);
  lua_pushvalue(L, arg);
  s->proof.rate = number(L, at, "rate", 0, NAN);
  if (!(s->proof.rate > 0)) complain(L, at, "rate", "is not positive");
  s->proof.coverage = number(L, at, "coverage", 0, 3);
  s->scene.offset = number(L, at, "offset", 0, 0);
  s->scene.noise = number(L, at, "noise", 0, 0);
  lua_pop(L, 1);
  read_spread(L, arg, s);
  read_sources(L, arg, s);
  read_claims(L, arg, s);
  read_front(L, arg, &s->front);
  read_window(L, arg, s);
  s->proof.scene = &s->scene;
  s->proof.front = &s->front;
  s->proof.claims = s->claims;
  s->proof.window = s->window;
}

void lbr_setup_free(lbr_setup *s) {
  free(s->sources);
  free(s->spread);
  free(s->claims);
  free(s->window);
  memset(s, 0, sizeof *s);
}
