/* core.spectrum: averages of overlapping segments. */
#include <math.h>
#include <stdbool.h>

#include "bind/bind.h"
#include "bind/feed.h"
#include "bind/samples.h"
#include "bind/spectrum.h"
#include "spectrum/average.h"
#include "spectrum/transform.h"

#define CLASS "libration.average"

typedef struct holder {
  lbr_average *average; /* NULL: closed */
  size_t channels;
  size_t points;
} holder;

static holder *check_holder(lua_State *L) {
  holder *h = luaL_checkudata(L, 1, CLASS);
  luaL_argcheck(L, h->average, 1, "the average is closed");
  return h;
}

/***
 * Gives back the memory of the average before it is collected.
 * @usage
 * local w = core.samples.from { 1, 1, 1, 1 }
 * local a = core.spectrum.average(w, 2, 4, 1, "none", "mean", false, 1)
 * a:close()
 * assert(not pcall(a.segments, a))
 */
static int holder_close(lua_State *L) {
  holder *h = luaL_checkudata(L, 1, CLASS);
  lbr_average_free(h->average);
  h->average = NULL;
  return 0;
}

/* Pointers to the samples of argument 2: one block, or a list of blocks of
 * equal length, one per channel.  The array is left on the stack. */
static const double *const *check_channels(lua_State *L, size_t channels,
                                           size_t *n) {
  const double **list =
      lua_newuserdatauv(L, channels * sizeof *list + 1, 0);
  if (!lua_istable(L, 2)) {
    luaL_argcheck(L, channels == 1, 2, "one block for several channels");
    list[0] = lbr_check_samples(L, 2, n);
    return list;
  }
  if (lua_rawlen(L, 2) != channels)
    luaL_argerror(L, 2, lua_pushfstring(
        L, "%I blocks for %I channels", (LUAI_UACINT)lua_rawlen(L, 2),
        (LUAI_UACINT)channels));
  for (size_t c = 0; c < channels; c++) {
    lua_rawgeti(L, 2, (lua_Integer)c + 1);
    const lbr_view *view = luaL_testudata(L, -1, LBR_SAMPLES_CLASS);
    if (!view)
      luaL_argerror(L, 2, lua_pushfstring(L, "item %I is no block of samples",
                                          (LUAI_UACINT)(c + 1)));
    if (c > 0 && view->n != *n)
      luaL_argerror(L, 2, "the blocks are not of one length");
    *n = view->n;
    list[c] = view->data;
    lua_pop(L, 1);
  }
  return list;
}

/* Channel numbers from 0 on the stack: those of the list at `arg` counted from
 * 1, or 0, 1, 2 ... */
static const int *push_numbers(lua_State *L, int arg, size_t channels,
                               size_t most) {
  bool all = lua_isnoneornil(L, arg);
  if (!all) luaL_checktype(L, arg, LUA_TTABLE);
  size_t listed = all ? most : (size_t)lua_rawlen(L, arg);
  if (listed != channels)
    luaL_argerror(L, arg, lua_pushfstring(
        L, "%I channels of a feed for %I channels", (LUAI_UACINT)listed,
        (LUAI_UACINT)channels));
  int *numbers = lua_newuserdatauv(L, channels * sizeof *numbers, 0);
  for (size_t c = 0; c < channels; c++) {
    lua_Integer number = (lua_Integer)c + 1;
    if (!all) {
      lua_rawgeti(L, arg, (lua_Integer)c + 1);
      number = lua_tointeger(L, -1);
      lua_pop(L, 1);
    }
    if (number < 1 || number > (lua_Integer)most)
      luaL_argerror(L, arg, lua_pushfstring(
          L, "%I is no channel; there are 1 to %I", (LUAI_UACINT)number,
          (LUAI_UACINT)most));
    numbers[c] = (int)number - 1;
  }
  return numbers;
}

/***
 * Appends samples to the stream that is averaged.
 * Blocks may have any size: the sums come out the same to the last bit.
 * @param source samples, table or feed: one block, a list of blocks of equal
 *   length, one per channel, or a feed
 * @param channels table: of a feed, numbers from 1; default all
 * @param first integer: of a feed, the first sample from 1, default 1
 * @param count integer: of a feed, how many samples, default all that follow
 * @return average: this one; or nil, message, code ("no_memory"; a feed's
 *   "io", "format")
 * @usage
 * local w = core.samples.from { 1, 1, 1, 1 }
 * local a = core.spectrum.average(w, 2, 4, 1, "none", "mean", false, 1)
 * a:feed(core.samples.from { 1, -1, 1 }):feed(core.samples.from { -1 })
 * assert(a:segments() == 1 and a:power(1, 1)[3] == 16)
 */
static int feed(lua_State *L) {
  holder *h = check_holder(L);
  size_t n = 0, first = 0, count;
  lbr_feed blocks;
  const lbr_feed *f = &blocks;
  lua_settop(L, 5);
  if (luaL_testudata(L, 2, LBR_FEED_CLASS)) {
    f = lbr_check_feed(L, 2, NULL);
    n = (size_t)f->samples;
  } else {
    const double *const *list = check_channels(L, h->channels, &n);
    blocks = lbr_feed_doubles(list, h->channels, n);
  }
  if (!lua_isnil(L, 4)) first = lbr_check_count(L, 4, 1, n + 1) - 1;
  count = n - first;
  if (!lua_isnil(L, 5)) count = lbr_check_count(L, 5, 0, n - first);
  const int *numbers = push_numbers(L, 3, h->channels, f->channels);
  lbr_status status = lbr_average_feed(h->average, f, numbers, (int64_t)first,
                                       (int64_t)count);
  if (status != LBR_OK) return lbr_refuse(L, status, "average");
  lua_settop(L, 1);
  return 1;
}

/***
 * Says that what is fed from now on does not follow what was fed before.
 * No segment reaches across a break; samples after the last whole segment are
 * left out.
 * @return average: this one; or nil, message, code
 * @usage
 * local w = core.samples.from { 1, 1, 1, 1 }
 * local a = core.spectrum.average(w, 4, 4, 1, "none", "mean", false, 1)
 * a:feed(core.samples.new(6)):split():feed(core.samples.new(6))
 * assert(a:segments() == 2)
 */
static int split(lua_State *L) {
  holder *h = check_holder(L);
  lbr_status status = lbr_average_break(h->average);
  if (status != LBR_OK) return lbr_refuse(L, status, "average");
  lua_settop(L, 1);
  return 1;
}

/***
 * How many whole segments the stream has so far.
 * @return integer: segments
 * @return integer: samples fed since the last split, per channel
 * @usage
 * local w = core.samples.from { 1, 1, 1, 1 }
 * local a = core.spectrum.average(w, 2, 4, 1, "none", "mean", false, 1)
 * assert(a:segments() == 0)
 */
static int segments(lua_State *L) {
  holder *h = check_holder(L);
  lua_pushinteger(L, (lua_Integer)lbr_average_segments(h->average));
  lua_pushinteger(L, (lua_Integer)lbr_average_samples(h->average));
  return 2;
}

static size_t check_channel(lua_State *L, int arg, const holder *h) {
  return lbr_check_count(L, arg, 1, h->channels) - 1;
}

/* Twice the scale where a bin stands for two sides. */
static double side(const holder *h, size_t k, double scale) {
  return k == 0 || 2 * k == h->points ? scale : 2 * scale;
}

/***
 * The averaged power of a channel: scale |X[k]|^2, twice that at bins with a
 * mirror image (all but 0 Hz and half the rate).
 * @param channel integer: from 1
 * @param scale number: what a bare power is multiplied by
 * @return samples: points // 2 + 1 values; or nil, message, code
 *   ("infeasible": no whole segment yet)
 * @usage
 * local w = core.samples.from { 1, 1, 1, 1 }
 * local a = core.spectrum.average(w, 4, 4, 1, "mean", "mean", false, 1)
 * a:feed(core.samples.from { 3, 1, 3, 1 })
 * assert(a:power(1, 1 / 16)[3] == 1 and a:power(1, 1)[1] == 0)
 */
static int power(lua_State *L) {
  holder *h = check_holder(L);
  size_t channel = check_channel(L, 2, h);
  double scale = luaL_checknumber(L, 3);
  double *out = lbr_push_samples(L, lbr_average_bins(h->average));
  lbr_status status = lbr_average_power(h->average, channel, out);
  if (status != LBR_OK) return lbr_refuse(L, status, "averaged power");
  for (size_t k = 0; k < lbr_average_bins(h->average); k++)
    out[k] *= side(h, k, scale);
  return 1;
}

/***
 * The cross spectrum of two channels: scale times the mean of conj(X) Y, twice
 * that at bins with a mirror image.
 * @param from integer: channel of X, from 1
 * @param to integer: channel of Y, another one
 * @param scale number: what a bare product is multiplied by
 * @return samples: real parts; or nil, message, code ("infeasible": no whole
 *   segment yet)
 * @return samples: imaginary parts
 * @usage
 * local w = core.samples.from { 1, 1, 1, 1 }
 * local a = core.spectrum.average(w, 4, 4, 2, "none", "mean", true, 1)
 * a:feed { core.samples.from { 1, 0, 0, 0 }, core.samples.from { 0, 1, 0, 0 } }
 * local re, im = a:cross(1, 2, 1)
 * assert(re[1] == 1 and im[2] == -2)
 */
static int cross(lua_State *L) {
  holder *h = check_holder(L);
  size_t from = check_channel(L, 2, h), to = check_channel(L, 3, h);
  double scale = luaL_checknumber(L, 4);
  luaL_argcheck(L, from != to, 3, "the same channel twice");
  size_t bins = lbr_average_bins(h->average);
  double *re = lbr_push_samples(L, bins), *im = lbr_push_samples(L, bins);
  double complex *both = lua_newuserdatauv(L, bins * sizeof *both, 0);
  lbr_status status = lbr_average_cross(h->average, from, to, both);
  if (status == LBR_DOMAIN)
    return luaL_error(L, "the average was made without cross spectra");
  if (status != LBR_OK) return lbr_refuse(L, status, "cross spectrum");
  for (size_t k = 0; k < bins; k++) {
    re[k] = side(h, k, scale) * creal(both[k]);
    im[k] = side(h, k, scale) * cimag(both[k]);
  }
  lua_pop(L, 1);
  return 2;
}

static const luaL_Reg methods[] = {
    {"close", holder_close}, {"cross", cross},       {"feed", feed},
    {"power", power},        {"segments", segments}, {"split", split},
    {NULL, NULL}};

static const luaL_Reg meta[] = {
    {"__gc", holder_close}, {"__close", holder_close}, {NULL, NULL}};

/***
 * An average of the spectra of overlapping segments, to be fed with samples.
 * @param window samples: the window; a segment is as long
 * @param step integer: samples from one segment to the next, 1 to #window
 * @param points integer: of the transforms, #window or more (zeros added)
 * @param channels integer: 1 to 1024
 * @param detrend string: what is taken from each segment: "none", "mean",
 *   "line" (of least squares)
 * @param averaging string: "mean", "median", "peak"
 * @param crossed boolean: the cross spectra of all pairs of channels too (mean
 *   alone)
 * @param workers integer: threads; 0: one per core
 * @return average: methods feed, segments, power, cross, close
 * @usage
 * local w = core.samples.from { 0, 0.5, 1, 0.5 }
 * local a = core.spectrum.average(w, 2, 4, 1, "mean", "peak", false, 0)
 * assert(a:feed(core.samples.new(10)):segments() == 4)
 */
static int average(lua_State *L) {
  static const char *const trends[] = {"none", "mean", "line", NULL};
  static const char *const kinds[] = {"mean", "median", "peak", NULL};
  size_t n;
  const double *w = lbr_check_samples(L, 1, &n);
  luaL_argcheck(L, n >= 1, 1, "an empty window");
  lbr_average_setting s = {
      .length = n,
      .window = w,
      .step = lbr_check_count(L, 2, 1, n),
      .points = lbr_check_count(L, 3, n, LBR_TRANSFORM_MOST),
      .channels = lbr_check_count(L, 4, 1, LBR_AVERAGE_MOST_CHANNELS),
      .detrend = (lbr_detrend)luaL_checkoption(L, 5, NULL, trends),
      .kind = (lbr_averaging)luaL_checkoption(L, 6, NULL, kinds),
      .cross = lua_toboolean(L, 7),
      .workers = (unsigned)lbr_check_count(L, 8, 0, 1024)};
  luaL_argcheck(L, !s.cross || s.kind == LBR_AVERAGE_MEAN, 6,
                "cross spectra are averaged by the mean alone");
  holder *h = lua_newuserdatauv(L, sizeof *h, 0);
  *h = (holder){NULL, s.channels, s.points};
  lbr_set_class(L, CLASS, methods, meta);
  lbr_status status = lbr_average_new(&s, &h->average);
  if (status != LBR_OK) return lbr_raise(L, status, "average");
  return 1;
}

static const luaL_Reg functions[] = {{"average", average}, {NULL, NULL}};

void lbr_add_averages(lua_State *L) { luaL_setfuncs(L, functions, 0); }
