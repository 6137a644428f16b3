#include "bind/problem.h"

#include <math.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "base/checked.h"
#include "bind/filter.h"

#define MOST_SOURCES 4096
#define MOST_MODES 4096

double lbr_field_or(lua_State *L, int arg, const char *name, double fallback) {
  lua_getfield(L, arg, name);
  int is_number = lua_type(L, -1) == LUA_TNUMBER;
  if (!is_number && !lua_isnil(L, -1))
    luaL_error(L, "%s: %s is not a number", name, luaL_typename(L, -1));
  double value = is_number ? lua_tonumber(L, -1) : fallback;
  lua_pop(L, 1);
  if (isnan(value)) luaL_error(L, "%s: not a number (nan)", name);
  return value;
}

double lbr_field_number(lua_State *L, int arg, const char *name) {
  double value = lbr_field_or(L, arg, name, HUGE_VAL);
  if (!isfinite(value)) luaL_error(L, "%s: a finite number is needed", name);
  return value;
}

static double at_least(lua_State *L, int arg, const char *name, double least,
                       double fallback) {
  double value = lbr_field_or(L, arg, name, fallback);
  if (!(value >= least)) luaL_error(L, "%s: less than %f", name, least);
  return value;
}

/* The same, and finite. */
static double movement(lua_State *L, int arg, const char *name) {
  double value = at_least(L, arg, name, 0, 0);
  if (!isfinite(value)) luaL_error(L, "%s: a finite number is needed", name);
  return value;
}

static size_t count_field(lua_State *L, int arg, const char *name,
                          double least, double fallback) {
  double value = at_least(L, arg, name, least, fallback);
  if (value > 9007199254740992.0) luaL_error(L, "%s: too large", name);
  return (size_t)value;
}

/* Pushes the list field and returns its length, raising past `most`. */
static size_t list_field(lua_State *L, int arg, const char *name,
                         size_t most) {
  if (lua_getfield(L, arg, name) != LUA_TTABLE)
    luaL_error(L, "%s: a list is needed", name);
  lua_Unsigned n = lua_rawlen(L, -1);
  if (n > most) luaL_error(L, "%s: more than %d entries", name, (int)most);
  return (size_t)n;
}

static void *owned(lua_State *L, size_t count, size_t size) {
  void *memory = lbr_alloc(count, size);
  if (!memory) lbr_raise(L, LBR_NO_MEMORY, "problem");
  return memory;
}

static void read_source(lua_State *L, int arg, size_t drivers, lbr_source *s) {
  double driver = lbr_field_number(L, arg, "driver");
  s->hz = lbr_field_number(L, arg, "hz");
  s->lock_hz = movement(L, arg, "lock_hz");
  s->free_hz = movement(L, arg, "free_hz");
  s->wander = movement(L, arg, "wander");
  s->least = lbr_field_number(L, arg, "least");
  s->most = lbr_field_number(L, arg, "most");
  if (!(s->hz > 0)) luaL_error(L, "hz: must be positive");
  if (!(s->least >= 0 && s->most >= s->least))
    luaL_error(L, "least, most: an amplitude range is needed");
  if (!(driver >= 1 && driver <= (double)drivers))
    luaL_error(L, "driver: no such driver");
  s->driver = (size_t)driver - 1;
}

static void read_spread(lua_State *L, int arg, lbr_problem_handle *h) {
  size_t n = list_field(L, arg, "spread", MOST_SOURCES);
  h->spread = owned(L, n, sizeof *h->spread);
  for (size_t i = 0; i < n; i++) {
    lua_rawgeti(L, -1, (lua_Integer)i + 1);
    h->spread[i] = luaL_checknumber(L, -1);
    if (!(h->spread[i] >= 0 && h->spread[i] < 1))
      luaL_error(L, "spread: must be at least 0 and below 1");
    lua_pop(L, 1);
  }
  h->scene.n_drivers = n;
  lua_pop(L, 1);
}

static void read_sources(lua_State *L, int arg, lbr_problem_handle *h) {
  size_t n = list_field(L, arg, "sources", MOST_SOURCES);
  h->sources = owned(L, n, sizeof *h->sources);
  for (size_t i = 0; i < n; i++) {
    lua_rawgeti(L, -1, (lua_Integer)i + 1);
    luaL_checktype(L, -1, LUA_TTABLE);
    read_source(L, lua_gettop(L), h->scene.n_drivers, &h->sources[i]);
    lua_pop(L, 1);
  }
  h->scene.n_sources = n;
  lua_pop(L, 1);
}

static void read_lines(lua_State *L, int arg, lbr_problem_handle *h) {
  size_t n = list_field(L, arg, "lines", h->scene.n_sources);
  h->lines = owned(L, n, sizeof *h->lines);
  for (size_t i = 0; i < n; i++) {
    lua_rawgeti(L, -1, (lua_Integer)i + 1);
    luaL_checktype(L, -1, LUA_TTABLE);
    if (!(h->sources[i].least > 0))
      luaL_error(L, "least: a line needs an amplitude above 0");
    int at = lua_gettop(L);
    h->lines[i] = (lbr_line){
        at_least(L, at, "tolerance", 0, INFINITY),
        at_least(L, at, "tolerance_abs", 0, INFINITY),
        at_least(L, at, "tolerance_hz", 0, INFINITY)};
    lua_pop(L, 1);
  }
  h->scene.n_lines = n;
  lua_pop(L, 1);
}

static void read_front(lua_State *L, int arg, lbr_front_end *f) {
  luaL_checktype(L, arg, LUA_TTABLE);
  f->flatness = at_least(L, arg, "flatness", 0, 0);
  f->accuracy = at_least(L, arg, "accuracy", 0, 0);
  f->timebase = at_least(L, arg, "timebase", 0, 0);
  f->jitter_s = at_least(L, arg, "jitter_s", 0, 0);
  f->range = at_least(L, arg, "range", 0, INFINITY);
  f->step = at_least(L, arg, "step", 0, 0);
  f->noise = at_least(L, arg, "noise", 0, 0);
  f->skew_s = at_least(L, arg, "skew_s", 0, 0);
  if (f->timebase >= 0.5) luaL_error(L, "timebase: must be below 0.5");
  lua_getfield(L, arg, "filter");
  lbr_check_filter(L, lua_gettop(L), &f->filter);
  lua_pop(L, 1);
}

static unsigned natural(lua_State *L, int arg, const char *name,
                        double fallback) {
  double value = at_least(L, arg, name, 1, fallback);
  if (value > UINT32_MAX) luaL_error(L, "%s: too large", name);
  return (unsigned)value;
}

/* A list of natural numbers; absent: { 1 }.  Anchored on the Lua stack. */
static const unsigned *naturals(lua_State *L, int arg, const char *name,
                                size_t *n) {
  size_t count = 0;
  if (lua_getfield(L, arg, name) == LUA_TTABLE)
    count = (size_t)lua_rawlen(L, -1);
  if (count > 4096) luaL_error(L, "%s: more than 4096 entries", name);
  unsigned *list = lua_newuserdatauv(L, (count + 1) * sizeof *list, 0);
  list[0] = 1;
  for (size_t i = 0; i < count; i++) {
    lua_rawgeti(L, -2, (lua_Integer)i + 1);
    lua_Integer value = luaL_checkinteger(L, -1);
    if (value < 1 || value > UINT32_MAX)
      luaL_error(L, "%s: %I is not a natural number", name,
                 (LUAI_UACINT)value);
    list[i] = (unsigned)value;
    lua_pop(L, 1);
  }
  lua_remove(L, -2);
  *n = count ? count : 1;
  return list;
}

static lbr_status add_list(lua_State *L, int arg, lbr_rates *rates,
                           lbr_rate_limits limits) {
  size_t n = list_field(L, arg, "list", LBR_MOST_RATES);
  lbr_status status = LBR_OK;
  for (size_t i = 0; i < n && status == LBR_OK; i++) {
    lua_rawgeti(L, -1, (lua_Integer)i + 1);
    double value = luaL_checknumber(L, -1);
    lua_pop(L, 1);
    if (value > 0)
      status = lbr_rates_add(rates, (lbr_rate){value, {(unsigned)i + 1, 0, 0}},
                             limits);
  }
  lua_pop(L, 1);
  return status;
}

static lbr_status add_clock(lua_State *L, int arg, const char *kind,
                            lbr_rates *rates, lbr_rate_limits limits) {
  if (strcmp(kind, "divider") == 0) {
    lbr_divider_clock c = {.clock = lbr_field_number(L, arg, "clock"),
                           .least = natural(L, arg, "least", 1),
                           .most = natural(L, arg, "most", 1),
                           .step = natural(L, arg, "step", 1)};
    c.decimation = naturals(L, arg, "decimation", &c.n_decimation);
    return lbr_rates_divide(rates, &c, limits);
  }
  lbr_pll_clock c = {.clock = lbr_field_number(L, arg, "clock"),
                     .multiply_least = natural(L, arg, "multiply_least", 1),
                     .multiply_most = natural(L, arg, "multiply_most", 1),
                     .multiply_step = natural(L, arg, "multiply_step", 1),
                     .divide_step = natural(L, arg, "divide_step", 1),
                     .divide_least = natural(L, arg, "divide_least", 1),
                     .divide_most = natural(L, arg, "divide_most", 1),
                     .vco_least = at_least(L, arg, "vco_least", 0, 0),
                     .vco_most = at_least(L, arg, "vco_most", 0, INFINITY)};
  c.after = naturals(L, arg, "after", &c.n_after);
  return lbr_rates_pll(rates, &c, limits);
}

static void read_rates(lua_State *L, int arg, lbr_problem_handle *h) {
  luaL_checktype(L, arg, LUA_TTABLE);
  lbr_rate_limits limits = {at_least(L, arg, "least_rate", 0, 0),
                            at_least(L, arg, "most_rate", 0, INFINITY)};
  int top = lua_gettop(L);
  lua_getfield(L, arg, "kind");
  const char *kind = luaL_checkstring(L, -1);
  lbr_status status = strcmp(kind, "list") == 0
                          ? add_list(L, arg, &h->rates, limits)
                          : add_clock(L, arg, kind, &h->rates, limits);
  lua_settop(L, top);
  if (status != LBR_OK) lbr_raise(L, status, "rates");
  lbr_rates_settle(&h->rates);
}

static void read_modes(lua_State *L, int arg, lbr_problem_handle *h) {
  size_t n = list_field(L, arg, "modes", MOST_MODES);
  h->modes = owned(L, n, sizeof *h->modes);
  for (size_t i = 0; i < n; i++) {
    lua_rawgeti(L, -1, (lua_Integer)i + 1);
    luaL_checktype(L, -1, LUA_TTABLE);
    int at = lua_gettop(L);
    lua_getfield(L, at, "window");
    lua_getfield(L, at, "reading");
    lua_getfield(L, at, "parameter");
    const char *name = luaL_checkstring(L, at + 1);
    const char *reading = luaL_checkstring(L, at + 2);
    double parameter = luaL_optnumber(L, at + 3, NAN);
    lbr_status status = lbr_window_find(name, parameter, &h->modes[i].window);
    if (status != LBR_OK) lbr_raise(L, status, name);
    h->modes[i].reading = strcmp(reading, "bin") == 0 ? LBR_READING_BIN
                                                      : LBR_READING_TRACKED;
    lua_settop(L, at - 1);
  }
  h->n_modes = n;
  lua_pop(L, 1);
}

static void read_limits(lua_State *L, int arg, lbr_problem_handle *h) {
  lbr_problem *p = &h->problem;
  *p = (lbr_problem){.scene = &h->scene, .front = &h->front,
                     .rates = &h->rates, .modes = h->modes,
                     .n_modes = h->n_modes};
  p->least_samples = count_field(L, arg, "least_samples", 4, 16);
  p->most_samples = count_field(L, arg, "most_samples", 4, 16777216);
  p->block = count_field(L, arg, "block", 1, 1);
  p->most_duration = at_least(L, arg, "most_duration", 0, INFINITY);
  p->averages = natural(L, arg, "averages", 1);
  p->coverage = at_least(L, arg, "coverage", 0, 3);
  p->share = 1;
  p->most_work = at_least(L, arg, "most_work", 0, 1e7);
  p->care_work = at_least(L, arg, "care_work", 0, 1e5);
}

static int problem_free(lua_State *L) {
  lbr_problem_handle *h = luaL_checkudata(L, 1, LBR_PROBLEM_CLASS);
  free(h->sources);
  free(h->lines);
  free(h->spread);
  free(h->modes);
  lbr_rates_free(&h->rates);
  h->sources = NULL;
  h->lines = NULL;
  h->spread = NULL;
  h->modes = NULL;
  h->scene = (lbr_scene){.n_sources = 0};
  h->problem.n_modes = 0;
  return 0;
}

lbr_problem_handle *lbr_check_problem(lua_State *L, int arg) {
  lbr_problem_handle *h = luaL_checkudata(L, arg, LBR_PROBLEM_CLASS);
  luaL_argcheck(L, h->sources != NULL, arg, "the problem was closed");
  return h;
}

lbr_problem_handle *lbr_push_problem(lua_State *L, int arg) {
  static const luaL_Reg meta[] = {
      {"__gc", problem_free}, {"__close", problem_free}, {NULL, NULL}};
  luaL_checktype(L, arg, LUA_TTABLE);
  lbr_problem_handle *h = lua_newuserdatauv(L, sizeof *h, 0);
  memset(h, 0, sizeof *h);
  if (luaL_newmetatable(L, LBR_PROBLEM_CLASS)) luaL_setfuncs(L, meta, 0);
  lua_setmetatable(L, -2);
  read_spread(L, arg, h);
  read_sources(L, arg, h);
  read_lines(L, arg, h);
  h->scene.sources = h->sources;
  h->scene.lines = h->lines;
  h->scene.spread = h->spread;
  h->scene.offset = at_least(L, arg, "offset", 0, 0);
  h->scene.noise = at_least(L, arg, "noise", 0, 0);
  lua_getfield(L, arg, "front");
  read_front(L, lua_gettop(L), &h->front);
  lua_getfield(L, arg, "rates");
  read_rates(L, lua_gettop(L), h);
  lua_pop(L, 2);
  read_modes(L, arg, h);
  read_limits(L, arg, h);
  return h;
}
