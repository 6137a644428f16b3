/* Samples made from samples: functions of each, trends, differences, sums.
 */
#include <math.h>
#include <stdint.h>
#include <string.h>

#include "bind/samples.h"
#include "samples/shape.h"

static int apply(lua_State *L, lbr_function function) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  lbr_apply(function, x, lbr_push_unset_samples(L, n), n);
  return 1;
}

/***
 * Magnitude of every sample.
 * @return samples: new ones
 * @usage
 * assert(core.samples.from { -2 }:abs()[1] == 2)
 */
static int samples_abs(lua_State *L) {
  return apply(L, LBR_ABS);
}

/***
 * Square of every sample.
 * @return samples: new ones
 * @usage
 * assert(core.samples.from { -3 }:square()[1] == 9)
 */
static int samples_square(lua_State *L) {
  return apply(L, LBR_SQUARE);
}

/***
 * Square root of every sample; nan below 0.
 * @return samples: new ones
 * @usage
 * assert(core.samples.from { 9 }:sqrt()[1] == 3)
 */
static int samples_sqrt(lua_State *L) {
  return apply(L, LBR_SQRT);
}

/***
 * Logarithm to base 10 of every sample; -inf at 0, nan below.
 * @return samples: new ones
 * @usage
 * assert(core.samples.from { 1000 }:log10()[1] == 3)
 */
static int samples_log10(lua_State *L) {
  return apply(L, LBR_LOG10);
}

/***
 * Natural logarithm of every sample; -inf at 0, nan below.
 * @return samples: new ones
 * @usage
 * assert(core.samples.from { 1 }:ln()[1] == 0)
 */
static int samples_ln(lua_State *L) {
  return apply(L, LBR_LN);
}

/***
 * Exponential function of every sample.
 * @return samples: new ones
 * @usage
 * assert(core.samples.from { 0 }:exp()[1] == 1)
 */
static int samples_exp(lua_State *L) {
  return apply(L, LBR_EXP);
}

/***
 * Nearest whole number to every sample, halves away from 0.
 * @return samples: new ones
 * @usage
 * assert(core.samples.from { -2.5 }:round()[1] == -3)
 */
static int samples_round(lua_State *L) {
  return apply(L, LBR_ROUND);
}

/***
 * Holds every sample between two limits.
 * @param low number: what is below becomes this
 * @param high number: what is above becomes this; not below low
 * @return samples: new ones; nan stays nan
 * @usage
 * local x = core.samples.from { -5, 0.5, 5 }:clip(-1, 1)
 * assert(x[1] == -1 and x[2] == 0.5 and x[3] == 1)
 */
static int samples_clip(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  double low = luaL_checknumber(L, 2), high = luaL_checknumber(L, 3);
  luaL_argcheck(L, low <= high, 3, "the upper limit is below the lower one");
  lbr_limit(x, low, high, lbr_push_unset_samples(L, n), n);
  return 1;
}

/***
 * Takes a trend out, by choice.
 * @param what string: "none" (a copy), "mean" or "linear" (the straight line
 *   of least squares)
 * @return samples: new ones
 * @return number: the mean that was taken out, 0 for none
 * @return number: the slope that was taken out, unit per sample; the line
 *   goes through the mean at the middle
 * @usage
 * local x = core.samples.from { 1, 3, 5 }
 * local y, mean, slope = x:detrend "linear"
 * assert(y:peak() == 0 and mean == 3 and slope == 2)
 */
static int samples_detrend(lua_State *L) {
  static const char *const names[] = {"none", "mean", "linear", NULL};
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  const char *name = luaL_checkstring(L, 2);
  int what = 0;
  while (names[what] && strcmp(name, names[what]) != 0) what++;
  if (!names[what])
    return luaL_argerror(L, 2, lua_pushfstring(
        L, "\"%s\" is no trend; choose none, mean or linear", name));
  lbr_trend trend = what ? lbr_trend_of(x, n) : (lbr_trend){0, 0};
  if (what == 1) trend.slope = 0;
  lbr_detrend(x, trend, lbr_push_unset_samples(L, n), n);
  lua_pushnumber(L, trend.mean);
  lua_pushnumber(L, trend.slope);
  return 3;
}

/***
 * Differences of neighbours, x[i + 1] - x[i].
 * @return samples: one fewer; raises where there are none to begin with
 * @usage
 * assert(core.samples.from { 1, 4, 9 }:differences()[2] == 5)
 */
static int samples_differences(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  luaL_argcheck(L, n > 0, 1, "no samples");
  lbr_differences(x, lbr_push_unset_samples(L, n - 1), n);
  return 1;
}

/***
 * Running sum, x[1] + ... + x[i]; its rounding does not grow with i.
 * @return samples: as many
 * @usage
 * assert(core.samples.from { 1, 2, 3 }:cumulative()[3] == 6)
 */
static int samples_cumulative(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  lbr_running_sum(x, lbr_push_unset_samples(L, n), n);
  return 1;
}

/***
 * Passes these samples through a filter: filter:run(x, ...).
 * @param filter any: what has a method run: a digital filter, a linear-phase
 *   filter, a resampler, a stream of one of them, a decimator
 * @param ... any: passed on
 * @return samples: what run returns
 * @usage
 * local spec = { shape = "butterworth", order = 2, corner = 1 }
 * local f = core.filter.sections(spec, "low", 10, 100)
 * local x = core.samples.new(50):fill(1)
 * assert(math.abs(x:filter(f)[-1] - 1) < 1e-9)
 */
static int samples_filter(lua_State *L) {
  size_t n;
  int type = lua_type(L, 2);
  lbr_check_samples(L, 1, &n);
  luaL_argcheck(L, type == LUA_TUSERDATA || type == LUA_TTABLE, 2,
                "no filter: it has no method run");
  if (luaL_testudata(L, 2, LBR_SAMPLES_CLASS) ||
      lua_getfield(L, 2, "run") == LUA_TNIL)
    return luaL_argerror(L, 2, "no filter: it has no method run");
  lua_insert(L, 1);   /* run, x, filter, ... */
  lua_pushvalue(L, 2);
  lua_remove(L, 2);
  lua_insert(L, 3);   /* run, filter, x, ... */
  lua_call(L, lua_gettop(L) - 1, LUA_MULTRET);
  return lua_gettop(L);
}

/* Adds the samples at index `arg` to a total that must stay a size. */
static size_t add_length(lua_State *L, int arg, size_t total) {
  size_t n;
  lbr_check_samples(L, arg, &n);
  if (n > SIZE_MAX / 16 - total) lbr_raise(L, LBR_OVERFLOW, "samples");
  return total + n;
}

/***
 * Samples one after another, in a block of their own; x .. y does the same
 * for two.
 * @param ... samples: any number of them
 * @return samples: all of them
 * @usage
 * local x = core.samples.from { 1, 2 }
 * assert(#core.samples.join(x, x, x) == 6 and (x .. x)[3] == 1)
 */
static int samples_join(lua_State *L) {
  size_t total = 0, n;
  int last = lua_gettop(L);
  for (int arg = 1; arg <= last; arg++) total = add_length(L, arg, total);
  double *out = lbr_push_unset_samples(L, total);
  for (int arg = 1; arg <= last; arg++) {
    const double *x = lbr_check_samples(L, arg, &n);
    memcpy(out, x, n * sizeof *out);
    out += n;
  }
  return 1;
}

const luaL_Reg lbr_samples_shape_methods[] = {
    {"abs", samples_abs},         {"square", samples_square},
    {"sqrt", samples_sqrt},       {"log10", samples_log10},
    {"ln", samples_ln},           {"exp", samples_exp},
    {"round", samples_round},     {"clip", samples_clip},
    {"detrend", samples_detrend}, {"differences", samples_differences},
    {"cumulative", samples_cumulative}, {"filter", samples_filter},
    {NULL, NULL}};

const luaL_Reg lbr_samples_shape_functions[] = {{"join", samples_join},
                                                {NULL, NULL}};

const luaL_Reg lbr_samples_shape_meta[] = {{"__concat", samples_join},
                                           {NULL, NULL}};
