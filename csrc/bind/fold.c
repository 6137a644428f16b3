/* Folding and coherence: the part of core.plan that needs no problem. */
#include <math.h>
#include <stdlib.h>

#include "bind/fraction.h"
#include "bind/problem.h"
#include "plan/coherent.h"
#include "plan/fold.h"

/*** Where a true frequency shows in a record.
 * @param hz number: true frequency, Hz, at least 0
 * @param rate number: sample rate, S/s
 * @return number: where it shows, Hz, 0 to rate/2
 * @return integer: zone; 1 is below rate/2
 * @return boolean: whether a rising frequency shows as a falling one
 * @usage
 * local shown, zone, inverted = core.plan.fold(60, 100)
 * assert(shown == 40 and zone == 2 and inverted)
 */
static int plan_fold(lua_State *L) {
  double hz = luaL_checknumber(L, 1), rate = lbr_check_positive(L, 2);
  luaL_argcheck(L, hz >= 0 && isfinite(hz), 1, "at least 0 Hz is needed");
  lbr_fold fold = lbr_fold_at(hz, rate);
  lua_pushnumber(L, fold.shown_hz);
  if (fold.zone < 9e15)
    lua_pushinteger(L, (lua_Integer)fold.zone);
  else
    lua_pushnumber(L, fold.zone);
  lua_pushboolean(L, fold.inverted);
  return 3;
}

/*** Rates that fold a whole band into one zone: deliberate undersampling.
 * Vaughan, Scott & White 1991, IEEE Trans. SP 39(9), eq. 4-5.
 * @param low number: lower edge of the band, Hz
 * @param high number: upper edge, Hz, above low
 * @param zone integer: 1 and up; even zones come out inverted
 * @return number: lowest rate, S/s; nil when the zone cannot hold the band
 * @return number: highest rate, S/s (math.huge for zone 1)
 * @usage
 * local least, most = core.plan.fold_band(88e6, 108e6, 5)
 * assert(least == 43.2e6 and most == 44e6)
 */
static int plan_fold_band(lua_State *L) {
  double low = lbr_check_positive(L, 1), high = lbr_check_positive(L, 2);
  double least, most;
  size_t zone = lbr_check_count(L, 3, 1, 1u << 30);
  luaL_argcheck(L, high > low, 2, "the upper edge must be above the lower");
  if (!lbr_fold_band(low, high, (unsigned)zone, &least, &most)) {
    lua_pushnil(L);
    return 1;
  }
  lua_pushnumber(L, least);
  lua_pushnumber(L, most);
  return 2;
}

/*** The shortest duration in which every frequency makes whole cycles.
 * @param list table: fractions, Hz, all positive
 * @return fraction: seconds; or nil, message, code when 64 bits do not hold it
 * @usage
 * local f = core.base.fraction
 * assert(core.plan.coherent_period { f(50), f(123, 5) } == f(5))
 */
static int plan_coherent_period(lua_State *L) {
  luaL_checktype(L, 1, LUA_TTABLE);
  size_t n = (size_t)lua_rawlen(L, 1);
  luaL_argcheck(L, n >= 1 && n <= 65536, 1, "1 to 65536 fractions are needed");
  lbr_fraction *list = lua_newuserdatauv(L, n * sizeof *list, 0), period;
  for (size_t i = 0; i < n; i++) {
    lua_rawgeti(L, 1, (lua_Integer)i + 1);
    list[i] = lbr_check_fraction(L, -1);
    luaL_argcheck(L, list[i].num > 0, 1, "frequencies must be positive");
    lua_pop(L, 1);
  }
  lbr_status status = lbr_coherent_period(list, n, &period);
  if (status != LBR_OK) return lbr_refuse(L, status, "coherent period");
  lbr_push_fraction(L, period);
  return 1;
}

static const double *hz_list(lua_State *L, const char *name, size_t *n) {
  if (lua_getfield(L, 1, name) == LUA_TNIL) lua_newtable(L);
  luaL_argcheck(L, lua_istable(L, -1), 1, "lines and away are lists of Hz");
  *n = (size_t)lua_rawlen(L, -1);
  luaL_argcheck(L, *n <= 65536, 1, "too many frequencies");
  double *list = lua_newuserdatauv(L, (*n + 1) * sizeof *list, 0), before = 0;
  for (size_t i = 0; i < *n; i++) {
    lua_rawgeti(L, -2, (lua_Integer)i + 1);
    list[i] = luaL_checknumber(L, -1);
    if (!(list[i] >= before && isfinite(list[i]) && list[i] > 0))
      luaL_error(L, "%s: positive frequencies in ascending order are needed",
                 name);
    before = list[i];
    lua_pop(L, 1);
  }
  return list;
}

/* The coherent period of the lines, each taken for its shortest decimal; 0
 * where 64 bits do not hold it. */
static double period_of(lua_State *L, size_t n) {
  lua_getfield(L, 1, "lines");
  lbr_fraction *list = lua_newuserdatauv(L, (n + 1) * sizeof *list, 0), period;
  for (size_t i = 0; i < n; i++) {
    lua_rawgeti(L, -2, (lua_Integer)i + 1);
    list[i] = lbr_check_fraction(L, -1);
    lua_pop(L, 1);
  }
  lbr_status status = lbr_coherent_period(list, n, &period);
  return status == LBR_OK ? lbr_fraction_to_double(period) : 0;
}

static uint32_t whole(lua_State *L, const char *name) {
  double value = lbr_field_number(L, 1, name);
  if (!(value >= 1 && value <= UINT32_MAX))
    luaL_error(L, "%s: a whole number from 1 to 2^32 - 1 is needed", name);
  return (uint32_t)value;
}

static int settings_free(lua_State *L) {
  lbr_settings_free(lua_touserdata(L, 1));
  return 0;
}

/* Pushes a handle that frees the settings whatever happens. */
static lbr_settings *push_settings(lua_State *L) {
  lbr_settings *s = lua_newuserdatauv(L, sizeof *s, 0);
  *s = (lbr_settings){NULL, 0, 0};
  if (luaL_newmetatable(L, "libration.settings")) {
    lua_pushcfunction(L, settings_free);
    lua_setfield(L, -2, "__gc");
  }
  lua_setmetatable(L, -2);
  return s;
}

static int by_duration(const void *left, const void *right) {
  const lbr_setting *a = left, *b = right;
  uint64_t ta = (uint64_t)a->divider * a->samples;
  uint64_t tb = (uint64_t)b->divider * b->samples;
  if (ta != tb) return ta < tb ? -1 : 1;
  return a->samples < b->samples ? -1 : a->samples > b->samples;
}

/* The shortest records as rows; pushes one table. */
static void push_rows(lua_State *L, const lbr_settings *s, size_t most) {
  size_t n = s->count < most ? s->count : most;
  lbr_setting *all = NULL;
  if (n > 0) {
    all = lua_newuserdatauv(L, s->count * sizeof *all, 0);
    lbr_settings_join(s, all);
    qsort(all, s->count, sizeof *all, by_duration);
  }
  lua_createtable(L, (int)n, 0);
  for (size_t i = 0; i < n; i++) {
    lua_createtable(L, 0, 2);
    lua_pushinteger(L, all[i].divider);
    lua_setfield(L, -2, "divider");
    lua_pushinteger(L, all[i].samples);
    lua_setfield(L, -2, "samples");
    lua_rawseti(L, -2, (lua_Integer)i + 1);
  }
}

/*** Every (divider, samples) of a clock that is coherent with all lines.
 * Lines stay below half the rate and within `off` bins of whole cycles,
 * folded interferers more than `bins` bins away from every line.
 * @param t table: clock (Hz), divider_least, divider_most, samples_least,
 *   samples_most, lines (ascending list of Hz), off (bins, below 0.5), away
 *   (ascending list of Hz, may be empty), bins, workers (0: all cores), most
 *   (rows returned, default 1000: the shortest records)
 * @return table: rows { divider =, samples = }, shortest records first
 * @return integer: how many there are in all; or nil, message, code
 * @usage
 * local rows, count = core.plan.coherent {
 *   clock = 1000, divider_least = 1, divider_most = 10, samples_least = 16,
 *   samples_most = 100, lines = { 50 }, off = 0.001 }
 * assert(count > 0 and rows[1].samples * rows[1].divider % 20 == 0)
 */
static int plan_coherent(lua_State *L) {
  luaL_checktype(L, 1, LUA_TTABLE);
  lbr_pair_demand d = {.off = lbr_field_number(L, 1, "off"),
                       .bins = lbr_field_or(L, 1, "bins", 0)};
  d.line = hz_list(L, "lines", &d.n_lines);
  d.away = hz_list(L, "away", &d.n_away);
  luaL_argcheck(L, d.n_lines > 0, 1, "lines: at least one is needed");
  d.period = period_of(L, d.n_lines);
  luaL_argcheck(L, d.off > 0 && d.off < 0.5, 1, "off: between 0 and 0.5 bins");
  lbr_grid grid = {.clock = lbr_field_number(L, 1, "clock"),
                   .divider_least = whole(L, "divider_least"),
                   .divider_most = whole(L, "divider_most"),
                   .samples_least = whole(L, "samples_least"),
                   .samples_most = whole(L, "samples_most"),
                   .most_duration = lbr_field_or(L, 1, "most_duration",
                                                 INFINITY)};
  luaL_argcheck(L, grid.clock > 0, 1, "clock: a positive frequency is needed");
  double workers = lbr_field_or(L, 1, "workers", 0);
  double most = lbr_field_or(L, 1, "most", 1000);
  luaL_argcheck(L, workers >= 0 && workers <= 256, 1, "workers: 0 to 256");
  luaL_argcheck(L, most >= 0 && most <= 1e6, 1, "most: 0 to 1e6 rows");
  lbr_settings *found = push_settings(L);
  lbr_status status = lbr_coherent_settings(&grid, &d, (unsigned)workers,
                                            found);
  if (status != LBR_OK) return lbr_refuse(L, status, "coherent settings");
  push_rows(L, found, (size_t)most);
  lua_pushinteger(L, (lua_Integer)found->count);
  return 2;
}

static const luaL_Reg functions[] = {
    {"coherent", plan_coherent},
    {"coherent_period", plan_coherent_period},
    {"fold", plan_fold},
    {"fold_band", plan_fold_band},
    {NULL, NULL},
};

void lbr_add_folds(lua_State *L) { luaL_setfuncs(L, functions, 0); }
