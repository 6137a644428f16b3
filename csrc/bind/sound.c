#include "bind/sound.h"

#include <string.h>

#include "bind/feed.h"
#include "bind/samples.h"
#include "store/sound.h"

#define CLASS "libration.sound"

/* The handle; made empty first, so that an error cannot lose the file. */
typedef struct handle {
  lbr_sound *sound; /* NULL: closed */
  lbr_sound_facts facts;
} handle;

int lbr_refuse_file(lua_State *L, lbr_status status, const char *path,
                    const lbr_why *why) {
  lua_pushnil(L);
  lua_pushfstring(L, "%s: %s", path, why->text);
  lua_pushstring(L, lbr_status_code(status));
  return 3;
}

const char *lbr_check_path(lua_State *L, int arg) {
  size_t length;
  const char *path = luaL_checklstring(L, arg, &length);
  luaL_argcheck(L, length > 0 && strlen(path) == length, arg,
                "a path is not empty and holds no NUL");
  return path;
}

static handle *check_open(lua_State *L) {
  handle *h = luaL_checkudata(L, 1, CLASS);
  luaL_argcheck(L, h->sound, 1, "the sound file is closed");
  return h;
}

static const char *path_of(lua_State *L) {
  lua_getiuservalue(L, 1, 1);
  return lua_tostring(L, -1);
}

/***
 * Facts from the headers of an open sound file.
 * @return table: container ("wav", "rf64", "w64", "flac", "ogg"), rate (whole
 *   samples per second), channels, bits (0 for Vorbis), integer (codes are
 *   integers), lossy, full_scale (2^(bits-1), or 1 for floats), frames
 *   (samples per channel)
 * @usage
 * local path, x = os.tmpname(), core.samples.from { 1, -2, 3 }
 * local spec = { rate = 8000, bits = 16, integer = true, scale = 1 }
 * assert(core.store.write(path, spec, { x }))
 * local sound <close> = core.store.open(path)
 * assert(sound:facts().frames == 3 and sound:facts().bits == 16)
 * os.remove(path)
 */
static int sound_facts(lua_State *L) {
  const lbr_sound_facts *f = &check_open(L)->facts;
  lua_createtable(L, 0, 8);
  lua_pushstring(L, f->container);
  lua_setfield(L, -2, "container");
  lua_pushinteger(L, f->rate);
  lua_setfield(L, -2, "rate");
  lua_pushinteger(L, f->channels);
  lua_setfield(L, -2, "channels");
  lua_pushinteger(L, f->bits);
  lua_setfield(L, -2, "bits");
  lua_pushboolean(L, f->is_integer);
  lua_setfield(L, -2, "integer");
  lua_pushboolean(L, f->is_lossy);
  lua_setfield(L, -2, "lossy");
  lua_pushnumber(L, f->full_scale);
  lua_setfield(L, -2, "full_scale");
  lua_pushinteger(L, f->frames);
  lua_setfield(L, -2, "frames");
  return 1;
}

/* Channel numbers from 1 in the list at `arg` (nil: all), from 0 in C. */
static size_t check_channels(lua_State *L, int arg, const handle *h,
                             int *channel) {
  if (lua_isnoneornil(L, arg)) {
    for (int k = 0; k < h->facts.channels; k++) channel[k] = k;
    return (size_t)h->facts.channels;
  }
  luaL_checktype(L, arg, LUA_TTABLE);
  lua_Integer wanted = luaL_len(L, arg);
  luaL_argcheck(L, wanted >= 1 && wanted <= LBR_SOUND_MOST_CHANNELS, arg,
                "a list of 1 to 256 channel numbers");
  for (lua_Integer k = 0; k < wanted; k++) {
    lua_geti(L, arg, k + 1);
    lua_Integer number = lua_tointeger(L, -1);
    if (number < 1 || number > h->facts.channels)
      luaL_argerror(L, arg, lua_pushfstring(L, "there is no channel %s; the "
                                            "file has 1 to %d",
                                            luaL_tolstring(L, -1, NULL),
                                            h->facts.channels));
    channel[k] = (int)number - 1;
    lua_pop(L, 1);
  }
  return (size_t)wanted;
}

static void make_blocks(lua_State *L, size_t wanted, size_t count,
                        double **out) {
  lua_createtable(L, (int)wanted, 0);
  for (size_t k = 0; k < wanted; k++) {
    out[k] = lbr_push_samples(L, count);
    lua_seti(L, -2, (lua_Integer)k + 1);
  }
}

/* Blocks to be filled again; leaves their list at the top. */
static void check_into(lua_State *L, int arg, size_t wanted, size_t count,
                       double **out) {
  luaL_checktype(L, arg, LUA_TTABLE);
  for (size_t k = 0; k < wanted; k++) {
    lua_geti(L, arg, (lua_Integer)k + 1);
    lbr_view *view = luaL_testudata(L, -1, LBR_SAMPLES_CLASS);
    luaL_argcheck(L, view && view->n == count, arg,
                  "a block of count samples is needed for every channel");
    out[k] = view->data;
    lua_pop(L, 1);
  }
  lua_pushvalue(L, arg);
}

/***
 * The next frames of some channels, in the codes that are stored.
 * @param count integer: frames, 1 or more, no more than are left
 * @param channels table: channel numbers from 1; nil takes all
 * @param into table: blocks of count samples to be filled, as an earlier read
 *   returned them; nil makes new ones
 * @return table: one block of samples per channel; or nil, message, code when
 *   the file is damaged
 * @usage
 * local path, x = os.tmpname(), core.samples.from { 1, -2, 3 }
 * local spec = { rate = 8000, bits = 16, integer = true, scale = 1 }
 * assert(core.store.write(path, spec, { x }))
 * local sound <close> = core.store.open(path)
 * assert(core.store.digest(sound:read(3, { 1 })[1]) == core.store.digest(x))
 * os.remove(path)
 */
static int sound_read(lua_State *L) {
  handle *h = check_open(L);
  int channel[LBR_SOUND_MOST_CHANNELS];
  double *out[LBR_SOUND_MOST_CHANNELS];
  lbr_why why;
  int64_t left = h->facts.frames - lbr_sound_at(h->sound);
  size_t count = lbr_check_count(L, 2, left > 0, (size_t)left);
  size_t wanted = check_channels(L, 3, h, channel);
  if (lua_isnoneornil(L, 4))
    make_blocks(L, wanted, count, out);
  else
    check_into(L, 4, wanted, count, out);
  lbr_status status = lbr_sound_read(h->sound, count, wanted, channel, out,
                                     &why);
  if (status != LBR_OK) return lbr_refuse_file(L, status, path_of(L), &why);
  return 1;
}

/***
 * Winds the file to a frame.
 * @param frame integer: frames before the next one read, 0 .. frames
 * @return boolean: true; or nil, message, code
 * @usage
 * local path, x = os.tmpname(), core.samples.from { 1, -2, 3 }
 * local spec = { rate = 8000, bits = 16, integer = true, scale = 1 }
 * assert(core.store.write(path, spec, { x }))
 * local sound <close> = core.store.open(path)
 * assert(sound:seek(2) and #sound:read(1)[1] == 1)
 * os.remove(path)
 */
static int sound_seek(lua_State *L) {
  handle *h = check_open(L);
  lbr_why why;
  size_t frame = lbr_check_count(L, 2, 0, (size_t)h->facts.frames);
  lbr_status status = lbr_sound_seek(h->sound, (int64_t)frame, &why);
  if (status != LBR_OK) return lbr_refuse_file(L, status, path_of(L), &why);
  lua_pushboolean(L, 1);
  return 1;
}

/***
 * Closes the file; doing so again is allowed.
 * @usage
 * local path, x = os.tmpname(), core.samples.from { 1, -2, 3 }
 * local spec = { rate = 8000, bits = 16, integer = true, scale = 1 }
 * assert(core.store.write(path, spec, { x }))
 * local sound = core.store.open(path)
 * sound:close()
 * assert(not pcall(sound.facts, sound))
 * os.remove(path)
 */
static int sound_close(lua_State *L) {
  handle *h = luaL_checkudata(L, 1, CLASS);
  lbr_sound *sound = h->sound;
  h->sound = NULL;
  lbr_sound_close(sound);
  return 0;
}

static void close_context(void *context) { lbr_sound_close(context); }

/***
 * Turns the open file into a feed of its codes; the file itself is then
 * closed, and lives on in the feed.
 * @return feed: methods channels, samples, read, codes, scale, close
 * @usage
 * local path, x = os.tmpname(), core.samples.from { 1, -2, 3 }
 * local spec = { rate = 8000, bits = 16, integer = true, scale = 1 }
 * assert(core.store.write(path, spec, { x }))
 * local feed <close> = core.store.open(path):feed()
 * assert(feed:read(2, 1)[1][1] == -2)
 * os.remove(path)
 */
static int sound_feed(lua_State *L) {
  handle *h = check_open(L);
  lbr_feed_handle *f = lbr_push_feed(L);
  lua_getiuservalue(L, 1, 1);
  lua_setiuservalue(L, -2, 1);
  f->feed = lbr_sound_feed(h->sound);
  f->close = close_context;
  h->sound = NULL;
  return 1;
}

static int sound_text(lua_State *L) {
  const handle *h = luaL_checkudata(L, 1, CLASS);
  lua_pushfstring(L, "sound file %s%s", path_of(L),
                  h->sound ? "" : " (closed)");
  return 1;
}

static const luaL_Reg methods[] = {
    {"facts", sound_facts}, {"read", sound_read},   {"seek", sound_seek},
    {"feed", sound_feed},   {"close", sound_close}, {NULL, NULL},
};

static const luaL_Reg meta[] = {
    {"__gc", sound_close},
    {"__close", sound_close},
    {"__tostring", sound_text},
    {NULL, NULL},
};

/***
 * Opens a sound file for reading: WAV, RF64, Wave64, FLAC or Ogg Vorbis.
 * A file that is missing, unreadable, not regular, no sound file, or that does
 * not hold what its headers claim is refused.
 * @param path string: the file
 * @return userdata: the file, with methods facts, read, seek, close; closes
 *   itself when collected; or nil, message, code ("io", "format")
 * @usage
 * local sound, message, code = core.store.open "no such file.wav"
 * assert(not sound and code == "io" and message:find "no such file.wav")
 */
static int store_open(lua_State *L) {
  const char *path = lbr_check_path(L, 1);
  lbr_why why;
  handle *h = lua_newuserdatauv(L, sizeof *h, 1);
  h->sound = NULL;
  lbr_set_class(L, CLASS, methods, meta);
  lua_pushvalue(L, 1);
  lua_setiuservalue(L, -2, 1);
  lbr_status status = lbr_sound_open(path, &h->sound, &h->facts, &why);
  return status == LBR_OK ? 1 : lbr_refuse_file(L, status, path, &why);
}

static const luaL_Reg functions[] = {{"open", store_open}, {NULL, NULL}};

void lbr_add_sounds(lua_State *L) { luaL_setfuncs(L, functions, 0); }
