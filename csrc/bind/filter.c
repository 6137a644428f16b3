#include "bind/filter.h"

#include <math.h>
#include <string.h>

#include "bind/filter_parts.h"

static const char *const shapes[] = {
    [LBR_FILTER_NONE] = "none",
    [LBR_FILTER_BUTTERWORTH] = "butterworth",
    [LBR_FILTER_CHEBYSHEV] = "chebyshev",
    [LBR_FILTER_BESSEL] = "bessel",
    [LBR_FILTER_ELLIPTIC] = "elliptic",
    [LBR_FILTER_POINTS] = "points",
};

#define CLASS "libration.prepared_filter"
#define SHAPES (sizeof shapes / sizeof *shapes)

/* The field's value as text, for a message; leaves it on the stack. */
static const char *shown(lua_State *L, int arg, const char *field) {
  lua_getfield(L, arg, field);
  return luaL_tolstring(L, -1, NULL);
}

static int wrong(lua_State *L, int arg, const char *field,
                 const char *choices) {
  const char *value = shown(L, arg, field);
  return luaL_argerror(L, arg, lua_pushfstring(L, "%s is %s; it must be %s",
                                               field, value, choices));
}

static lbr_filter_shape check_shape(lua_State *L, int arg) {
  lua_getfield(L, arg, "shape");
  const char *name = lua_type(L, -1) == LUA_TSTRING ? lua_tostring(L, -1) : "";
  for (size_t i = 0; i < SHAPES; i++)
    if (strcmp(name, shapes[i]) == 0) {
      lua_pop(L, 1);
      return (lbr_filter_shape)i;
    }
  wrong(L, arg, "shape",
        "none, butterworth, chebyshev, bessel, elliptic or points");
  return LBR_FILTER_NONE;
}

/* The number in a field, if it lies in (above, most]. */
static double check_field(lua_State *L, int arg, const char *field,
                          double above, double most, const char *choices) {
  int is_number = 0;
  lua_getfield(L, arg, field);
  double value = lua_type(L, -1) == LUA_TNUMBER
                     ? lua_tonumberx(L, -1, &is_number) : 0.0;
  if (!is_number || !(value > above) || !(value <= most))
    wrong(L, arg, field, choices);
  lua_pop(L, 1);
  return value;
}

static void check_point(lua_State *L, int arg, lbr_filter *out, size_t i) {
  int is_at = 0, is_db = 0;
  lua_geti(L, -1, (lua_Integer)i + 1);
  if (!lua_istable(L, -1))
    luaL_argerror(L, arg, lua_pushfstring(L, "points[%d] is not {at=, db=}",
                                          (int)i + 1));
  lua_getfield(L, -1, "at");
  lua_getfield(L, -2, "db");
  out->point_at[i] = lua_tonumberx(L, -2, &is_at);
  out->point_db[i] = lua_tonumberx(L, -1, &is_db);
  double before = i ? out->point_at[i - 1] : 0.0;
  bool ok = is_at && is_db && out->point_at[i] > before &&
            isfinite(out->point_at[i]) && fabs(out->point_db[i]) <= 600.0;
  if (!ok)
    luaL_argerror(L, arg,
                  lua_pushfstring(L, "points[%d] must have at > %f and db "
                                  "between -600 and 600", (int)i + 1, before));
  lua_pop(L, 3);
}

static void check_points(lua_State *L, int arg, lbr_filter *out) {
  lua_getfield(L, arg, "points");
  lua_Integer count = lua_istable(L, -1) ? luaL_len(L, -1) : 0;
  if (count < 1 || count > LBR_FILTER_MOST_POINTS)
    wrong(L, arg, "points", "a list of 1 to 256 rows {at=, db=}");
  out->points = (size_t)count;
  for (size_t i = 0; i < out->points; i++) check_point(L, arg, out, i);
  lua_pop(L, 1);
}

static void check_poles(lua_State *L, int arg, lbr_filter *out) {
  lua_getfield(L, arg, "order");
  int is_integer = 0;
  lua_Integer order = lua_tointegerx(L, -1, &is_integer);
  if (!is_integer || order < 1 || order > LBR_FILTER_MOST_ORDER)
    wrong(L, arg, "order", "an integer from 1 to 16");
  lua_pop(L, 1);
  out->order = (int)order;
  out->corner = check_field(L, arg, "corner", 0.0, 1e300,
                            "a positive number (Hz, or a share of the rate "
                            "with corner_of_rate)");
  if (out->shape == LBR_FILTER_CHEBYSHEV || out->shape == LBR_FILTER_ELLIPTIC)
    out->ripple_db = check_field(L, arg, "ripple_db", 0.0, 300.0,
                                 "a pass-band ripple in dB, 1e-6 to 300");
  if (out->shape == LBR_FILTER_ELLIPTIC)
    out->stop_db = check_field(L, arg, "stop_db", out->ripple_db, 300.0,
                               "a rejection in dB above ripple_db, up to 300");
}

static void read_table(lua_State *L, int arg, lbr_filter *out) {
  memset(out, 0, sizeof *out);
  arg = lua_absindex(L, arg);
  if (!lua_isnoneornil(L, arg)) {
    luaL_checktype(L, arg, LUA_TTABLE);
    out->shape = check_shape(L, arg);
    lua_getfield(L, arg, "corner_of_rate");
    out->corner_of_rate = lua_toboolean(L, -1);
    lua_pop(L, 1);
    if (out->shape == LBR_FILTER_POINTS)
      check_points(L, arg, out);
    else if (out->shape != LBR_FILTER_NONE)
      check_poles(L, arg, out);
  }
  lbr_status status = lbr_filter_prepare(out);
  if (status == LBR_NO_CONVERGE)
    luaL_argerror(L, arg, "this filter cannot be made: its transition is too "
                          "narrow; lower the order or raise stop_db");
  if (status != LBR_OK)
    luaL_argerror(L, arg, lua_pushfstring(L, "this filter cannot be made: %s",
                                          lbr_status_text(status)));
}

void lbr_check_filter(lua_State *L, int arg, lbr_filter *out) {
  const lbr_filter *made = luaL_testudata(L, arg, CLASS);
  if (made)
    *out = *made;
  else
    read_table(L, arg, out);
}

/* The prepared filter of argument 1, read into *room where it is a table. */
static const lbr_filter *the_filter(lua_State *L, lbr_filter *room) {
  const lbr_filter *made = luaL_testudata(L, 1, CLASS);
  if (made) return made;
  read_table(L, 1, room);
  return room;
}

/* A rate is needed only where the corner is a share of it. */
static double check_rate(lua_State *L, int arg, const lbr_filter *f) {
  if (!f->corner_of_rate && lua_isnoneornil(L, arg)) return 1.0;
  double rate = luaL_checknumber(L, arg);
  luaL_argcheck(L, isfinite(rate) && rate > 0.0, arg,
                "the sample rate must be a positive number of S/s");
  return rate;
}

static double check_hz(lua_State *L, int arg) {
  double hz = luaL_checknumber(L, arg);
  luaL_argcheck(L, isfinite(hz) && hz >= 0.0, arg,
                "the frequency must be 0 Hz or more, and finite");
  return hz;
}

/***
 * Gain magnitude of an analog low-pass response.
 * @param spec table: shape, order, corner, corner_of_rate, ripple_db,
 *   stop_db, points; nil means no filter
 * @param hz number: frequency, Hz, >= 0
 * @param rate number: sample rate, S/s; needed when corner_of_rate
 * @return number: |F(hz)|, 1 in the pass band
 * @usage
 * local f = { shape = "butterworth", order = 4, corner = 100 }
 * assert(math.abs(core.filter.gain(f, 100) ^ 2 - 0.5) < 1e-12)
 */
static int filter_gain(lua_State *L) {
  lbr_filter room;
  const lbr_filter *f = the_filter(L, &room);
  double hz = check_hz(L, 2);
  lua_pushnumber(L, lbr_filter_gain(f, hz, check_rate(L, 3, f)));
  return 1;
}

/***
 * Complex response of an analog low-pass (a table of points has no phase).
 * @param spec table: as for gain
 * @param hz number: frequency, Hz, >= 0
 * @param rate number: sample rate, S/s; needed when corner_of_rate
 * @return number: real part
 * @return number: imaginary part
 * @usage
 * local f = { shape = "butterworth", order = 1, corner = 100 }
 * local re, im = core.filter.response(f, 100)
 * assert(math.abs(re - 0.5) < 1e-12 and math.abs(im + 0.5) < 1e-12)
 */
static int filter_response(lua_State *L) {
  lbr_filter room;
  const lbr_filter *f = the_filter(L, &room);
  double hz = check_hz(L, 2);
  double complex r = lbr_filter_response(f, hz, check_rate(L, 3, f));
  lua_pushnumber(L, creal(r));
  lua_pushnumber(L, cimag(r));
  return 2;
}

/***
 * Least and largest gain over an interval of frequencies, a true enclosure.
 * @param spec table: as for gain
 * @param hz1 number: one end, Hz, >= 0
 * @param hz2 number: the other end, Hz, >= 0
 * @param rate number: sample rate, S/s; needed when corner_of_rate
 * @return number: no gain in the interval is below this
 * @return number: no gain in the interval is above this
 * @usage
 * local f = { shape = "chebyshev", order = 5, corner = 100, ripple_db = 1 }
 * local low, high = core.filter.range(f, 0, 100)
 * assert(math.abs(low - 10 ^ (-1 / 20)) < 1e-9 and high >= 1)
 */
static int filter_range(lua_State *L) {
  lbr_filter room;
  double low, high;
  const lbr_filter *f = the_filter(L, &room);
  double hz1 = check_hz(L, 2), hz2 = check_hz(L, 3);
  lbr_filter_range(f, hz1, hz2, check_rate(L, 4, f), &low, &high);
  lua_pushnumber(L, low);
  lua_pushnumber(L, high);
  return 2;
}

/***
 * The frequency beyond which the gain stays at or below a level.
 * @param spec table: as for gain
 * @param level number: gain, above 0
 * @param rate number: sample rate, S/s; needed when corner_of_rate
 * @return number: Hz; math.huge when the gain never settles below the level
 * @usage
 * local f = { shape = "butterworth", order = 8, corner = 1000 }
 * assert(math.abs(core.filter.edge(f, 1e-4) - 3162.2776) < 1e-3)
 */
static int filter_edge(lua_State *L) {
  lbr_filter room;
  const lbr_filter *f = the_filter(L, &room);
  double level = luaL_checknumber(L, 2);
  luaL_argcheck(L, level > 0.0, 2, "the level must be a gain above 0");
  lua_pushnumber(L, lbr_filter_edge(f, level, check_rate(L, 3, f)));
  return 1;
}

static void push_roots(lua_State *L, const double complex *root, size_t n) {
  lua_createtable(L, (int)n, 0);
  for (size_t i = 0; i < n; i++) {
    lua_createtable(L, 0, 2);
    lua_pushnumber(L, creal(root[i]));
    lua_setfield(L, -2, "re");
    lua_pushnumber(L, cimag(root[i]));
    lua_setfield(L, -2, "im");
    lua_seti(L, -2, (lua_Integer)i + 1);
  }
}

/***
 * Poles and zeros for a corner of 1 rad/s.
 * @param spec table: as for gain
 * @return table: poles, a list of { re=, im= } in rad/s
 * @return table: zeros, likewise
 * @return number: factor that the quotient of the products is multiplied by
 * @usage
 * local poles = core.filter.roots { shape = "bessel", order = 2, corner = 1 }
 * assert(math.abs(poles[1].re + 1.1016013) < 1e-7)
 */
static int filter_roots(lua_State *L) {
  lbr_filter room;
  const lbr_filter *f = the_filter(L, &room);
  push_roots(L, f->pole, f->poles);
  push_roots(L, f->zero, f->zeros);
  lua_pushnumber(L, f->scale);
  return 3;
}

/***
 * A filter designed once, for many questions; takes a table's place in every
 * function here.
 * @param spec table: as for gain
 * @return userdata: the prepared filter, immutable
 * @usage
 * local f = core.filter.prepare { shape = "bessel", order = 4, corner = 9 }
 * assert(math.abs(core.filter.gain(f, 9) ^ 2 - 0.5) < 1e-12)
 */
static int filter_prepare(lua_State *L) {
  static const luaL_Reg none[] = {{NULL, NULL}};
  lbr_filter room;
  const lbr_filter *f = the_filter(L, &room);
  lbr_filter *kept = lua_newuserdatauv(L, sizeof *kept, 0);
  *kept = *f;
  lbr_set_class(L, CLASS, none, none);
  return 1;
}

static const luaL_Reg functions[] = {
    {"prepare", filter_prepare},
    {"gain", filter_gain},   {"response", filter_response},
    {"range", filter_range}, {"edge", filter_edge},
    {"roots", filter_roots}, {NULL, NULL},
};

int lbr_open_filter(lua_State *L) {
  luaL_newlib(L, functions);
  luaL_setfuncs(L, lbr_sections_functions, 0);
  luaL_setfuncs(L, lbr_taps_functions, 0);
  return 1;
}
