/* core.lines: peaks above the noise, and frequencies from bins. */
#include <math.h>
#include <string.h>

#include "bind/lines.h"
#include "bind/samples.h"
#include "lines/chance.h"
#include "lines/estimator.h"
#include "lines/list.h"

#define LIST_CLASS "libration.lines.peaks"

static int list_close(lua_State *L) {
  lbr_list **l = luaL_checkudata(L, 1, LIST_CLASS);
  lbr_list_free(*l);
  *l = NULL;
  return 0;
}

static const luaL_Reg list_methods[] = {{NULL, NULL}};
static const luaL_Reg list_meta[] = {
    {"__close", list_close}, {"__gc", list_close}, {NULL, NULL}};

static void push_facts(lua_State *L, const lbr_list_facts *f) {
  lua_createtable(L, 0, 8);
  lbr_put_number(L, "freedom", f->freedom);
  lbr_put_number(L, "cells", f->cells);
  lbr_put_number(L, "factor", f->factor);
  lbr_put_number(L, "sum", f->sum);
  lbr_put_number(L, "square", f->square);
  lbr_put_number(L, "bend", f->bend);
  lbr_put_number(L, "tilt", f->tilt);
  lua_pushinteger(L, (lua_Integer)f->segments);
  lua_setfield(L, -2, "segments");
  lua_pushinteger(L, (lua_Integer)f->first);
  lua_setfield(L, -2, "first");
  lua_pushinteger(L, (lua_Integer)f->last);
  lua_setfield(L, -2, "last");
}

/*** Peaks of an averaged power spectrum above the local noise floor.
 * The power of bin k (0 to m / 2) is the mean over segments of |sum w x
 * exp(-2 pi i k n / m)|^2; the floor is the median of the `width` nearest bins
 * outside peaks, corrected to the mean of the chi-square law.
 * @param x samples: the record
 * @param w samples: the window; its length m is a segment's, 16 or more
 * @param step integer: samples from segment to segment
 * @param width integer: bins that make a floor, odd, 5 or more
 * @param guard integer: half width of the window's main lobe, bins
 * @param false_alarm number: chance of any peak in noise alone, 0 to 0.5
 * @return table: the bins of the peaks; also segments, freedom (degrees, of a
 *   bin's power), cells (independent ones in a floor), factor (power over the
 *   floor that makes a peak), first, last (bins tested), and the window's sum,
 *   square, bend, tilt (sums of w, w^2, w t^2, (w t)^2, t from its centre); or
 *   nil, message, code
 * @return samples: the power, m // 2 + 1 values
 * @return samples: the floor; 0 in bins that are not tested
 * @usage
 * local x = lb.samples.make(512, function(i)
 *   return math.cos(math.pi / 4 * i) + math.sin(i * i) / 10
 * end)
 * local w = lb.window("hann"):samples(512)
 * local peaks = core.lines.peaks(x, w, 512, 51, 2, 1e-3)
 * assert(#peaks == 1 and peaks[1] == 64)
 */
static int peaks(lua_State *L) {
  size_t n, m;
  lbr_list_setup s;
  const double *x = lbr_check_samples(L, 1, &n);
  const double *w = lbr_check_samples(L, 2, &m);
  s.step = lbr_check_count(L, 3, 1, SIZE_MAX / 64);
  s.width = lbr_check_count(L, 4, 5, SIZE_MAX / 64);
  s.guard = lbr_check_count(L, 5, 1, SIZE_MAX / 64);
  s.false_alarm = luaL_checknumber(L, 6);
  luaL_argcheck(L, s.width % 2 == 1, 4, "the number of bins must be odd");
  luaL_argcheck(L, s.false_alarm > 0 && s.false_alarm < 0.5, 6,
                "the chance must lie between 0 and 0.5");
  lua_settop(L, 6);
  lbr_list **slot = lua_newuserdatauv(L, sizeof *slot, 0);
  *slot = NULL;
  lbr_set_class(L, LIST_CLASS, list_methods, list_meta);
  lua_toclose(L, 7);
  lbr_status status = lbr_list_new(x, n, w, m, &s, slot);
  if (status != LBR_OK) return lbr_refuse(L, status, "peaks");
  push_facts(L, lbr_list_about(*slot));
  for (size_t i = 0; i < lbr_list_about(*slot)->peaks; i++) {
    lua_pushinteger(L, (lua_Integer)lbr_list_peaks(*slot)[i]);
    lua_seti(L, -2, (lua_Integer)i + 1);
  }
  double *power = lbr_push_unset_samples(L, m / 2 + 1);
  memcpy(power, lbr_list_power(*slot), (m / 2 + 1) * sizeof *power);
  double *level = lbr_push_unset_samples(L, m / 2 + 1);
  memcpy(level, lbr_list_floor(*slot), (m / 2 + 1) * sizeof *level);
  lua_closeslot(L, 7);
  return 3;
}

/*** The chance that noise exceeds its mean power by a factor.
 * @param freedom number: degrees of freedom of the chi-square law
 * @param factor number: power over mean power, 0 or more
 * @return number: the chance
 * @usage
 * assert(math.abs(core.lines.chance(2, 3) - math.exp(-3)) < 1e-15)
 */
static int chance(lua_State *L) {
  double freedom = luaL_checknumber(L, 1), factor = luaL_checknumber(L, 2);
  luaL_argcheck(L, freedom > 0 && freedom < 1e6, 1, "not between 0 and 1e6");
  luaL_argcheck(L, factor >= 0, 2, "a power below 0");
  lua_pushnumber(L, lbr_chi_square_above(freedom, factor));
  return 1;
}

/*** The power over mean power that noise exceeds with a chance.
 * With cells, the mean power is not known but estimated as the median of so
 * many independent cells, corrected for its bias.
 * @param freedom number: degrees of freedom of the chi-square law
 * @param p number: the chance, between 0 and 1
 * @param cells number: cells of the median, 3 or more; nil: mean power known
 * @return number: power over (estimated) mean power
 * @usage
 * assert(math.abs(core.lines.level(2, 0.05) - math.log(20)) < 1e-12)
 */
static int level(lua_State *L) {
  double freedom = luaL_checknumber(L, 1), p = luaL_checknumber(L, 2);
  luaL_argcheck(L, freedom > 0 && freedom < 1e6, 1, "not between 0 and 1e6");
  luaL_argcheck(L, p > 0 && p < 1, 2, "the chance must lie between 0 and 1");
  if (lua_isnoneornil(L, 3)) {
    lua_pushnumber(L, lbr_chi_square_level(freedom, p));
    return 1;
  }
  double cells = luaL_checknumber(L, 3);
  luaL_argcheck(L, cells >= 3 && cells < 1e9, 3, "not 3 cells or more");
  lua_pushnumber(L, lbr_floor_factor(freedom, cells, p));
  return 1;
}

/*** The estimators of frequency from bins.
 * @return table: list of { name, source, window ("hann" or "rectangle") }
 * @usage
 * assert(core.lines.estimators()[1].name == "aboutanios_mulgrew2005")
 */
static int estimators(lua_State *L) {
  lua_createtable(L, (int)lbr_estimators(), 0);
  for (size_t i = 0; i < lbr_estimators(); i++) {
    const lbr_estimator *row = lbr_estimator_at(i);
    lua_createtable(L, 0, 3);
    lua_pushstring(L, row->name);
    lua_setfield(L, -2, "name");
    lua_pushstring(L, row->source);
    lua_setfield(L, -2, "source");
    lua_pushstring(L, row->hann ? "hann" : "rectangle");
    lua_setfield(L, -2, "window");
    lua_seti(L, -2, (lua_Integer)i + 1);
  }
  return 1;
}

static int unknown_estimator(lua_State *L) {
  luaL_Buffer b;
  luaL_buffinit(L, &b);
  luaL_addstring(&b, "no such estimator; valid are");
  for (size_t i = 0; i < lbr_estimators(); i++) {
    luaL_addstring(&b, i ? ", " : " ");
    luaL_addstring(&b, lbr_estimator_at(i)->name);
  }
  luaL_pushresult(&b);
  return luaL_argerror(L, 1, lua_tostring(L, -1));
}

/*** Distance of a line from a bin, by an estimator.
 * The bin is that of the highest power; time counts from the first sample.
 * @param name string: of an estimator
 * @param x samples: the record, or its real part; 8 samples or more
 * @param k integer: the bin, 0 to #x - 1
 * @param im samples: its imaginary part, of a complex record; default none
 * @return number: bins; or nil, message, code ("domain") where the formula has
 *   no value
 * @usage
 * local x = lb.samples.make(64, function(i)
 *   return math.cos(math.pi * i / 4)
 * end)
 * assert(math.abs(core.lines.estimate("candan2013", x, 8)) < 1e-12)
 */
static int estimate(lua_State *L) {
  const lbr_estimator *row;
  size_t n, m;
  double offset;
  if (lbr_estimator_find(luaL_checkstring(L, 1), &row) != LBR_OK)
    return unknown_estimator(L);
  const double *re = lbr_check_samples(L, 2, &n), *im = NULL;
  luaL_argcheck(L, n >= 8, 2, "fewer than 8 samples");
  size_t k = lbr_check_count(L, 3, 0, n - 1);
  if (!lua_isnoneornil(L, 4)) {
    im = lbr_check_samples(L, 4, &m);
    luaL_argcheck(L, m == n, 4, "not as long as the real part");
  }
  lbr_status status = lbr_estimate(row, re, im, n, k, &offset);
  if (status != LBR_OK) return lbr_refuse(L, status, row->name);
  lua_pushnumber(L, offset);
  return 1;
}

const luaL_Reg lbr_lines_list_functions[] = {
    {"chance", chance}, {"estimate", estimate}, {"estimators", estimators},
    {"level", level},   {"peaks", peaks},       {NULL, NULL}};
