/* Planting failures: kernels that spoil samples in place. */
#include <math.h>

#include "bind/samples.h"
#include "bind/synth.h"
#include "synth/damage.h"
#include "synth/warp.h"

/* A number argument that is above zero. */
static double check_above(lua_State *L, int arg) {
  double value = luaL_checknumber(L, arg);
  luaL_argcheck(L, value > 0 && isfinite(value), arg, "not above 0");
  return value;
}

/***
 * Clips samples in place, as rails do.
 * @param x samples: clipped
 * @param low number: smallest value left
 * @param high number: largest value left
 * @return integer: samples that changed
 * @usage
 * local x = core.samples.from { -3, 0.5, 3 }
 * assert(core.synth.clip(x, -1, 2) == 2 and x[1] == -1 and x[3] == 2)
 */
static int synth_clip(lua_State *L) {
  size_t n;
  double *x = lbr_check_writable_samples(L, 1, &n);
  double low = luaL_checknumber(L, 2), high = luaL_checknumber(L, 3);
  luaL_argcheck(L, low <= high, 3, "below the low rail");
  lua_pushinteger(L, (lua_Integer)lbr_clip(x, n, low, high));
  return 1;
}

/***
 * Flattens samples smoothly in place, as an overdriven amplifier does.
 * @param x samples: flattened
 * @param low number: level that negative samples approach, above 0
 * @param high number: level that positive samples approach, above 0
 * @param knee number: share of the level that bends, above 0 up to 1
 * @return samples: the same
 * @usage
 * local x = core.synth.soften(core.samples.from { 0.5, 99 }, 1, 2, 0.25)
 * assert(x[1] == 0.5 and x[2] == 2)
 */
static int synth_soften(lua_State *L) {
  size_t n;
  double *x = lbr_check_writable_samples(L, 1, &n);
  double low = check_above(L, 2), high = check_above(L, 3);
  double knee = check_above(L, 4);
  luaL_argcheck(L, knee <= 1, 4, "above 1");
  lbr_soften(x, n, low, high, knee);
  lua_settop(L, 1);
  return 1;
}

/***
 * Bends samples in place: x + second x^2 + third x^3.
 * @param x samples: bent
 * @param second number: per unit
 * @param third number: per unit squared
 * @return samples: the same
 * @usage
 * assert(core.synth.bend(core.samples.from { 2 }, 0.5, 0.25)[1] == 6)
 */
static int synth_bend(lua_State *L) {
  size_t n;
  double *x = lbr_check_writable_samples(L, 1, &n);
  lbr_bend(x, n, luaL_checknumber(L, 2), luaL_checknumber(L, 3));
  lua_settop(L, 1);
  return 1;
}

/***
 * Rounds samples in place to multiples of a step, half to even.
 * @param x samples: rounded
 * @param step number: above 0
 * @return samples: the same
 * @usage
 * assert(core.synth.coarsen(core.samples.from { 2.5, 3.2 }, 2)[2] == 4)
 */
static int synth_coarsen(lua_State *L) {
  size_t n;
  double *x = lbr_check_writable_samples(L, 1, &n);
  lbr_coarsen(x, n, check_above(L, 2));
  lua_settop(L, 1);
  return 1;
}

/***
 * Damages integer codes in place, bit by bit.
 * @param x samples: codes, whole numbers of up to 32 bits
 * @param damage table: bits (width kept, 32), keep (mask of bits that survive,
 *   0xffffffff), force (mask of bits that are always 1, 0), skip (0: none; else
 *   codes c with c mod skip == skip // 2 become c + 1)
 * @return integer: codes that changed; raises where a sample is no code
 * @usage
 * local x = core.samples.from { 5, 127 }
 * local changed = core.synth.damage_codes(x, { bits = 8, force = 2 })
 * assert(changed == 1 and x[1] == 7 and x[2] == 127)
 */
static int synth_damage_codes(lua_State *L) {
  size_t n, changed = 0;
  double *x = lbr_check_writable_samples(L, 1, &n);
  luaL_checktype(L, 2, LUA_TTABLE);
  lbr_code_damage d = {
      .bits = (int)lbr_whole_field(L, 2, "bits", 32),
      .keep = (uint32_t)lbr_whole_field(L, 2, "keep", 0xffffffff),
      .force = (uint32_t)lbr_whole_field(L, 2, "force", 0),
      .skip = (int32_t)lbr_whole_field(L, 2, "skip", 0)};
  lbr_status status = lbr_damage_codes(x, n, &d, &changed);
  if (status != LBR_OK) return lbr_raise(L, status, "codes");
  lua_pushinteger(L, (lua_Integer)changed);
  return 1;
}

/***
 * One sample of every few, as a decimation without a filter leaves them.
 * @param x samples: not changed
 * @param step integer: 1 or more
 * @return samples: number 1, 1 + step, 1 + 2 step ...
 * @usage
 * local y = core.synth.every(core.samples.from { 1, 2, 3, 4 }, 3)
 * assert(#y == 2 and y[2] == 4)
 */
static int synth_every(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  size_t step = lbr_check_count(L, 2, 1, (size_t)1 << 40);
  size_t left = n / step + (n % step != 0);
  double *y = lbr_push_unset_samples(L, left);
  for (size_t i = 0; i < left; i++) y[i] = x[i * step];
  return 1;
}

static double check_cycles(lua_State *L, int arg) {
  double cycles = check_above(L, arg);
  luaL_argcheck(L, cycles < 0.5, arg, "not below half a cycle per sample");
  return cycles;
}

/***
 * Runs a first-order low pass over samples, in place.
 * @param x samples: filtered
 * @param corner number: cycles per sample, above 0 and below 1/2
 * @return samples: the same
 * @usage
 * local x = core.synth.low_pass(core.samples.from { 1, 1, 1 }, 0.1)
 * assert(math.abs(x[3] - 1) < 1e-15)
 */
static int synth_low_pass(lua_State *L) {
  size_t n;
  double *x = lbr_check_writable_samples(L, 1, &n);
  lbr_section s = lbr_low_pass(check_cycles(L, 2));
  lbr_section_run(&s, x, n);
  lua_settop(L, 1);
  return 1;
}

/***
 * Lets samples resonate in place: gain 1 at 0 Hz, q at the resonance.
 * @param x samples: filtered
 * @param cycles number: of the resonance, per sample, above 0 and below 1/2
 * @param q number: gain there, above 0
 * @return samples: the same
 * @usage
 * local x = core.synth.resonate(core.samples.from { 1, 1, 1 }, 0.1, 5)
 * assert(math.abs(x[3] - 1) < 1e-15)
 */
static int synth_resonate(lua_State *L) {
  size_t n;
  double *x = lbr_check_writable_samples(L, 1, &n);
  lbr_section s = lbr_resonance(check_cycles(L, 2), check_above(L, 3));
  lbr_section_run(&s, x, n);
  lua_settop(L, 1);
  return 1;
}

static lbr_warp warp_fields(lua_State *L, int t) {
  lua_Integer period = lbr_whole_field(L, t, "period", 1);
  if (period < 1) luaL_error(L, "period is below 1");
  return (lbr_warp){
      .shift = lbr_field(L, t, "shift", 0),
      .stretch = lbr_field(L, t, "stretch", 0),
      .bend = lbr_field(L, t, "bend", 0),
      .sigma = lbr_field(L, t, "sigma", 0),
      .period = (uint64_t)period,
      .key = lbr_key_of((uint64_t)lbr_whole_field(L, t, "seed", 0),
                        (uint64_t)lbr_whole_field(L, t, "trial", 0),
                        (uint64_t)lbr_whole_field(L, t, "channel", 0),
                        (uint64_t)lbr_whole_field(L, t, "purpose",
                                                  LBR_PURPOSE_JITTER))};
}

/***
 * Samples at other instants: i + shift + stretch i + bend i^2 / 2 + jitter.
 * @param x samples: at least one; not changed
 * @param warp table: shift (samples), stretch (relative), bend (change of
 *   stretch per sample), sigma (of the jitter, samples), period (samples that
 *   share one displacement, 1), seed, trial, channel, purpose (of the jitter)
 * @return samples: as many as can be had before the instants leave x
 * @usage
 * local x = core.samples.from { 1, 2, 3, 4 }
 * local y = core.synth.warp(x, { shift = 1 })
 * assert(#y == 3 and y[1] == 2)
 */
static int synth_warp(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  luaL_argcheck(L, n > 0, 1, "no samples");
  luaL_checktype(L, 2, LUA_TTABLE);
  lbr_warp w = warp_fields(L, 2);
  size_t count = lbr_warp_count(&w, n);
  lbr_warp_run(&w, x, n, lbr_push_unset_samples(L, count), count);
  return 1;
}

const luaL_Reg lbr_synth_damage_functions[] = {
    {"clip", synth_clip},
    {"soften", synth_soften},
    {"bend", synth_bend},
    {"coarsen", synth_coarsen},
    {"damage_codes", synth_damage_codes},
    {"every", synth_every},
    {"low_pass", synth_low_pass},
    {"resonate", synth_resonate},
    {"warp", synth_warp},
    {NULL, NULL}};
