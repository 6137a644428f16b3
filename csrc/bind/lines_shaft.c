/* core.lines: orders of a shaft and averages over its turns. */
#include <math.h>

#include "bind/lines.h"
#include "bind/samples.h"
#include "lines/shaft.h"

/* Arguments arg and arg + 1: pulses in samples, pulses in a turn. */
static lbr_shaft check_shaft(lua_State *L, int arg) {
  lbr_shaft s;
  s.pulse = lbr_check_samples(L, arg, &s.pulses);
  s.per_turn = luaL_checknumber(L, arg + 1);
  if (lbr_shaft_check(&s) != LBR_OK)
    luaL_argerror(L, arg, "not 3 or more pulses at rising times, or not a "
                          "positive number of pulses in a turn");
  return s;
}

/*** Angle of a shaft at every sample, from its pulses.
 * Between pulses it is a cubic that meets steady speed and steady acceleration
 * exactly.
 * @param pulses samples: times of the pulses, in samples from the first sample
 * @param per_turn number: pulses in a turn
 * @param first integer: number of the first sample wanted, from 1
 * @param count integer: how many; all must lie between first and last pulse
 * @return samples: turns since the first pulse
 * @usage
 * local pulses = core.samples.from { 0, 10, 20, 30 }
 * assert(core.lines.turns(pulses, 1, 6, 3)[1] == 0.5)
 */
static int turns(lua_State *L) {
  lbr_shaft s = check_shaft(L, 1);
  size_t first = lbr_check_count(L, 3, 1, SIZE_MAX / 64);
  size_t count = lbr_check_count(L, 4, 1, SIZE_MAX / 64);
  luaL_argcheck(L, (double)(first - 1) >= s.pulse[0] &&
                (double)(first + count - 2) <= s.pulse[s.pulses - 1], 3,
                "samples outside the pulses");
  double *out = lbr_push_unset_samples(L, count);
  lbr_shaft_turns(&s, first - 1, count, out);
  return 1;
}

/*** Fits orders of a shaft and an offset to samples at known angles.
 * @param x samples: the record
 * @param angle samples: turns of the shaft at each sample
 * @param orders table: multiples of the shaft, 1 to 64, need not be whole
 * @return table: amplitude (peak), phase (rad, of the cosine at angle 0),
 *   u_amplitude, u_phase of order 1, then of order 2 ... in one flat sequence;
 *   or nil, message, code ("domain": orders that cannot be told apart)
 * @return table: offset, rms (of the residual)
 * @usage
 * local angle = lb.samples.make(200, function(i) return i * i / 2e4 end)
 * local x = lb.samples.make(200, function(i)
 *   return 3 * math.cos(math.pi * i * i / 1e4) end)
 * assert(math.abs(core.lines.orders(x, angle, { 1 })[1] - 3) < 1e-9)
 */
static int orders(lua_State *L) {
  size_t n, m, which = 0;
  double f[LBR_ORDERS_MOST], offset, rms;
  lbr_order out[LBR_ORDERS_MOST];
  const double *x = lbr_check_samples(L, 1, &n);
  const double *angle = lbr_check_samples(L, 2, &m);
  luaL_argcheck(L, m == n, 2, "not an angle for each sample");
  luaL_checktype(L, 3, LUA_TTABLE);
  lua_Integer count = luaL_len(L, 3);
  luaL_argcheck(L, count >= 1 && count <= LBR_ORDERS_MOST, 3,
                "not 1 to 64 orders");
  for (lua_Integer i = 0; i < count; i++) {
    lua_geti(L, 3, i + 1);
    f[i] = luaL_checknumber(L, -1);
    luaL_argcheck(L, f[i] > 0 && f[i] < 1e6, 3, "an order must be positive");
    lua_pop(L, 1);
  }
  lbr_status status = lbr_order_fit(x, angle, n, f, (size_t)count, out,
                                    &offset, &rms, &which);
  if (status == LBR_DOMAIN) {
    lua_pushnil(L);
    lua_pushfstring(L, "orders: %I samples are too few to tell order number "
                    "%I from the others", (LUAI_UACINT)n,
                    (LUAI_UACINT)which + 1);
    lua_pushstring(L, lbr_status_code(status));
    return 3;
  }
  if (status != LBR_OK) return lbr_refuse(L, status, "orders");
  lua_createtable(L, (int)(4 * count), 0);
  for (lua_Integer i = 0; i < count; i++) {
    const double row[4] = {out[i].amplitude, out[i].phase, out[i].u_amplitude,
                           out[i].u_phase};
    for (lua_Integer k = 0; k < 4; k++) {
      lua_pushnumber(L, row[k]);
      lua_seti(L, -2, 4 * i + k + 1);
    }
  }
  lua_createtable(L, 0, 2);
  lbr_put_number(L, "offset", offset);
  lbr_put_number(L, "rms", rms);
  return 2;
}

/*** Averages a record over the turns of a shaft.
 * Values between samples are those of a sinc under a Kaiser window (beta 10,
 * 24 samples either side): 1e-5 of a tone's amplitude up to 0.4 of the rate.
 * @param x samples: the record
 * @param pulses samples: times of the pulses, in samples from the first sample
 * @param per_turn number: pulses in a turn
 * @param points integer: angles of a turn, 2 to 2^20
 * @return samples: mean over the turns at each angle, from the first pulse's
 *   angle on; or nil, message, code ("domain": no whole turn in the record)
 * @return samples: standard deviation of the turns at each angle
 * @return integer: turns averaged
 * @usage
 * local x = lb.samples.make(400, function(i)
 *   return math.cos(math.pi * i / 25)
 * end)
 * local pulses = core.samples.from { 0, 50, 100, 150, 200, 250, 300, 350 }
 * local mean, deviation, turns = core.lines.turn_average(x, pulses, 1, 8)
 * assert(turns == 6 and deviation:peak() < 1e-9)
 */
static int turn_average(lua_State *L) {
  size_t n, count;
  const double *x = lbr_check_samples(L, 1, &n);
  lbr_shaft s = check_shaft(L, 2);
  size_t points = lbr_check_count(L, 4, 2, (size_t)1 << 20);
  double *mean = lbr_push_unset_samples(L, points);
  double *deviation = lbr_push_unset_samples(L, points);
  lbr_status status =
      lbr_shaft_average(&s, x, n, points, mean, deviation, &count);
  if (status != LBR_OK) return lbr_refuse(L, status, "average over turns");
  lua_pushinteger(L, (lua_Integer)count);
  return 3;
}

const luaL_Reg lbr_lines_shaft_functions[] = {
    {"orders", orders}, {"turn_average", turn_average}, {"turns", turns},
    {NULL, NULL}};
