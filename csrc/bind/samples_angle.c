/* From a tacho to samples at equal angles: crossings of a level, samples
 * between samples.
 */
#include <math.h>
#include <string.h>

#include "base/checked.h"
#include "bind/samples.h"
#include "samples/crossing.h"
#include "samples/places.h"

#define KERNEL_CLASS "libration.samples_kernel"
#define MOST_VALUES ((size_t)1 << 31)

static int kernel_close(lua_State *L) {
  lbr_places *p = luaL_checkudata(L, 1, KERNEL_CLASS);
  free(p->row);
  *p = (lbr_places){0, NULL};
  return 0;
}

static const luaL_Reg kernel_meta[] = {
    {"__gc", kernel_close}, {"__close", kernel_close}, {NULL, NULL}};

/***
 * Places where a level is crossed, between the samples.
 * @param level number: the level, unit of the samples
 * @param hysteresis number: before a crossing counts the record must have been
 *   this far below the level (above it for falling ones), default 0
 * @param falling boolean: true for downward crossings, default upward
 * @param curve string: "line" (default: on the straight line between the two
 *   samples, right for pulses with edges of a sample or less) or "cubic" (on
 *   the cubic through four samples, for smooth signals)
 * @return samples: places in samples, counted from 0 at the first sample;
 *   divided by the rate they are times
 * @usage
 * local x = core.samples.from { 0, 1, 0, 1 }
 * local at = x:crossings(0.5)
 * assert(#at == 2 and at[1] == 0.5 and at[2] == 2.5)
 */
static int samples_crossings(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  lbr_crossing_rule rule = {luaL_checknumber(L, 2), luaL_optnumber(L, 3, 0),
                            lua_toboolean(L, 4), 0};
  const char *curve = luaL_optstring(L, 5, "line");
  rule.cubic = strcmp(curve, "cubic") == 0;
  if (!rule.cubic && strcmp(curve, "line") != 0)
    return luaL_argerror(L, 5, lua_pushfstring(
        L, "\"%s\" is no curve; choose line or cubic", curve));
  luaL_argcheck(L, isfinite(rule.level), 2, "the level must be finite");
  luaL_argcheck(L, rule.hysteresis >= 0 && isfinite(rule.hysteresis), 3,
                "the hysteresis must be 0 or more");
  size_t count = lbr_crossings(x, n, &rule, NULL, 0);
  double *out = lbr_push_unset_samples(L, count);
  lbr_crossings(x, n, &rule, out, count);
  return 1;
}

static const double *check_places(lua_State *L, size_t n, size_t *count) {
  const double *at = lbr_check_samples(L, 2, count);
  for (size_t i = 0; i < *count; i++)
    if (!(at[i] >= 0 && at[i] <= (double)n - 1))
      luaL_argerror(L, 2, lua_pushfstring(
          L, "place %f (item %I) is outside 0 .. %I", at[i],
          (LUAI_UACINT)(i + 1), (LUAI_UACINT)n - 1));
  return at;
}

/***
 * Values between the samples, by band-limited interpolation.
 * What lies below keep * ratio of the sample rate is kept to 10^(-db/20) of
 * its amplitude; what lies above (1 - keep) * ratio is taken away likewise
 * (design rule of Kaiser; within a kernel's reach, about db / (29 (1 - 2 keep)
 * ratio) samples, of an end the record goes on turned about its end point).
 * @param places samples: where, in samples from 0 at the first, to #x - 1
 * @param keep number: share of the rate, below 0.5, default 0.4
 * @param ratio number: values per sample where fewer are taken than there
 *   are samples, at most 1, the default
 * @param db number: 8 to 140, default 100
 * @return samples: a value for each place
 * @usage
 * local x = core.samples.new(200):fill(2)
 * local y = x:values_at(core.samples.from { 99.5, 0.25 })
 * assert(math.abs(y[1] - 2) < 2e-5)
 */
static int samples_values_at(lua_State *L) {
  size_t n, count;
  lua_settop(L, 5);
  const double *x = lbr_check_samples(L, 1, &n);
  const double *at = check_places(L, n, &count);
  double keep = luaL_optnumber(L, 3, 0.4), ratio = luaL_optnumber(L, 4, 1);
  double db = luaL_optnumber(L, 5, 100);
  luaL_argcheck(L, keep > 0 && keep < 0.5, 3, "keep lies between 0 and 0.5");
  luaL_argcheck(L, ratio > 0 && ratio <= 1, 4, "ratio lies in (0, 1]");
  luaL_argcheck(L, db >= 8 && db <= 140, 5, "the error is 8 to 140 dB down");
  double *y = lbr_push_unset_samples(L, count);
  static const luaL_Reg none[] = {{NULL, NULL}};
  lbr_places *kernel = lua_newuserdatauv(L, sizeof *kernel, 0);
  *kernel = (lbr_places){0, NULL};
  lbr_set_class(L, KERNEL_CLASS, none, kernel_meta);
  lua_toclose(L, -1);
  lbr_status status = lbr_places_make(keep, ratio, db, kernel);
  if (status == LBR_OVERFLOW)
    return luaL_argerror(L, 4, "the kernel would be longer than 2^15 samples; "
                               "raise the ratio or lower keep");
  if (status != LBR_OK) return lbr_raise(L, status, "values_at");
  lbr_places_take(kernel, x, n, at, y, count);
  lua_pushvalue(L, -2);
  return 1;
}

/***
 * A table given at 0, 1, 2 ... taken at equal finer steps, by cubics.
 * Exact for cubics; elsewhere off by 3/128 of the fourth difference, more in
 * the first and the last cell.
 * @param per integer: values per cell, 1 to 65536
 * @return samples: values at 0, 1/per, 2/per ... #x - 1; raises below 4
 *   samples
 * @usage
 * local x = core.samples.from { 0, 1, 4, 9 }
 * local y = x:refine(2)
 * assert(#y == 7 and y[2] == 0.25 and y[7] == 9)
 */
static int samples_refine(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  size_t per = lbr_check_count(L, 2, 1, 65536);
  luaL_argcheck(L, n >= 4, 1, "it takes 4 samples or more");
  luaL_argcheck(L, n - 1 <= MOST_VALUES / per, 2, "more than 2^31 values");
  size_t count = (n - 1) * per + 1;
  double *y = lbr_push_unset_samples(L, count);
  lbr_table_even(x, n, per, y, count);
  return 1;
}

const luaL_Reg lbr_samples_angle_methods[] = {
    {"crossings", samples_crossings},
    {"values_at", samples_values_at},
    {"refine", samples_refine},
    {NULL, NULL}};
