#include <limits.h>
#include <math.h>

#include "base/hash.h"
#include "bind/bind.h"
#include "bind/draft.h"
#include "bind/feed.h"
#include "bind/samples.h"
#include "bind/sound.h"
#include "bind/store_files.h"
#include "samples/rails.h"
#include "store/sound.h"
#include "store/write.h"

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
  lua_getfield(L, arg, "flac");
  spec->is_flac = lua_toboolean(L, -1);
  lua_pop(L, 2);
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
 * Writes a WAV file (RF64 beyond 4 GiB) or FLAC, whole or not at all.
 * The file appears under its name only when it is complete and on the disk.
 * Nothing is clipped: a sample beyond full scale is a refusal.
 * @param path string: the file; an existing file is replaced
 * @param spec table: rate (whole samples per second), bits (8, 16, 24, 32;
 *   floats 32, 64), integer (true: integer codes), scale (what is stored is
 *   sample * scale, integers rounded to the nearest), flac (true: FLAC,
 *   integers of 8, 16, 24 bits)
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
  const char *path = lbr_check_path(L, 1);
  const double *channel[LBR_SOUND_MOST_CHANNELS];
  lbr_write_spec spec;
  lbr_why why;
  size_t frames = 0;
  check_spec(L, 2, &spec);
  spec.channels = check_blocks(L, 3, channel, &frames);
  lbr_status status = lbr_sound_write(path, &spec, frames, channel, &why);
  if (status != LBR_OK) return lbr_refuse_file(L, status, path, &why);
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

static const luaL_Reg functions[] = {
    {"write", store_write},
    {"rails", store_rails},
    {"digest", store_digest},
    {NULL, NULL},
};

int lbr_open_store(lua_State *L) {
  luaL_newlib(L, functions);
  lbr_add_sounds(L);
  lbr_add_feeds(L);
  lbr_add_drafts(L);
  lbr_add_files(L);
  return 1;
}
