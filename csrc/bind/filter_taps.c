/* core.filter.taps: linear-phase filters, decimation, rational resampling.
 */
#include <math.h>
#include <string.h>

#include "base/checked.h"
#include "bind/filter_parts.h"
#include "filter/fir.h"
#include "filter/polyphase.h"

#define CLASS "libration.taps"
#define STREAM_CLASS "libration.taps_stream"

typedef struct stream {
  const lbr_polyphase *filter; /* kept alive by the user value */
  lbr_polyphase_state state;
  int ended;
} stream;

static int taps_close(lua_State *L) {
  lbr_polyphase *p = luaL_checkudata(L, 1, CLASS);
  free(p->phase);
  p->phase = NULL;
  return 0;
}

static const luaL_Reg taps_meta[] = {{"__gc", taps_close}, {NULL, NULL}};

/***
 * A filter of given taps, with factors to resample by.
 * @param h samples: the taps, at up times the sample rate of the input
 * @param up integer: zeros are put in so that there are `up` times as many
 *   samples, default 1, at most 65536
 * @param down integer: every down-th is kept, default 1, at most 65536
 * @param centre integer: the tap that stands at time 0, from 0 (causal);
 *   default (#h - 1) // 2 (no delay)
 * @return userdata: the filter, immutable, with methods run, stream, count
 * @usage
 * local h = core.samples.from { 0.25, 0.5, 0.25 }
 * local y = core.filter.taps(h):run(core.samples.from { 0, 4, 0 })
 * assert(y[1] == 1 and y[2] == 2 and y[3] == 1)
 */
static int filter_taps(lua_State *L) {
  size_t taps;
  const double *h = lbr_check_samples(L, 1, &taps);
  luaL_argcheck(L, taps > 0 && taps <= LBR_FIR_MOST_TAPS, 1,
                "a filter has 1 to 2^22 taps");
  size_t up = lua_isnoneornil(L, 2)
                  ? 1 : lbr_check_count(L, 2, 1, LBR_POLYPHASE_MOST_FACTOR);
  size_t down = lua_isnoneornil(L, 3)
                    ? 1 : lbr_check_count(L, 3, 1, LBR_POLYPHASE_MOST_FACTOR);
  size_t centre = lua_isnoneornil(L, 4) ? (taps - 1) / 2
                                        : lbr_check_count(L, 4, 0, taps - 1);
  lbr_polyphase *p = lua_newuserdatauv(L, sizeof *p, 0);
  memset(p, 0, sizeof *p);
  lbr_set_class(L, CLASS, lbr_taps_methods, taps_meta);
  lbr_status status = lbr_polyphase_make(h, taps, up, down, centre, p);
  if (status != LBR_OK) return lbr_raise(L, status, "taps");
  return 1;
}

static const lbr_polyphase *check_taps(lua_State *L) {
  const lbr_polyphase *p = luaL_checkudata(L, 1, CLASS);
  luaL_argcheck(L, p->phase, 1, "the filter has been closed");
  return p;
}

/* Pushes a view of the first n of the samples at the top. */
static void shorten(lua_State *L, size_t n) {
  lua_getfield(L, -1, "slice");
  lua_insert(L, -2);
  lua_pushinteger(L, 1);
  lua_pushinteger(L, (lua_Integer)n);
  lua_call(L, 3, 1);
}

/* Room for a stream's seam, zeroed, as samples pushed on the stack. */
static double *push_seam(lua_State *L, const lbr_polyphase *p) {
  return lbr_push_samples(L, 2 * (p->span - 1));
}

/* Samples at places from .. from + count - 1 of a record that goes on. */
static double *push_beyond(lua_State *L, const double *x, size_t n,
                           ptrdiff_t from, size_t count, lbr_ends ends) {
  double *out = lbr_push_unset_samples(L, count);
  for (size_t i = 0; i < count; i++)
    out[i] = n ? lbr_ends_sample(x, n, from + (ptrdiff_t)i, ends) : 0;
  return out;
}

static void check_reach(lua_State *L, const lbr_polyphase *p, size_t n,
                        lbr_ends ends) {
  int folded = ends == LBR_ENDS_TURN || ends == LBR_ENDS_MIRROR;
  if (folded && (p->span > n || lbr_polyphase_beyond(p) >= n))
    luaL_argerror(L, 2, lua_pushfstring(
        L, "%I samples cannot be extended by %I; choose hold or bare for the "
        "ends", (LUAI_UACINT)n, (LUAI_UACINT)p->span));
}

/***
 * Filters a whole record.
 * @param x samples: the record
 * @param ends string: how it goes on beyond its ends: "bare" (default:
 *   zeros), "turn", "mirror" or "hold"
 * @return samples: ceil(#x up / down); sample j stands at j down / up, from 0,
 *   of the input (and is late by `centre` less than the middle tap)
 * @usage
 * local f = core.filter.taps(core.samples.from { 1 }, 1, 3)
 * assert(f:run(core.samples.from { 1, 2, 3, 4 })[2] == 4)
 */
static int taps_run(lua_State *L) {
  size_t n;
  const lbr_polyphase *p = check_taps(L);
  const double *x = lbr_check_samples(L, 2, &n);
  lbr_ends ends = lbr_check_ends(L, 3, LBR_ENDS_BARE);
  check_reach(L, p, n, ends);
  lbr_polyphase_state state = {0, 0, NULL};
  size_t back = p->span - 1, tail = lbr_polyphase_beyond(p);
  const double *before = push_beyond(L, x, n, -(ptrdiff_t)back, back, ends);
  double *behind = push_beyond(L, x, n, (ptrdiff_t)n, tail, ends);
  state.seam = push_seam(L, p);
  memcpy(state.seam, before, back * sizeof *before);
  double *y = lbr_push_unset_samples(L, lbr_polyphase_count(p, &state,
                                                            n + tail));
  lbr_polyphase_run(p, &state, x, n, y);
  lbr_polyphase_run(p, &state, behind, tail, y + state.made);
  shorten(L, n ? lbr_polyphase_total(p, n) : 0);
  return 1;
}

/***
 * How many samples a record of a length gives.
 * @param n integer: samples of the record
 * @return integer: ceil(n up / down)
 * @usage
 * local f = core.filter.taps(core.samples.from { 1 }, 147, 160)
 * assert(f:count(4096) == 3764)
 */
static int taps_count(lua_State *L) {
  const lbr_polyphase *p = check_taps(L);
  size_t n = lbr_check_count(L, 2, 0, LBR_POLYPHASE_MOST_SEEN);
  lua_pushinteger(L, (lua_Integer)lbr_polyphase_total(p, n));
  return 1;
}

static stream *check_stream(lua_State *L) {
  stream *s = luaL_checkudata(L, 1, STREAM_CLASS);
  luaL_argcheck(L, !s->ended && s->filter->phase, 1,
                "the stream has been finished");
  return s;
}

/***
 * Takes the next block of a record.
 * @param x samples: the block
 * @return samples: what can be given by now, bit for bit what the whole
 *   record with bare ends gives
 * @usage
 * local f = core.filter.taps(core.samples.from { 0.5, 0.5 }, 1, 1, 0)
 * local s = f:stream()
 * assert(s:run(core.samples.from { 2 })[1] == 1)
 */
static int stream_run(lua_State *L) {
  size_t n;
  stream *s = check_stream(L);
  const double *x = lbr_check_samples(L, 2, &n);
  luaL_argcheck(L, s->state.seen + n <= LBR_POLYPHASE_MOST_SEEN, 2,
                "a stream takes 2^45 samples");
  double *y = lbr_push_unset_samples(
      L, lbr_polyphase_count(s->filter, &s->state, n));
  lbr_polyphase_run(s->filter, &s->state, x, n, y);
  return 1;
}

/***
 * Ends a stream: zeros follow the record.
 * @return samples: the rest of its output
 * @usage
 * local f = core.filter.taps(core.samples.from { 1, 2, 3 })
 * local s, x = f:stream(), core.samples.from { 5, 6, 7 }
 * assert(s:run(x) .. s:finish() == f:run(x))
 */
static int stream_finish(lua_State *L) {
  stream *s = check_stream(L);
  size_t tail = lbr_polyphase_beyond(s->filter);
  size_t total = lbr_polyphase_total(s->filter, s->state.seen);
  size_t made = (size_t)s->state.made;
  const double *zeros = lbr_push_samples(L, tail);
  double *y = lbr_push_unset_samples(
      L, lbr_polyphase_count(s->filter, &s->state, tail));
  lbr_polyphase_run(s->filter, &s->state, zeros, tail, y);
  s->ended = 1;
  shorten(L, total - made);
  return 1;
}

static const luaL_Reg stream_methods[] = {
    {"run", stream_run}, {"finish", stream_finish}, {NULL, NULL}};

/***
 * A stream: blocks of a record go in one after another.
 * @return userdata: the stream, with methods run and finish
 * @usage
 * local s = core.filter.taps(core.samples.from { 1 }):stream()
 * assert(#s:run(core.samples.new(5)) == 5)
 */
static int taps_stream(lua_State *L) {
  static const luaL_Reg none[] = {{NULL, NULL}};
  const lbr_polyphase *p = check_taps(L);
  stream *s = lua_newuserdatauv(L, sizeof *s, 2);
  *s = (stream){p, {0, 0, NULL}, 0};
  lua_pushvalue(L, 1);
  lua_setiuservalue(L, -2, 1);
  s->state.seam = push_seam(L, p);
  lua_setiuservalue(L, -2, 2);
  lbr_set_class(L, STREAM_CLASS, stream_methods, none);
  return 1;
}

/***
 * Kaiser's estimate of the taps that a linear-phase filter takes.
 * @param db number: rejection and ripple, dB, 8 to 300
 * @param width number: of the transition, a share of the sample rate
 * @return integer: taps
 * @return number: shape parameter of Kaiser's window
 * @usage
 * local taps, beta = core.filter.kaiser(80, 0.05)
 * assert(taps == 102 and math.abs(beta - 7.85726) < 1e-12)
 */
static int filter_kaiser(lua_State *L) {
  size_t taps;
  double beta, db = luaL_checknumber(L, 1), width = luaL_checknumber(L, 2);
  luaL_argcheck(L, db >= 8 && db <= 300, 1, "the rejection is 8 to 300 dB");
  luaL_argcheck(L, width > 0 && width < 0.5, 2,
                "the transition lies between 0 and half the rate");
  lbr_status status = lbr_fir_kaiser(db, width, &taps, &beta);
  if (status != LBR_OK)
    return luaL_argerror(L, 2, "the transition takes more than 2^22 taps");
  lua_pushinteger(L, (lua_Integer)taps);
  lua_pushnumber(L, beta);
  return 2;
}

/***
 * Taps of a linear-phase filter by the window method, gain 1 where it passes
 * (at 0 Hz, at half the rate for high, in the middle for pass).
 * @param band string: "low", "high", "pass" or "stop"
 * @param edge number: where the gain is one half, a share of the rate; the
 *   lower one for pass and stop
 * @param upper number: the upper edge of pass and stop, else nil
 * @param n integer: taps, odd for high and stop
 * @param window number or samples: shape parameter of Kaiser's window, or n
 *   weights, symmetric
 * @return samples: the taps
 * @usage
 * local h = core.filter.window_taps("low", 0.1, nil, 51, 6)
 * assert(math.abs(h:sum() - 1) < 1e-12 and h[1] == h[51])
 */
static int filter_window_taps(lua_State *L) {
  size_t n, given;
  lbr_band band = lbr_check_band(L, 1);
  double edge[2] = {luaL_checknumber(L, 2), luaL_optnumber(L, 3, 0)};
  n = lbr_check_count(L, 4, 1, LBR_FIR_MOST_TAPS);
  const double *weight;
  if (luaL_testudata(L, 5, LBR_SAMPLES_CLASS)) {
    weight = lbr_check_samples(L, 5, &given);
    luaL_argcheck(L, given == n, 5, "not as many weights as taps");
    for (size_t i = 0; i < n / 2; i++)
      luaL_argcheck(L, fabs(weight[i] - weight[n - 1 - i]) <= 1e-12, 5,
                    "the weights are not symmetric");
  } else {
    double beta = luaL_checknumber(L, 5);
    luaL_argcheck(L, beta >= 0 && beta <= 600, 5,
                  "the shape parameter is 0 to 600");
    double *own = lbr_push_unset_samples(L, n);
    lbr_fir_kaiser_window(beta, own, n);
    weight = own;
  }
  double *h = lbr_push_unset_samples(L, n);
  if (lbr_fir_design(band, edge, weight, h, n) != LBR_OK)
    return luaL_argerror(L, 2, "the edges must lie in order between 0 and 0.5; "
                               "high and stop take an odd number of taps");
  return 1;
}

/***
 * Gain of symmetric taps about their middle, with its sign.
 * @param h samples: the taps
 * @param share number: frequency, a share of the rate
 * @return number: the gain
 * @usage
 * assert(core.filter.taps_gain(core.samples.from { 0.5, 0.5 }, 0) == 1)
 */
static int filter_taps_gain(lua_State *L) {
  size_t n;
  const double *h = lbr_check_samples(L, 1, &n);
  double share = luaL_checknumber(L, 2);
  luaL_argcheck(L, isfinite(share), 2, "no frequency");
  lua_pushnumber(L, n ? lbr_fir_gain(h, n, share) : 0);
  return 1;
}

const luaL_Reg lbr_taps_methods[] = {{"run", taps_run},
                                     {"stream", taps_stream},
                                     {"count", taps_count},
                                     {NULL, NULL}};

const luaL_Reg lbr_taps_functions[] = {
    {"taps", filter_taps},           {"kaiser", filter_kaiser},
    {"window_taps", filter_window_taps}, {"taps_gain", filter_taps_gain},
    {NULL, NULL}};
