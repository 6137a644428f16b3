#include <limits.h>
#include <math.h>
#include <string.h>

#include "base/hash.h"
#include "bind/bind.h"
#include "bind/samples.h"
#include "samples/rails.h"
#include "store/sound.h"
#include "store/write.h"

#define CLASS "libration.sound"

/* The handle; made empty first, so that an error cannot lose the file. */
typedef struct handle {
  lbr_sound *sound; /* NULL: closed */
  lbr_sound_facts facts;
} handle;

/* nil, "path: why", code. */
static int refuse(lua_State *L, lbr_status status, const char *path,
                  const lbr_why *why) {
  lua_pushnil(L);
  lua_pushfstring(L, "%s: %s", path, why->text);
  lua_pushstring(L, lbr_status_code(status));
  return 3;
}

static const char *check_path(lua_State *L, int arg) {
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

/***
 * The next frames of some channels, in the codes that are stored.
 * @param count integer: frames, 1 or more, no more than are left
 * @param channels table: channel numbers from 1; nil takes all
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
  lua_createtable(L, (int)wanted, 0);
  for (size_t k = 0; k < wanted; k++) {
    out[k] = lbr_push_samples(L, count);
    lua_seti(L, -2, (lua_Integer)k + 1);
  }
  lbr_status status = lbr_sound_read(h->sound, count, wanted, channel, out,
                                     &why);
  if (status != LBR_OK) return refuse(L, status, path_of(L), &why);
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
  if (status != LBR_OK) return refuse(L, status, path_of(L), &why);
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

static int sound_text(lua_State *L) {
  const handle *h = luaL_checkudata(L, 1, CLASS);
  lua_pushfstring(L, "sound file %s%s", path_of(L),
                  h->sound ? "" : " (closed)");
  return 1;
}

static const luaL_Reg methods[] = {
    {"facts", sound_facts}, {"read", sound_read},   {"seek", sound_seek},
    {"close", sound_close}, {NULL, NULL},
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
  const char *path = check_path(L, 1);
  lbr_why why;
  handle *h = lua_newuserdatauv(L, sizeof *h, 1);
  h->sound = NULL;
  lbr_set_class(L, CLASS, methods, meta);
  lua_pushvalue(L, 1);
  lua_setiuservalue(L, -2, 1);
  lbr_status status = lbr_sound_open(path, &h->sound, &h->facts, &why);
  return status == LBR_OK ? 1 : refuse(L, status, path, &why);
}

static lua_Number number_field(lua_State *L, int arg, const char *field,
                               lua_Number least, lua_Number most) {
  int is_number;
  lua_getfield(L, arg, field);
  lua_Number value = lua_tonumberx(L, -1, &is_number);
  if (!is_number || !(value >= least && value <= most))
    luaL_argerror(L, arg, lua_pushfstring(L, "%s is %s; it must be a number "
                                          "from %f to %f", field,
                                          luaL_tolstring(L, -1, NULL), least,
                                          most));
  lua_pop(L, 1);
  return value;
}

static void check_spec(lua_State *L, int arg, lbr_write_spec *spec) {
  luaL_checktype(L, arg, LUA_TTABLE);
  double rate = number_field(L, arg, "rate", 1, INT_MAX);
  double bits = number_field(L, arg, "bits", 8, 64);
  luaL_argcheck(L, rate == floor(rate) && bits == floor(bits), arg,
                "rate and bits must be whole numbers");
  spec->rate = (int)rate;
  spec->bits = (int)bits;
  spec->scale = number_field(L, arg, "scale", -HUGE_VAL, HUGE_VAL);
  lua_getfield(L, arg, "integer");
  spec->is_integer = lua_toboolean(L, -1);
  lua_pop(L, 1);
}

/* The list of blocks at `arg`; they stay reachable through it. */
static size_t check_blocks(lua_State *L, int arg, const double **channel,
                           size_t *frames) {
  luaL_checktype(L, arg, LUA_TTABLE);
  lua_Integer count = luaL_len(L, arg);
  luaL_argcheck(L, count >= 1 && count <= LBR_SOUND_MOST_CHANNELS, arg,
                "a list of 1 to 256 channels of samples");
  for (lua_Integer k = 0; k < count; k++) {
    size_t n;
    lua_geti(L, arg, k + 1);
    channel[k] = lbr_check_samples(L, lua_gettop(L), &n);
    luaL_argcheck(L, k == 0 || n == *frames, arg,
                  "all channels must have the same number of samples");
    *frames = n;
    lua_pop(L, 1);
  }
  return (size_t)count;
}

/***
 * Writes a WAV file (RF64 beyond 4 GiB), whole or not at all.
 * The file appears under its name only when it is complete and on the disk.
 * Nothing is clipped: a sample beyond full scale is a refusal.
 * @param path string: the file; an existing file is replaced
 * @param spec table: rate (whole samples per second), bits (8, 16, 24, 32;
 *   floats 32, 64), integer (true: integer codes), scale (what is stored is
 *   sample * scale, integers rounded to the nearest)
 * @param channels table: one block of samples per channel, of equal length
 * @return boolean: true; or nil, message, code ("io", "domain")
 * @usage
 * local path, x = os.tmpname(), core.samples.from { 1, -2, 3 }
 * local spec = { rate = 8000, bits = 16, integer = true, scale = 1 }
 * assert(core.store.write(path, spec, { x }))
 * local done, message, code = core.store.write("/none/x.wav", spec, { x })
 * assert(not done and code == "io")
 * os.remove(path)
 */
static int store_write(lua_State *L) {
  const char *path = check_path(L, 1);
  const double *channel[LBR_SOUND_MOST_CHANNELS];
  lbr_write_spec spec;
  lbr_why why;
  size_t frames = 0;
  check_spec(L, 2, &spec);
  spec.channels = check_blocks(L, 3, channel, &frames);
  lbr_status status = lbr_sound_write(path, &spec, frames, channel, &why);
  if (status != LBR_OK) return refuse(L, status, path, &why);
  lua_pushboolean(L, 1);
  return 1;
}

static void set_count(lua_State *L, const char *field, size_t value) {
  lua_pushinteger(L, (lua_Integer)value);
  lua_setfield(L, -2, field);
}

/***
 * Counts samples at the rails of their converter.
 * @param samples samples: a block
 * @param low number: the low rail, in the unit of the samples
 * @param high number: the high rail
 * @return table: low, high (samples at or beyond each rail), low_run, high_run
 *   (longest run), first (index from 1 of the first, or nil), least, most
 *   (range of the finite samples), bad (samples that are not finite)
 * @usage
 * local x = core.samples.from { 5, 5, 1, -5 }
 * local rails = core.store.rails(x, -5, 5)
 * assert(rails.high == 2 and rails.high_run == 2 and rails.low == 1)
 */
static int store_rails(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  lbr_rails r;
  lbr_rails_scan(x, n, luaL_checknumber(L, 2), luaL_checknumber(L, 3), &r);
  lua_createtable(L, 0, 8);
  set_count(L, "low", r.low);
  set_count(L, "high", r.high);
  set_count(L, "low_run", r.low_run);
  set_count(L, "high_run", r.high_run);
  set_count(L, "bad", r.bad);
  if (r.first < n) set_count(L, "first", r.first + 1);
  lua_pushnumber(L, r.least);
  lua_setfield(L, -2, "least");
  lua_pushnumber(L, r.most);
  lua_setfield(L, -2, "most");
  return 1;
}

/***
 * SHA-256 of a block's samples, as doubles in this machine's byte order.
 * @param samples samples: a block
 * @return string: 64 hexadecimal digits
 * @usage
 * local x = core.samples.from { 1, 2 }
 * assert(#core.store.digest(x) == 64)
 */
static int store_digest(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  char text[LBR_HASH_TEXT];
  lbr_sha256_text(x, n * sizeof *x, text);
  lua_pushstring(L, text);
  return 1;
}

/***
 * Codes as values of a unit: every sample times a factor, in a new block.
 * @param samples samples: a block of codes
 * @param factor number: unit per code
 * @return samples: a block of the same length
 * @usage
 * local x = core.samples.from { 1, -2 }
 * assert(core.store.rails(core.store.in_unit(x, 10), -20, 20).low == 1)
 */
static int store_in_unit(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  double factor = luaL_checknumber(L, 2);
  double *y = lbr_push_samples(L, n);
  for (size_t i = 0; i < n; i++) y[i] = x[i] * factor;
  return 1;
}

static const luaL_Reg functions[] = {
    {"in_unit", store_in_unit},
    {"open", store_open},     {"write", store_write}, {"rails", store_rails},
    {"digest", store_digest}, {NULL, NULL},
};

int lbr_open_store(lua_State *L) {
  luaL_newlib(L, functions);
  return 1;
}
