/* core.window: window shapes, their samples and their kernels. */
#include <math.h>
#include <string.h>

#include "bind/bind.h"
#include "bind/samples.h"
#include "window/figures.h"
#include "window/kernel.h"
#include "window/window.h"

#define CLASS "libration.window.kernel"
#define LENGTH_MOST ((size_t)1 << 40)

/* A shape and, once asked for, its kernel at the length asked for last. */
typedef struct holder {
  lbr_window window;
  lbr_kernel *kernel;
  size_t n; /* length that the kernel has */
} holder;

static holder *check_holder(lua_State *L) {
  return luaL_checkudata(L, 1, CLASS);
}

static double check_finite(lua_State *L, int arg) {
  double x = luaL_checknumber(L, arg);
  if (!isfinite(x))
    luaL_argerror(L, arg, lua_pushfstring(L, "%f is not a finite number", x));
  return x;
}

/* The kernel at the length in argument `arg`; none or 0 is the limit. */
static lbr_kernel *check_kernel(lua_State *L, int arg) {
  holder *h = check_holder(L);
  size_t n = 0;
  if (!lua_isnoneornil(L, arg)) n = lbr_check_count(L, arg, 0, LENGTH_MOST);
  if (n > 0 && n < 4)
    luaL_argerror(L, arg, "a kernel has at least 4 samples (0: the limit)");
  if (h->kernel && h->n == n) return h->kernel;
  lbr_status status = h->kernel ? lbr_kernel_resize(h->kernel, n)
                                : lbr_kernel_new(&h->window, n, &h->kernel);
  if (status == LBR_OK) {
    h->n = n;
    return h->kernel;
  }
  lbr_kernel_free(h->kernel); /* a failed resize leaves no usable kernel */
  h->kernel = NULL;
  if (status == LBR_DOMAIN)
    luaL_argerror(L, arg, lua_pushfstring(L, "%s has no kernel of %I samples",
                                          h->window.shape->name,
                                          (LUAI_UACINT)n));
  lbr_raise(L, status, "window kernel");
  return NULL;
}

static int holder_close(lua_State *L) {
  holder *h = check_holder(L);
  lbr_kernel_free(h->kernel);
  h->kernel = NULL;
  return 0;
}

/*** The samples of the window, periodic.
 * Sample n + 1 would repeat the first one and is left out.
 * @param n integer: length, 1 to 2^40 as memory allows
 * @return samples: n values, peak near 1
 * @usage
 * local hann = core.window.new "hann"
 * assert(hann:samples(4)[3] == 1)
 */
static int samples(lua_State *L) {
  holder *h = check_holder(L);
  size_t n = lbr_check_count(L, 2, 1, LENGTH_MOST);
  double *out = lbr_push_samples(L, n);
  lbr_status status = lbr_window_fill(&h->window, out, n);
  if (status == LBR_DOMAIN)
    return luaL_argerror(L, 2, lua_pushfstring(L, "%s is not defined for %I "
        "samples", h->window.shape->name, (LUAI_UACINT)n));
  if (status != LBR_OK) return lbr_raise(L, status, "window samples");
  return 1;
}

/*** The response at one frequency.
 * |W(x)| / |W(0)|, W(x) = sum of w[n] exp(2 pi i x n / N).
 * @param x number: distance from the line, bins
 * @param n integer: length N, at least 4; 0 or none: the limit of long records
 * @return number: 1 at x = 0
 * @usage
 * local hann = core.window.new "hann"
 * assert(math.abs(hann:gain(1) - 0.5) < 1e-12)
 */
static int gain(lua_State *L) {
  double x = check_finite(L, 2);
  lua_pushnumber(L, lbr_kernel_gain(check_kernel(L, 3), x));
  return 1;
}

/*** Bounds of the response over an interval.
 * low <= |W(x)| / |W(0)| <= high for every x from x1 to x2.
 * @param x1 number: bins
 * @param x2 number: bins, not below x1
 * @param n integer: length, at least 4; 0 or none: the limit of long records
 * @return number: low
 * @return number: high
 * @usage
 * local low, high = core.window.new("hann"):range(0, 1)
 * assert(low > 0.4999 and low <= 0.5 and high >= 1)
 */
static int range(lua_State *L) {
  double low, high, x1 = check_finite(L, 2), x2 = check_finite(L, 3);
  luaL_argcheck(L, x1 <= x2, 3, "the interval ends before it starts");
  lbr_kernel_range(check_kernel(L, 4), x1, x2, &low, &high);
  lua_pushnumber(L, low);
  lua_pushnumber(L, high);
  return 2;
}

/*** A bound of the steepness of the response over an interval.
 * @param x1 number: bins
 * @param x2 number: bins, not below x1
 * @param n integer: length, at least 4; 0 or none: the limit of long records
 * @return number: at least |dW/dx| / |W(0)|, per bin, seen from the middle
 * @usage
 * local steep = core.window.new("hann"):slope(0, 0)
 * assert(steep < 1e-6)
 */
static int slope(lua_State *L) {
  double x1 = check_finite(L, 2), x2 = check_finite(L, 3);
  luaL_argcheck(L, x1 <= x2, 3, "the interval ends before it starts");
  lua_pushnumber(L, lbr_kernel_slope(check_kernel(L, 4), x1, x2));
  return 1;
}

/*** A lower bound of the curvature about the peak.
 * @param radius number: bins to either side of the peak
 * @param n integer: length, at least 4; 0 or none: the limit of long records
 * @return number: least -R''(x) / R(0) there, per bin squared; 0: may vanish
 * @usage
 * assert(core.window.new("hann"):curvature(0.1) > 1)
 */
static int curvature(lua_State *L) {
  double radius = check_finite(L, 2);
  luaL_argcheck(L, radius >= 0, 2, "a negative radius");
  lua_pushnumber(L, lbr_kernel_curvature(check_kernel(L, 3), radius));
  return 1;
}

/*** Where the response first falls to a level.
 * @param level number: above 0
 * @param n integer: length, at least 4; 0 or none: the limit of long records
 * @return number: bins, never beyond the true place; math.huge: nowhere
 * @usage
 * assert(math.abs(core.window.new("hann"):reach(0.5) - 1) < 1e-6)
 */
static int reach(lua_State *L) {
  double level = check_finite(L, 2);
  luaL_argcheck(L, level > 0, 2, "a level that is not above 0");
  lua_pushnumber(L, lbr_kernel_reach(check_kernel(L, 3), level));
  return 1;
}

/*** An upper bound of the response anywhere.
 * @param n integer: length, at least 4; 0 or none: the limit of long records
 * @return number: 1, or a little more for flat tops
 * @usage
 * assert(core.window.new("hann"):peak() == 1)
 */
static int peak(lua_State *L) {
  lua_pushnumber(L, lbr_kernel_peak(check_kernel(L, 2)));
  return 1;
}

/*** The noise bandwidth.
 * @param n integer: length, at least 4; 0 or none: the limit of long records
 * @return number: N sum w^2 / (sum w)^2, bins
 * @usage
 * assert(core.window.new("hann"):noise_bandwidth(8) == 1.5)
 */
static int noise_bandwidth(lua_State *L) {
  lua_pushnumber(L, lbr_kernel_noise_bandwidth(check_kernel(L, 2)));
  return 1;
}

/*** How much larger the sum of sizes is than the size of the sum.
 * @param n integer: length, at least 4; 0 or none: the limit of long records
 * @return number: sum |w| / |sum w|, 1 where no sample is negative
 * @usage
 * assert(core.window.new("hft95"):absolute() > 1.1)
 */
static int absolute(lua_State *L) {
  lua_pushnumber(L, lbr_kernel_absolute(check_kernel(L, 2)));
  return 1;
}

static void set_number(lua_State *L, const char *name, double value) {
  if (isnan(value)) return;
  lua_pushnumber(L, value);
  lua_setfield(L, -2, name);
}

/*** The figures of merit.
 * In the limit of long records, or at .length where the shape has none.
 * @return table: length (0: limit), coherent_gain, noise_bandwidth (bins),
 *   noise_bandwidth_db, scalloping_db, flatness_db, worst_loss_db,
 *   width_half_power, width_3db, width_6db, width_half (bins), first_null
 *   (bins), side_lobe_db, side_lobe_at (bins), decay_db_octave, overlap_50,
 *   overlap_75 (correlations), overlap (recommended, share), and there
 *   amplitude_flatness, power_flatness, correlation; a field is absent where
 *   the window has no such figure
 * @usage
 * local f = core.window.new("hann"):figures()
 * assert(f.noise_bandwidth == 1.5 and f.overlap == 0.5)
 */
static int figures(lua_State *L) {
  lbr_figures f;
  lbr_status status = lbr_figures_of(&check_holder(L)->window, &f);
  if (status != LBR_OK) return lbr_raise(L, status, "window figures");
  const struct { const char *name; double value; } fields[] = {
      {"coherent_gain", f.coherent_gain},
      {"noise_bandwidth", f.noise_bandwidth},
      {"noise_bandwidth_db", f.noise_bandwidth_db},
      {"scalloping_db", f.scalloping_db},
      {"flatness_db", f.flatness_db},
      {"worst_loss_db", f.worst_loss_db},
      {"width_half_power", f.width_half_power},
      {"width_3db", f.width_3db},
      {"width_6db", f.width_6db},
      {"width_half", f.width_half},
      {"first_null", f.first_null},
      {"side_lobe_db", f.side_lobe_db},
      {"side_lobe_at", f.side_lobe_at},
      {"decay_db_octave", f.decay_db_octave},
      {"overlap_50", f.overlap_50},
      {"overlap_75", f.overlap_75},
      {"overlap", f.overlap},
      {"amplitude_flatness", f.amplitude_flatness},
      {"power_flatness", f.power_flatness},
      {"correlation", f.correlation}};
  lua_newtable(L);
  lua_pushinteger(L, (lua_Integer)f.length);
  lua_setfield(L, -2, "length");
  for (size_t i = 0; i < sizeof fields / sizeof *fields; i++)
    set_number(L, fields[i].name, fields[i].value);
  return 1;
}

/* Pushes a table of what a row says. */
static void push_shape(lua_State *L, const lbr_window_shape *shape) {
  lua_newtable(L);
  lua_pushstring(L, shape->name);
  lua_setfield(L, -2, "name");
  lua_pushstring(L, shape->title);
  lua_setfield(L, -2, "title");
  lua_pushstring(L, shape->source);
  lua_setfield(L, -2, "source");
  lua_createtable(L, (int)shape->terms, 0);
  for (size_t k = 0; k < shape->terms; k++) {
    lua_pushnumber(L, shape->terms_of[k]);
    lua_rawseti(L, -2, (lua_Integer)k + 1);
  }
  lua_setfield(L, -2, "coefficients");
  if (!shape->parameter_name) return;
  lua_pushstring(L, shape->parameter_name);
  lua_setfield(L, -2, "parameter_name");
  lua_pushnumber(L, shape->parameter_least);
  lua_setfield(L, -2, "least");
  lua_pushnumber(L, shape->parameter_most);
  lua_setfield(L, -2, "most");
  lua_pushnumber(L, shape->parameter_default);
  lua_setfield(L, -2, "default");
}

/*** Every window shape.
 * @return table: rows of name, title, source, coefficients and, where the
 *   shape has a parameter, parameter_name, least, most, default
 * @usage
 * assert(core.window.shapes()[2].name == "hann")
 */
static int shapes(lua_State *L) {
  size_t count = lbr_window_shapes();
  lua_createtable(L, (int)count, 0);
  for (size_t i = 0; i < count; i++) {
    push_shape(L, lbr_window_shape_at(i));
    lua_rawseti(L, -2, (lua_Integer)i + 1);
  }
  return 1;
}

static const luaL_Reg methods[] = {
    {"absolute", absolute}, {"curvature", curvature},
    {"figures", figures},   {"gain", gain},
    {"noise_bandwidth", noise_bandwidth},
    {"peak", peak},         {"range", range},
    {"reach", reach},       {"samples", samples},
    {"slope", slope},       {NULL, NULL}};

static const luaL_Reg meta[] = {
    {"__gc", holder_close}, {"__close", holder_close}, {NULL, NULL}};

/*** A window by its name, with its parameter where it has one.
 * Raises on an unknown name and on a parameter out of its range.
 * @param name string: a name from core.window.shapes
 * @param parameter number: see shapes; default: the shape's own
 * @return window kernel: methods samples, gain, range, slope, curvature, reach,
 *   peak, noise_bandwidth, absolute
 * @return number: the parameter in use, 0 where there is none
 * @usage
 * assert(#core.window.new("hann"):samples(8) == 8)
 */
static int new(lua_State *L) {
  const char *name = luaL_checkstring(L, 1);
  double parameter = NAN;
  if (!lua_isnoneornil(L, 2)) parameter = check_finite(L, 2);
  holder *h = lua_newuserdatauv(L, sizeof *h, 0);
  memset(h, 0, sizeof *h);
  lbr_set_class(L, CLASS, methods, meta);
  lbr_status status = lbr_window_find(name, parameter, &h->window);
  if (status == LBR_UNKNOWN)
    return luaL_argerror(L, 1, lua_pushfstring(L, "no window '%s'", name));
  if (status != LBR_OK)
    return luaL_argerror(L, 2, lua_pushfstring(L, "%f is no parameter of '%s'",
                                               parameter, name));
  lua_pushnumber(L, h->window.parameter);
  return 2;
}

static const luaL_Reg functions[] = {
    {"new", new}, {"shapes", shapes}, {NULL, NULL}};

int lbr_open_window(lua_State *L) {
  luaL_newlib(L, functions);
  return 1;
}
