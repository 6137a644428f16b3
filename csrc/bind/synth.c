#include "bind/synth.h"

#include <math.h>
#include <string.h>

#include "base/philox.h"
#include "bind/filter.h"
#include "bind/samples.h"
#include "synth/digitizer.h"

#define MOST_WORDS 16

/***
 * One block of the generator Philox4x32-10.
 * @param c0 integer: first 32-bit word of the counter
 * @param c1 integer: second word of the counter
 * @param c2 integer: third word of the counter
 * @param c3 integer: fourth word of the counter
 * @param k0 integer: first 32-bit word of the key
 * @param k1 integer: second word of the key
 * @return integer: first of four 32-bit words; the others follow
 * @usage
 * assert(core.synth.philox(0, 0, 0, 0, 0, 0) == 0x6627e8d5)
 */
static int synth_philox(lua_State *L) {
  uint32_t counter[4], key[2], out[4];
  for (int i = 0; i < 4; i++)
    counter[i] = (uint32_t)luaL_checkinteger(L, i + 1);
  for (int i = 0; i < 2; i++) key[i] = (uint32_t)luaL_checkinteger(L, i + 5);
  lbr_philox(counter, key, out);
  for (int i = 0; i < 4; i++) lua_pushinteger(L, out[i]);
  return 4;
}

/* Key from arguments: seed, list of words. */
static lbr_key check_key(lua_State *L, int seed_arg, int words_arg) {
  uint64_t words[MOST_WORDS];
  uint64_t seed = (uint64_t)luaL_checkinteger(L, seed_arg);
  luaL_checktype(L, words_arg, LUA_TTABLE);
  size_t n = lua_rawlen(L, words_arg);
  luaL_argcheck(L, n <= MOST_WORDS, words_arg, "more than 16 words");
  for (size_t i = 0; i < n; i++) {
    int whole;
    lua_rawgeti(L, words_arg, (lua_Integer)i + 1);
    words[i] = (uint64_t)lua_tointegerx(L, -1, &whole);
    luaL_argcheck(L, whole, words_arg, "a word is not a whole number");
    lua_pop(L, 1);
  }
  return lbr_key_make(seed, words, n);
}

/***
 * Fills samples with normal random numbers, mean 0 and variance 1.
 * Value n depends only on the seed, the words and n.
 * @param into samples: filled
 * @param seed integer: any
 * @param words table: up to 16 integers that name the stream
 * @param first integer: number of the first value, default 0
 * @return samples: the same
 * @usage
 * local all = core.synth.gaussian(core.samples.new(8), 1, { 2 })
 * local part = core.synth.gaussian(core.samples.new(3), 1, { 2 }, 5)
 * assert(part == all:slice(6))
 */
static int synth_gaussian(lua_State *L) {
  size_t n;
  double *x = lbr_check_writable_samples(L, 1, &n);
  lbr_key key = check_key(L, 2, 3);
  lbr_random_gaussian(&key, (uint64_t)luaL_optinteger(L, 4, 0), x, n);
  lua_settop(L, 1);
  return 1;
}

/***
 * Fills samples with random numbers uniform between 0 and 1, ends excluded.
 * @param into samples: filled
 * @param seed integer: any
 * @param words table: up to 16 integers that name the stream
 * @param first integer: number of the first value, default 0
 * @return samples: the same
 * @usage
 * local u = core.synth.uniform(core.samples.new(100), 1, { 2 })
 * assert(u:min() > 0 and u:max() < 1)
 */
static int synth_uniform(lua_State *L) {
  size_t n;
  double *x = lbr_check_writable_samples(L, 1, &n);
  lbr_key key = check_key(L, 2, 3);
  lbr_random_uniform(&key, (uint64_t)luaL_optinteger(L, 4, 0), x, n);
  lua_settop(L, 1);
  return 1;
}

/***
 * One 64-bit word of a stream.
 * @param seed integer: any
 * @param words table: up to 16 integers that name the stream
 * @param n integer: number of the word, default 0
 * @return integer: all 64 bits
 * @usage
 * assert(core.synth.word(1, { 2 }, 3) ~= core.synth.word(1, { 2 }, 4))
 */
static int synth_word(lua_State *L) {
  uint64_t word;
  lbr_key key = check_key(L, 1, 2);
  lbr_random_words(&key, (uint64_t)luaL_optinteger(L, 3, 0), &word, 1);
  lua_pushinteger(L, (lua_Integer)word);
  return 1;
}

/* A curve through points, straight on log axes, flat outside. */
typedef struct curve {
  const double *at, *level;
  size_t n;
} curve;

static double curve_at(void *context, double f) {
  const curve *c = context;
  if (f <= c->at[0]) return c->level[0];
  if (f >= c->at[c->n - 1]) return c->level[c->n - 1];
  size_t i = 1;
  while (c->at[i] < f) i++;
  double share = log(f / c->at[i - 1]) / log(c->at[i] / c->at[i - 1]);
  return c->level[i - 1] * pow(c->level[i] / c->level[i - 1], share);
}

static void check_curve(lua_State *L, const curve *c, size_t levels) {
  luaL_argcheck(L, c->n > 0, 1, "no points");
  luaL_argcheck(L, levels == c->n, 2, "not as many levels as frequencies");
  for (size_t i = 0; i < c->n; i++) {
    double before = i ? c->at[i - 1] : 0;
    luaL_argcheck(L, isfinite(c->at[i]) && c->at[i] > before, 1,
                  "frequencies must be above 0 and increase");
    luaL_argcheck(L, isfinite(c->level[i]) && c->level[i] > 0, 2,
                  "levels must be above 0");
  }
}

/***
 * Taps of the symmetric filter that gives white noise a wanted shape.
 * The curve is straight between points on logarithmic axes, flat outside.
 * @param at samples: frequencies, cycles per sample, increasing, above 0
 * @param level samples: amplitude response there, above 0
 * @param half integer: taps on each side, 0 to 2048
 * @return samples: half + 1 taps, the centre first
 * @usage
 * local from = core.samples.from
 * local taps = core.synth.shape(from { 0.1, 0.3 }, from { 2, 1 }, 64)
 * assert(math.abs(core.synth.shape_response(taps, 0.05) - 2) < 0.01)
 */
static int synth_shape(lua_State *L) {
  size_t levels, half = lbr_check_count(L, 3, 0, LBR_MOST_HALF_TAPS);
  curve c;
  c.at = lbr_check_samples(L, 1, &c.n);
  c.level = lbr_check_samples(L, 2, &levels);
  check_curve(L, &c, levels);
  double *tap = lbr_push_samples(L, half + 1);
  lbr_status status = lbr_shape_design(curve_at, &c, half, tap);
  return status == LBR_OK ? 1 : lbr_raise(L, status, "shape");
}

/***
 * Response that the taps of a symmetric filter have.
 * @param taps samples: the centre first
 * @param f number: cycles per sample
 * @return number: amplitude response, signed
 * @usage
 * assert(core.synth.shape_response(core.samples.from { 1, 0.5 }, 0.25) == 1)
 */
static int synth_shape_response(lua_State *L) {
  size_t taps;
  const double *tap = lbr_check_samples(L, 1, &taps);
  luaL_argcheck(L, taps > 0, 1, "no taps");
  lbr_shape shape = {taps - 1, tap};
  lua_pushnumber(L, lbr_shape_response(&shape, luaL_checknumber(L, 2)));
  return 1;
}

/***
 * Taps that give noise the shape a filter and folding give it.
 * Their response is the root of the sum of |F|^2 over all frequencies that
 * fold onto one; a filter that never falls is taken to end at half the rate.
 * @param filter table: of core.filter.prepare, or its fields
 * @param rate number: sample rate, S/s
 * @param half integer: taps on each side, 0 to 2048
 * @return samples: half + 1 taps, the centre first
 * @usage
 * local f = { shape = "butterworth", order = 4, corner = 100 }
 * local taps = core.synth.input_shape(f, 1000, 32)
 * assert(math.abs(core.synth.shape_response(taps, 0.01) - 1) < 0.01)
 */
static int synth_input_shape(lua_State *L) {
  lbr_filter filter;
  lbr_check_filter(L, 1, &filter);
  double rate = luaL_checknumber(L, 2);
  size_t half = lbr_check_count(L, 3, 0, LBR_MOST_HALF_TAPS);
  luaL_argcheck(L, isfinite(rate) && rate > 0, 2, "no sample rate");
  double *tap = lbr_push_samples(L, half + 1);
  lbr_status status = lbr_input_shape(&filter, rate, half, tap);
  return status == LBR_OK ? 1 : lbr_raise(L, status, "input shape");
}

static const luaL_Reg functions[] = {
    {"philox", synth_philox},
    {"gaussian", synth_gaussian},
    {"uniform", synth_uniform},
    {"word", synth_word},
    {"shape", synth_shape},
    {"shape_response", synth_shape_response},
    {"input_shape", synth_input_shape},
    {NULL, NULL}};

int lbr_open_synth(lua_State *L) {
  luaL_newlib(L, functions);
  luaL_setfuncs(L, lbr_synth_signal_functions, 0);
  luaL_setfuncs(L, lbr_synth_motion_functions, 0);
  luaL_setfuncs(L, lbr_synth_damage_functions, 0);
  return 1;
}
