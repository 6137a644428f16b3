/* core.filter.sections: recursive digital filters as Lua sees them.
 */
#include <math.h>
#include <stdint.h>
#include <string.h>

#include "bind/filter.h"
#include "bind/filter_parts.h"
#include "filter/digital.h"

#define CLASS "libration.sections"
#define STREAM_CLASS "libration.sections_stream"

typedef struct digital {
  lbr_sections sections;
  double rate; /* S/s */
} digital;

typedef struct stream {
  lbr_sections sections;
  lbr_sections_state state;
} stream;

static const char *const bands[] = {"low", "high", "pass", "stop", NULL};
static const char *const ends_names[] = {"turn", "mirror", "hold", "bare",
                                         NULL};

static int check_name(lua_State *L, int arg, const char *name,
                      const char *const *names, const char *what) {
  for (int i = 0; names[i]; i++)
    if (strcmp(name, names[i]) == 0) return i;
  return luaL_argerror(L, arg, lua_pushfstring(
      L, "\"%s\" is no %s; choose one of %s, %s, %s, %s", name, what,
      names[0], names[1], names[2], names[3]));
}

lbr_band lbr_check_band(lua_State *L, int arg) {
  const char *name = luaL_checkstring(L, arg);
  return (lbr_band)check_name(L, arg, name, bands, "band");
}

lbr_ends lbr_check_ends(lua_State *L, int arg, lbr_ends absent) {
  if (lua_isnoneornil(L, arg)) return absent;
  const char *name = luaL_checkstring(L, arg);
  return (lbr_ends)check_name(L, arg, name, ends_names, "rule for the ends");
}

double lbr_check_share(lua_State *L, int arg, double rate) {
  double hz = luaL_checknumber(L, arg);
  luaL_argcheck(L, hz >= 0 && hz <= rate / 2, arg,
                "the frequency must lie between 0 and half the rate");
  return hz / rate;
}

/* Shares of the rate; the second one only for pass and stop. */
static void check_edges(lua_State *L, lbr_band band, double rate,
                        double share[2]) {
  int two = band == LBR_BAND_PASS || band == LBR_BAND_STOP;
  share[0] = luaL_checknumber(L, 3) / rate;
  share[1] = two ? luaL_checknumber(L, 5) / rate : 0;
  luaL_argcheck(L, share[0] > 0 && share[0] < 0.5, 3,
                "the edge must lie between 0 and half the rate");
  if (two)
    luaL_argcheck(L, share[1] > share[0] && share[1] < 0.5, 5,
                  "the upper edge must lie between the lower one and half the "
                  "rate");
}

/***
 * A recursive digital filter from an analog low-pass shape, as second-order
 * sections (bilinear transformation, band edges kept where they are).
 * @param spec table: shape, order, corner (any), ripple_db, stop_db, as for
 *   gain
 * @param band string: "low", "high", "pass" or "stop"
 * @param edge number: Hz, below half the rate: the corner of the shape, the
 *   lower one for pass and stop
 * @param rate number: sample rate, S/s
 * @param upper number: the upper edge, Hz, of pass and stop
 * @return userdata: the filter, immutable, with methods run, both_ways,
 *   stream, response, gain, settling, coefficients; raises where there is none
 * @usage
 * local spec = { shape = "butterworth", order = 2, corner = 1 }
 * local f = core.filter.sections(spec, "low", 200, 1000)
 * local row = f:coefficients()[1]
 * assert(math.abs(row.b0 - 0.206572083826148) < 1e-14)
 */
static int filter_sections(lua_State *L) {
  lbr_filter analog;
  double share[2];
  lua_settop(L, 5);
  lbr_check_filter(L, 1, &analog);
  lbr_band band = lbr_check_band(L, 2);
  double rate = luaL_checknumber(L, 4);
  luaL_argcheck(L, rate > 0 && isfinite(rate), 4,
                "the sample rate must be a positive number of S/s");
  check_edges(L, band, rate, share);
  luaL_argcheck(L, analog.poles > 0, 1,
                "shape must be butterworth, chebyshev, bessel or elliptic");
  static const luaL_Reg none[] = {{NULL, NULL}};
  digital *f = lua_newuserdatauv(L, sizeof *f, 0);
  f->rate = rate;
  if (lbr_digital_design(&analog, band, share, &f->sections) != LBR_OK)
    return luaL_argerror(L, 3, "double precision holds no such filter: the "
                               "edges are too close to each other or to 0 for "
                               "this order");
  lbr_set_class(L, CLASS, lbr_sections_methods, none);
  return 1;
}

static const digital *check_digital(lua_State *L) {
  return luaL_checkudata(L, 1, CLASS);
}

/* Samples that take the result of n samples x: the argument, or new ones; they
 * are pushed. */
static double *room_for(lua_State *L, int arg, const double *x, size_t n) {
  size_t given;
  if (lua_isnoneornil(L, arg)) return lbr_push_unset_samples(L, n);
  double *y = lbr_check_writable_samples(L, arg, &given);
  luaL_argcheck(L, given == n, arg, "not as many samples");
  luaL_argcheck(L, y == x || y + n <= x || x + n <= y, arg,
                "they overlap the record, but are not the same");
  lua_pushvalue(L, arg);
  return y;
}

/***
 * Filters a record from left to right, starting at rest.
 * @param x samples: the record
 * @param start string: "rest" (default: zeros before the record) or
 *   "settled" (its first sample before it, for ever)
 * @param into samples: as many, which are overwritten and returned, x itself
 *   allowed; default new ones
 * @return samples: as many
 * @usage
 * local spec = { shape = "bessel", order = 4, corner = 1 }
 * local f = core.filter.sections(spec, "low", 50, 1000)
 * local y = f:run(core.samples.new(9):fill(2), "settled")
 * assert(math.abs(y[9] - 2) < 1e-12)
 */
static int sections_run(lua_State *L) {
  size_t n;
  lbr_sections_state state = {{{0, 0}}};
  const digital *f = check_digital(L);
  const double *x = lbr_check_samples(L, 2, &n);
  const char *start = luaL_optstring(L, 3, "rest");
  int settled = strcmp(start, "settled") == 0;
  if (!settled && strcmp(start, "rest") != 0)
    return luaL_argerror(L, 3, lua_pushfstring(
        L, "\"%s\" is no start; choose rest or settled", start));
  lua_settop(L, 4);
  double *y = room_for(L, 4, x, n);
  if (settled && n > 0) lbr_sections_settled(&f->sections, x[0], &state);
  lbr_sections_run(&f->sections, &state, x, y, n, 1);
  return 1;
}

/***
 * Filters a record forward and backward: no phase, the gain squared.
 * @param x samples: the record
 * @param ends string: how it goes on beyond its ends: "turn" (default, turned
 *   by half a turn about the end point), "mirror", "hold" (the end sample) or
 *   "bare" (zeros, and both passes start at rest); else each pass starts
 *   settled
 * @param pad integer: samples beyond each end, default settling(1e-9); turn
 *   and mirror need a record that is longer
 * @return samples: as many
 * @usage
 * local spec = { shape = "butterworth", order = 2, corner = 1 }
 * local f = core.filter.sections(spec, "low", 100, 1000)
 * local x = core.samples.new(200):fill(3)
 * assert(math.abs(f:both_ways(x)[1] - 3) < 1e-9)
 */
static int sections_both_ways(lua_State *L) {
  size_t n;
  const digital *f = check_digital(L);
  const double *x = lbr_check_samples(L, 2, &n);
  lbr_ends ends = lbr_check_ends(L, 3, LBR_ENDS_TURN);
  int folded = ends == LBR_ENDS_TURN || ends == LBR_ENDS_MIRROR;
  size_t pad = lua_isnoneornil(L, 4) ? lbr_sections_settling(&f->sections, 1e-9)
                                     : lbr_check_count(L, 4, 0, 1 << 28);
  if (folded && pad >= n)
    return luaL_argerror(L, 2, lua_pushfstring(
        L, "%I samples cannot be extended by %I; give a smaller pad, or hold "
        "or bare for the ends", (LUAI_UACINT)n, (LUAI_UACINT)pad));
  luaL_argcheck(L, pad <= 1 << 28, 4,
                "the filter does not settle in 2^28 samples; give a pad");
  double *spare = lbr_push_unset_samples(L, pad);
  double *y = lbr_push_unset_samples(L, n);
  if (n > 0) lbr_sections_both_ways(&f->sections, x, y, n, ends, pad, spare);
  return 1;
}

/***
 * Complex response at a frequency.
 * @param hz number: frequency, Hz, 0 to half the rate
 * @return number: real part
 * @return number: imaginary part
 * @usage
 * local spec = { shape = "butterworth", order = 2, corner = 1 }
 * local f = core.filter.sections(spec, "low", 100, 1000)
 * local re, im = f:response(100)
 * assert(math.abs(re) < 1e-12 and math.abs(im + math.sqrt(0.5)) < 1e-12)
 */
static int sections_response(lua_State *L) {
  const digital *f = check_digital(L);
  double share = lbr_check_share(L, 2, f->rate);
  double complex h = lbr_sections_response(&f->sections, share);
  lua_pushnumber(L, creal(h));
  lua_pushnumber(L, cimag(h));
  return 2;
}

/***
 * Gain magnitude at a frequency, or at many.
 * @param hz number or samples: frequency, Hz, 0 to half the rate
 * @return number or samples: |H|
 * @usage
 * local spec = { shape = "butterworth", order = 5, corner = 1 }
 * local f = core.filter.sections(spec, "high", 100, 1000)
 * assert(math.abs(f:gain(100) ^ 2 - 0.5) < 1e-12 and f:gain(0) == 0)
 */
static int sections_gain(lua_State *L) {
  const digital *f = check_digital(L);
  if (!luaL_testudata(L, 2, LBR_SAMPLES_CLASS)) {
    double share = lbr_check_share(L, 2, f->rate);
    lua_pushnumber(L, cabs(lbr_sections_response(&f->sections, share)));
    return 1;
  }
  size_t n;
  const double *hz = lbr_check_samples(L, 2, &n);
  for (size_t i = 0; i < n; i++)
    luaL_argcheck(L, hz[i] >= 0 && hz[i] <= f->rate / 2, 2,
                  "the frequencies must lie between 0 and half the rate");
  double *gain = lbr_push_unset_samples(L, n);
  for (size_t i = 0; i < n; i++)
    gain[i] = cabs(lbr_sections_response(&f->sections, hz[i] / f->rate));
  return 1;
}

/***
 * Samples after which the slowest pole has decayed to a level.
 * @param level number: between 0 and 1, default 1e-9
 * @return integer: samples
 * @usage
 * local spec = { shape = "butterworth", order = 1, corner = 1 }
 * local f = core.filter.sections(spec, "low", 250, 1000)
 * assert(f:settling() < 20)
 */
static int sections_settling(lua_State *L) {
  const digital *f = check_digital(L);
  double level = luaL_optnumber(L, 2, 1e-9);
  luaL_argcheck(L, level > 0 && level < 1, 2, "the level lies between 0 and 1");
  size_t samples = lbr_sections_settling(&f->sections, level);
  lua_pushinteger(L, (lua_Integer)samples);
  return 1;
}

/***
 * The sections in the order they are run.
 * @return table: list of { b0=, b1=, b2=, a1=, a2= }; y = b0 x + b1 x' + b2 x''
 *   - a1 y' - a2 y''
 * @usage
 * local spec = { shape = "butterworth", order = 5, corner = 1 }
 * local f = core.filter.sections(spec, "pass", 100, 1000, 200)
 * assert(#f:coefficients() == 5)
 */
static int sections_coefficients(lua_State *L) {
  static const char *const names[] = {"b0", "b1", "b2", "a1", "a2"};
  const digital *f = check_digital(L);
  lua_createtable(L, (int)f->sections.count, 0);
  for (size_t i = 0; i < f->sections.count; i++) {
    const lbr_section *p = &f->sections.part[i];
    const double value[] = {p->b0, p->b1, p->b2, p->a1, p->a2};
    lua_createtable(L, 0, 5);
    for (int k = 0; k < 5; k++) {
      lua_pushnumber(L, value[k]);
      lua_setfield(L, -2, names[k]);
    }
    lua_rawseti(L, -2, (lua_Integer)i + 1);
  }
  return 1;
}

/***
 * Filters the next block of a record.
 * @param x samples: the block
 * @param into samples: as many, which are overwritten and returned, x itself
 *   allowed; default new ones
 * @return samples: as many; bit for bit what one block would give
 * @usage
 * local spec = { shape = "butterworth", order = 3, corner = 1 }
 * local f = core.filter.sections(spec, "low", 100, 1000)
 * local s, x = f:stream(), core.samples.new(8):fill(1)
 * assert(s:run(x:slice(1, 3)) .. s:run(x:slice(4)) == f:run(x))
 */
static int stream_run(lua_State *L) {
  size_t n;
  stream *s = luaL_checkudata(L, 1, STREAM_CLASS);
  const double *x = lbr_check_samples(L, 2, &n);
  lua_settop(L, 3);
  double *y = room_for(L, 3, x, n);
  lbr_sections_run(&s->sections, &s->state, x, y, n, 1);
  return 1;
}

static const luaL_Reg stream_methods[] = {{"run", stream_run}, {NULL, NULL}};

/***
 * A stream: blocks of a record go in one after another.
 * @return userdata: the stream, at rest, with method run
 * @usage
 * local spec = { shape = "butterworth", order = 1, corner = 1 }
 * local s = core.filter.sections(spec, "low", 1, 9):stream()
 * assert(#s:run(core.samples.new(5)) == 5)
 */
static int sections_stream(lua_State *L) {
  static const luaL_Reg none[] = {{NULL, NULL}};
  const digital *f = check_digital(L);
  stream *s = lua_newuserdatauv(L, sizeof *s, 0);
  *s = (stream){f->sections, {{{0, 0}}}};
  lbr_set_class(L, STREAM_CLASS, stream_methods, none);
  return 1;
}

const luaL_Reg lbr_sections_methods[] = {
    {"run", sections_run},           {"both_ways", sections_both_ways},
    {"stream", sections_stream},     {"response", sections_response},
    {"gain", sections_gain},         {"settling", sections_settling},
    {"coefficients", sections_coefficients}, {NULL, NULL}};

const luaL_Reg lbr_sections_functions[] = {{"sections", filter_sections},
                                           {NULL, NULL}};
