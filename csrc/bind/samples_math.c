/* Arithmetic and figures of samples. */
#include <math.h>
#include <stdio.h>

#include "bind/samples.h"
#include "samples/arith.h"
#include "samples/measure.h"

/* As many samples on both sides, or an error that says how many. */
static void check_same(lua_State *L, int arg, size_t n, size_t m) {
  if (n != m)
    luaL_argerror(L, arg, lua_pushfstring(
        L, "%I samples cannot go with %I samples", (LUAI_UACINT)m,
        (LUAI_UACINT)n));
}

static int is_samples(lua_State *L, int arg) {
  return luaL_testudata(L, arg, LBR_SAMPLES_CLASS) != NULL;
}

static int operate(lua_State *L, lbr_operation op) {
  size_t n, m;
  if (is_samples(L, 1) && is_samples(L, 2)) {
    const double *x = lbr_check_samples(L, 1, &n);
    const double *y = lbr_check_samples(L, 2, &m);
    check_same(L, 2, n, m);
    lbr_arith(op, x, y, lbr_push_unset_samples(L, n), n);
  } else {
    int first = !is_samples(L, 1);
    double k = luaL_checknumber(L, first ? 1 : 2);
    const double *x = lbr_check_samples(L, first ? 2 : 1, &n);
    lbr_arith_number(op, x, k, first, lbr_push_unset_samples(L, n), n);
  }
  return 1;
}

static int samples_plus(lua_State *L) { return operate(L, LBR_ADD); }
static int samples_minus(lua_State *L) { return operate(L, LBR_SUBTRACT); }
static int samples_times(lua_State *L) { return operate(L, LBR_MULTIPLY); }
static int samples_over(lua_State *L) { return operate(L, LBR_DIVIDE); }

static int samples_negative(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  lbr_arith_number(LBR_MULTIPLY, x, -1, true, lbr_push_unset_samples(L, n), n);
  return 1;
}

static int samples_equal(lua_State *L) {
  size_t n, m;
  if (!is_samples(L, 1) || !is_samples(L, 2)) {
    lua_pushboolean(L, 0);
    return 1;
  }
  const double *x = lbr_check_samples(L, 1, &n);
  const double *y = lbr_check_samples(L, 2, &m);
  lua_pushboolean(L, n == m && lbr_all_equal(x, y, n));
  return 1;
}

/***
 * Adds to these samples, in place.
 * @param other samples or number: what is added; samples must be as many
 * @param factor number: multiplies it first, default 1
 * @return samples: these samples
 * @usage
 * local x = core.samples.from { 1, 2 }
 * x:add(core.samples.from { 10, 20 }, 0.5):add(1)
 * assert(x[1] == 7 and x[2] == 13)
 */
static int samples_add(lua_State *L) {
  size_t n, m;
  double *x = lbr_check_writable_samples(L, 1, &n);
  double factor = luaL_optnumber(L, 3, 1);
  if (is_samples(L, 2)) {
    const double *y = lbr_check_samples(L, 2, &m);
    check_same(L, 2, n, m);
    lbr_add_scaled(x, y, factor, n);
  } else {
    double k = factor * luaL_checknumber(L, 2);
    lbr_arith_number(LBR_ADD, x, k, false, x, n);
  }
  lua_settop(L, 1);
  return 1;
}

/***
 * Multiplies these samples by a number, in place.
 * @param factor number: the factor
 * @return samples: these samples
 * @usage
 * assert(core.samples.from { 1, -2 }:scale(3)[2] == -6)
 */
static int samples_scale(lua_State *L) {
  size_t n;
  double *x = lbr_check_writable_samples(L, 1, &n);
  lbr_arith_number(LBR_MULTIPLY, x, luaL_checknumber(L, 2), false, x, n);
  lua_settop(L, 1);
  return 1;
}

/***
 * Sum of all samples, pairwise: rounding grows with the logarithm of n only.
 * @return number: the sum; 0 for no samples
 * @usage
 * assert(core.samples.new(1000):fill(0.125):sum() == 125)
 */
static int samples_sum(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  lua_pushnumber(L, lbr_sum(x, n));
  return 1;
}

/* Samples of which there must be some. */
static const double *check_some(lua_State *L, size_t *n) {
  const double *x = lbr_check_samples(L, 1, n);
  luaL_argcheck(L, *n > 0, 1, "no samples");
  return x;
}

/***
 * Arithmetic mean; raises when there are no samples.
 * @return number: the mean
 * @usage
 * assert(core.samples.from { 1, 2, 6 }:mean() == 3)
 */
static int samples_mean(lua_State *L) {
  size_t n;
  const double *x = check_some(L, &n);
  lua_pushnumber(L, lbr_sum(x, n) / (double)n);
  return 1;
}

/***
 * Root of the mean of the squares; raises when there are no samples.
 * @return number: the root mean square, mean included
 * @usage
 * assert(core.samples.from { 3, -3 }:rms() == 3)
 */
static int samples_rms(lua_State *L) {
  size_t n;
  const double *x = check_some(L, &n);
  lua_pushnumber(L, lbr_rms(x, n));
  return 1;
}

/***
 * Smallest sample; raises when there are none, nan where one is no number.
 * @return number: the smallest
 * @usage
 * assert(core.samples.from { 3, -4 }:min() == -4)
 */
static int samples_min(lua_State *L) {
  size_t n;
  const double *x = check_some(L, &n);
  lua_pushnumber(L, lbr_extremes_of(x, n).least);
  return 1;
}

/***
 * Largest sample; raises when there are none, nan where one is no number.
 * @return number: the largest
 * @usage
 * assert(core.samples.from { 3, -4 }:max() == 3)
 */
static int samples_max(lua_State *L) {
  size_t n;
  const double *x = check_some(L, &n);
  lua_pushnumber(L, lbr_extremes_of(x, n).most);
  return 1;
}

/***
 * Largest magnitude; raises when there are none, nan where one is no number.
 * @return number: the largest absolute value
 * @usage
 * assert(core.samples.from { 3, -4 }:peak() == 4)
 */
static int samples_peak(lua_State *L) {
  size_t n;
  const double *x = check_some(L, &n);
  lua_pushnumber(L, lbr_extremes_of(x, n).peak);
  return 1;
}

/***
 * Sum of products with other samples, pairwise.
 * @param other samples: as many
 * @return number: the sum of products
 * @usage
 * local x = core.samples.from { 1, 2 }
 * assert(x:dot(core.samples.from { 3, 4 }) == 11)
 */
static int samples_dot(lua_State *L) {
  size_t n, m;
  const double *x = lbr_check_samples(L, 1, &n);
  const double *y = lbr_check_samples(L, 2, &m);
  check_same(L, 2, n, m);
  lua_pushnumber(L, lbr_dot(x, y, n));
  return 1;
}

/* A number in a summary, with a point in every locale. */
static const char *brief(double x, char text[40]) {
  snprintf(text, 40, "%.6g", x);
  for (char *p = text; *p; p++)
    if (*p == ',') *p = '.';
  return text;
}

static int samples_tostring(lua_State *L) {
  size_t n;
  char a[40], b[40], c[40];
  const double *x = lbr_check_samples(L, 1, &n);
  if (n == 0) {
    lua_pushliteral(L, "no samples");
    return 1;
  }
  lbr_extremes e = lbr_extremes_of(x, n);
  lua_pushfstring(L, "%I sample%s, %s to %s, rms %s", (LUAI_UACINT)n,
                  n == 1 ? "" : "s", brief(e.least, a), brief(e.most, b),
                  brief(lbr_rms(x, n), c));
  return 1;
}

const luaL_Reg lbr_samples_math_methods[] = {
    {"add", samples_add},   {"scale", samples_scale}, {"sum", samples_sum},
    {"mean", samples_mean}, {"rms", samples_rms},     {"min", samples_min},
    {"max", samples_max},   {"peak", samples_peak},   {"dot", samples_dot},
    {NULL, NULL}};

const luaL_Reg lbr_samples_math_meta[] = {
    {"__add", samples_plus},   {"__sub", samples_minus},
    {"__mul", samples_times},  {"__div", samples_over},
    {"__unm", samples_negative}, {"__eq", samples_equal},
    {"__tostring", samples_tostring}, {NULL, NULL}};
