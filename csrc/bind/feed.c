#include "bind/feed.h"

#include <math.h>

#include "base/hash.h"
#include "bind/samples.h"

static lbr_feed_handle *check_handle(lua_State *L) {
  lbr_feed_handle *h = luaL_checkudata(L, 1, LBR_FEED_CLASS);
  luaL_argcheck(L, h->feed.read, 1, "the feed is closed");
  return h;
}

const lbr_feed *lbr_check_feed(lua_State *L, int arg, lbr_lent_feed *lent) {
  lbr_feed_handle *h = luaL_testudata(L, arg, LBR_FEED_CLASS);
  if (h) {
    luaL_argcheck(L, h->feed.read, arg, "the feed is closed");
    return &h->feed;
  }
  size_t n;
  lent->block = lbr_check_samples(L, arg, &n);
  lent->feed = lbr_feed_doubles(&lent->block, 1, n);
  return &lent->feed;
}

void lbr_set_factors(lua_State *L, int index, int list) {
  lbr_feed_handle *h = luaL_checkudata(L, index, LBR_FEED_CLASS);
  index = lua_absindex(L, index);
  if (lua_isnoneornil(L, list)) return;
  luaL_checktype(L, list, LUA_TTABLE);
  size_t n = h->feed.channels;
  double *factor = lua_newuserdatauv(L, n * sizeof *factor, 0);
  for (size_t k = 0; k < n; k++) {
    lua_geti(L, list, (lua_Integer)k + 1);
    factor[k] = lua_tonumber(L, -1);
    luaL_argcheck(L, lua_isnumber(L, -1) && isfinite(factor[k]), list,
                  "a finite factor is needed for every channel");
    lua_pop(L, 1);
  }
  lua_setiuservalue(L, index, 3);
  h->feed.factor = factor;
  h->feed.memory = NULL;
}

/***
 * How many channels the feed has.
 * @return integer: 1 or more
 * @usage
 * assert(core.store.feed { core.samples.from { 1, 2 } }:channels() == 1)
 */
static int feed_channels(lua_State *L) {
  lua_pushinteger(L, (lua_Integer)check_handle(L)->feed.channels);
  return 1;
}

/***
 * How many samples each channel has.
 * @return integer: 0 or more
 * @usage
 * assert(core.store.feed { core.samples.from { 1, 2 } }:samples() == 2)
 */
static int feed_samples(lua_State *L) {
  lua_pushinteger(L, check_handle(L)->feed.samples);
  return 1;
}

/* Channel numbers from 1 in the list at `arg` (nil: all), from 0 in memory
 * that the state owns and that stays on the stack. */
static const int *check_channels(lua_State *L, int arg, const lbr_feed *feed,
                                 size_t *wanted) {
  int all = lua_isnoneornil(L, arg);
  if (!all) luaL_checktype(L, arg, LUA_TTABLE);
  size_t n = all ? feed->channels : (size_t)luaL_len(L, arg);
  luaL_argcheck(L, n >= 1 && n <= feed->channels, arg,
                "a list of channel numbers, no longer than there are channels");
  int *channel = lua_newuserdatauv(L, n * sizeof *channel, 0);
  for (size_t k = 0; k < n; k++) {
    lua_Integer number = (lua_Integer)k + 1;
    if (!all) {
      lua_geti(L, arg, (lua_Integer)k + 1);
      number = lua_tointeger(L, -1);
      lua_pop(L, 1);
    }
    if (number < 1 || number > (lua_Integer)feed->channels)
      luaL_argerror(L, arg, lua_pushfstring(L, "there is no channel %I; there "
                                            "are 1 to %I", (LUAI_UACINT)number,
                                            (LUAI_UACINT)feed->channels));
    channel[k] = (int)number - 1;
  }
  *wanted = n;
  return channel;
}

/* Blocks to fill: those of the list at `arg`, or new ones; the list is left at
 * the top, the pointers below it. */
static double **check_blocks(lua_State *L, int arg, size_t wanted,
                             size_t count) {
  int fresh = lua_isnoneornil(L, arg);
  if (!fresh) luaL_checktype(L, arg, LUA_TTABLE);
  double **out = lua_newuserdatauv(L, wanted * sizeof *out, 0);
  if (fresh)
    lua_createtable(L, (int)wanted, 0);
  else
    lua_pushvalue(L, arg);
  for (size_t k = 0; k < wanted; k++) {
    lua_Integer at = (lua_Integer)k + 1;
    if (fresh) {
      out[k] = lbr_push_unset_samples(L, count);
      lua_seti(L, -2, at);
      continue;
    }
    lua_geti(L, arg, at);
    lbr_view *view = luaL_testudata(L, -1, LBR_SAMPLES_CLASS);
    luaL_argcheck(L, view && view->n == count, arg,
                  "a block of count samples is needed for every channel");
    out[k] = view->data;
    lua_pop(L, 1);
  }
  return out;
}

static int refuse(lua_State *L, const lbr_feed_handle *h, lbr_status status,
                  int64_t first) {
  const char *why = h->feed.why ? h->feed.why(h->feed.context) : NULL;
  lua_getiuservalue(L, 1, 1);
  if (why) {
    lua_pushnil(L);
    lua_pushfstring(L, "%s: %s", lua_tostring(L, -2), why);
    lua_pushstring(L, lbr_status_code(status));
    return 3;
  }
  lua_pushfstring(L, "%s: the samples from number %I on",
                  luaL_tolstring(L, -1, NULL), (LUAI_UACINT)(first + 1));
  return lbr_refuse(L, status, lua_tostring(L, -1));
}

typedef lbr_status (*reader)(const lbr_feed *, int64_t, size_t, size_t,
                             const int *, double *const *);

static int read_with(lua_State *L, reader read) {
  lbr_feed_handle *h = check_handle(L);
  size_t wanted, most = (size_t)h->feed.samples;
  lua_settop(L, 5);
  size_t first = lbr_check_count(L, 2, 1, most + 1) - 1;
  size_t count = lbr_check_count(L, 3, 0, most - first);
  const int *channel = check_channels(L, 4, &h->feed, &wanted);
  double **out = check_blocks(L, 5, wanted, count);
  lbr_status status = read(&h->feed, (int64_t)first, count, wanted, channel,
                           out);
  if (status == LBR_OK) return 1;
  return refuse(L, h, status, (int64_t)first);
}

/***
 * Samples of some channels as values of their units.
 * @param first integer: number of the first sample, from 1
 * @param count integer: how many
 * @param channels table: channel numbers from 1; nil takes all
 * @param into table: blocks of count samples to be filled, as an earlier read
 *   returned them; nil makes new ones
 * @return table: one block of samples per channel; or nil, message, code when
 *   a file is damaged
 * @usage
 * local feed = core.store.feed({ core.samples.from { 1, 2, 3 } }, { 10 })
 * assert(feed:read(2, 2)[1][1] == 20)
 */
static int feed_read(lua_State *L) { return read_with(L, lbr_feed_read); }

/***
 * Samples of some channels as they are stored, without the factors.
 * @param first integer: number of the first sample, from 1
 * @param count integer: how many
 * @param channels table: channel numbers from 1; nil takes all
 * @param into table: blocks of count samples to be filled; nil makes new ones
 * @return table: one block of samples per channel; or nil, message, code
 * @usage
 * local feed = core.store.feed({ core.samples.from { 1, 2, 3 } }, { 10 })
 * assert(feed:codes(2, 2)[1][1] == 2)
 */
static int feed_codes(lua_State *L) { return read_with(L, lbr_feed_codes); }

/***
 * Replaces the factors that make stored samples values.
 * @param factors table: one finite number per channel
 * @usage
 * local feed = core.store.feed { core.samples.from { 1, 2, 3 } }
 * feed:scale { 0.5 }
 * assert(feed:read(3, 1)[1][1] == 1.5)
 */
static int feed_scale(lua_State *L) {
  check_handle(L);
  lbr_set_factors(L, 1, 2);
  return 0;
}

#define DIGEST_BLOCK 65536

/***
 * SHA-256 of the values of one channel, as doubles in this machine's byte
 * order; what core.store.digest gives for the whole block.
 * @param channel integer: from 1
 * @return string: 64 hexadecimal digits; or nil, message, code
 * @usage
 * local x = core.samples.from { 1, 2 }
 * assert(core.store.feed({ x }):digest(1) == core.store.digest(x))
 */
static int feed_digest(lua_State *L) {
  lbr_feed_handle *h = check_handle(L);
  int channel = (int)lbr_check_count(L, 2, 1, h->feed.channels) - 1;
  double *block = lbr_push_unset_samples(L, DIGEST_BLOCK);
  lbr_sha256_work work;
  char text[LBR_HASH_TEXT];
  lbr_sha256_begin(&work);
  for (int64_t at = 0; at < h->feed.samples; at += DIGEST_BLOCK) {
    int64_t left = h->feed.samples - at;
    size_t n = left < DIGEST_BLOCK ? (size_t)left : DIGEST_BLOCK;
    lbr_status status = lbr_feed_read(&h->feed, at, n, 1, &channel, &block);
    if (status != LBR_OK) return refuse(L, h, status, at);
    lbr_sha256_update(&work, block, n * sizeof *block);
  }
  lbr_sha256_finish_text(&work, text);
  lua_pushstring(L, text);
  return 1;
}

/***
 * Closes the feed and its file; doing so again is allowed.
 * @usage
 * local feed = core.store.feed { core.samples.from { 1, 2, 3 } }
 * feed:close()
 * assert(not pcall(feed.samples, feed))
 */
static int feed_close(lua_State *L) {
  lbr_feed_handle *h = luaL_checkudata(L, 1, LBR_FEED_CLASS);
  void *context = h->feed.context;
  void (*close)(void *) = h->close;
  h->feed = (lbr_feed){0};
  h->close = NULL;
  if (close) close(context);
  return 0;
}

static int feed_text(lua_State *L) {
  const lbr_feed_handle *h = luaL_checkudata(L, 1, LBR_FEED_CLASS);
  lua_pushfstring(L, "feed of %I samples, channels: %d%s",
                  (LUAI_UACINT)h->feed.samples, (int)h->feed.channels,
                  h->feed.read ? "" : " (closed)");
  return 1;
}

static const luaL_Reg methods[] = {
    {"channels", feed_channels}, {"samples", feed_samples},
    {"read", feed_read},         {"codes", feed_codes},
    {"scale", feed_scale},       {"digest", feed_digest},
    {"close", feed_close},
    {NULL, NULL},
};

static const luaL_Reg meta[] = {
    {"__gc", feed_close},
    {"__close", feed_close},
    {"__tostring", feed_text},
    {NULL, NULL},
};

lbr_feed_handle *lbr_push_feed(lua_State *L) {
  lbr_feed_handle *h = lua_newuserdatauv(L, sizeof *h, 3);
  *h = (lbr_feed_handle){0};
  lbr_set_class(L, LBR_FEED_CLASS, methods, meta);
  return h;
}

static void fill_doubles(lua_State *L, lbr_feed_handle *h, size_t channels) {
  const double **list = lua_newuserdatauv(L, channels * sizeof *list, 0);
  size_t length = 0;
  for (size_t k = 0; k < channels; k++) {
    size_t n;
    lua_geti(L, 1, (lua_Integer)k + 1);
    list[k] = lbr_check_samples(L, -1, &n);
    luaL_argcheck(L, k == 0 || n == length, 1,
                  "all blocks must have the same number of samples");
    length = n;
    lua_pop(L, 1);
  }
  lua_setiuservalue(L, -2, 2);
  h->feed = lbr_feed_doubles(list, channels, length);
}

static void fill_raw(lua_State *L, lbr_feed_handle *h, size_t channels) {
  lbr_raw_run *list = lua_newuserdatauv(L, channels * sizeof *list, 0);
  for (size_t k = 0; k < channels; k++) {
    lua_geti(L, 1, (lua_Integer)k + 1);
    luaL_argcheck(L, lbr_test_raw(L, -1, &list[k]) &&
                         list[k].n == list[0].n &&
                         list[k].kind == list[0].kind, 1,
                  "raw samples must be of one kind and number");
    lua_pop(L, 1);
  }
  lua_setiuservalue(L, -2, 2);
  h->feed = lbr_feed_raw(list, channels);
}

/***
 * A feed over blocks in memory.
 * @param blocks table: one block of samples, or of raw samples, per channel,
 *   all of one length; they are not copied
 * @param factors table: value = stored * factor, one per channel; nil: 1
 * @return feed: methods channels, samples, read, codes, scale, close
 * @usage
 * local raw = core.samples.raw(string.pack("<i2i2", 100, -200), "int16")
 * local feed = core.store.feed({ raw }, { 0.5 })
 * assert(feed:read(1, 2)[1][2] == -100)
 */
static int store_feed(lua_State *L) {
  luaL_checktype(L, 1, LUA_TTABLE);
  lua_settop(L, 2);
  size_t channels = (size_t)luaL_len(L, 1);
  luaL_argcheck(L, channels >= 1 && channels <= 65536, 1,
                "a list of 1 to 65536 blocks");
  lbr_feed_handle *h = lbr_push_feed(L);
  lbr_raw_run run;
  lua_geti(L, 1, 1);
  int is_raw = lbr_test_raw(L, -1, &run);
  lua_pop(L, 1);
  if (is_raw)
    fill_raw(L, h, channels);
  else
    fill_doubles(L, h, channels);
  lua_newtable(L); /* a copy of the list, which the caller may change */
  for (size_t k = 1; k <= channels; k++) {
    lua_geti(L, 1, (lua_Integer)k);
    lua_seti(L, -2, (lua_Integer)k);
  }
  lua_getiuservalue(L, 3, 2);
  lua_setfield(L, -2, "pointers");
  lua_setiuservalue(L, 3, 2);
  lua_pushliteral(L, "samples in memory");
  lua_setiuservalue(L, 3, 1);
  lbr_set_factors(L, 3, 2);
  lua_settop(L, 3);
  return 1;
}

/***
 * A feed over a stretch of some channels of another feed, which it keeps.
 * @param whole feed: the other one
 * @param first integer: its sample that becomes sample 1
 * @param count integer: samples
 * @param channels table: its channel numbers; nil takes all
 * @param factors table: value = stored * factor, one per channel; nil: 1
 * @return feed: of the stored samples and these factors
 * @usage
 * local x, y = core.samples.from { 1, 2, 3 }, core.samples.from { 4, 5, 6 }
 * local part = core.store.part(core.store.feed { x, y }, 2, 2, { 2 }, { 10 })
 * assert(part:samples() == 2 and part:read(1, 1)[1][1] == 50)
 */
static int store_part(lua_State *L) {
  const lbr_feed_handle *whole = check_handle(L);
  size_t wanted;
  lua_settop(L, 5);
  size_t first = lbr_check_count(L, 2, 1, (size_t)whole->feed.samples + 1);
  size_t count = lbr_check_count(L, 3, 0, (size_t)whole->feed.samples + 1 -
                                              first);
  const int *channel = check_channels(L, 4, &whole->feed, &wanted);
  lbr_part *part = lua_newuserdatauv(L, sizeof *part, 1);
  *part = (lbr_part){&whole->feed, (int64_t)first - 1, channel};
  lua_insert(L, -2);
  lua_setiuservalue(L, -2, 1); /* the part keeps the numbers */
  lua_createtable(L, 2, 0);
  lua_insert(L, -2);
  lua_seti(L, -2, 1);
  lua_pushvalue(L, 1);
  lua_seti(L, -2, 2);
  lbr_feed_handle *h = lbr_push_feed(L);
  lua_insert(L, -2);
  lua_setiuservalue(L, -2, 2); /* the feed keeps part and whole */
  h->feed = lbr_feed_part(part, wanted, (int64_t)count);
  lua_getiuservalue(L, 1, 1);
  lua_setiuservalue(L, -2, 1);
  lbr_set_factors(L, lua_gettop(L), 5);
  return 1;
}

static const luaL_Reg functions[] = {
    {"feed", store_feed}, {"part", store_part}, {NULL, NULL}};

void lbr_add_feeds(lua_State *L) { luaL_setfuncs(L, functions, 0); }
