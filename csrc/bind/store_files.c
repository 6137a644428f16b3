#include "bind/store_files.h"

#include <unistd.h>

#include "bind/draft.h"
#include "bind/feed.h"
#include "bind/sound.h"
#include "store/columns.h"
#include "store/file.h"
#include "store/packed.h"
#include "store/rows.h"

static lua_Integer integer_field(lua_State *L, int arg, const char *field,
                                 lua_Integer least, lua_Integer most) {
  int whole;
  lua_getfield(L, arg, field);
  lua_Integer value = lua_tointegerx(L, -1, &whole);
  if (!whole || value < least || value > most)
    luaL_argerror(L, arg, lua_pushfstring(
        L, "%s is %s; it must be an integer from %I to %I", field,
        luaL_tolstring(L, -1, NULL), (LUAI_UACINT)least, (LUAI_UACINT)most));
  lua_pop(L, 1);
  return value;
}

/***
 * Bytes of a regular file, the first ones unless said.
 * @param path string: the file
 * @param count integer: how many at most, 1 .. 2^26
 * @param at integer: offset of the first, default 0
 * @return string: fewer where the file is shorter; or nil, message, code
 * @return integer: size of the file, bytes
 * @usage
 * local head, message, code = core.store.head("/none/x", 4)
 * assert(not head and code == "io" and message:find "/none/x")
 */
static int store_head(lua_State *L) {
  const char *path = lbr_check_path(L, 1);
  size_t count = lbr_check_count(L, 2, 1, (size_t)1 << 26);
  lbr_why why;
  int fd = -1;
  int64_t bytes = 0, at = luaL_optinteger(L, 3, 0);
  luaL_Buffer buffer;
  luaL_argcheck(L, at >= 0, 3, "an offset is 0 or more");
  lbr_status status = lbr_file_open(path, &fd, &bytes, &why);
  if (status != LBR_OK) return lbr_refuse_file(L, status, path, &why);
  close(fd); /* making room may raise */
  int64_t left = at < bytes ? bytes - at : 0;
  if ((uint64_t)left < count) count = (size_t)left;
  char *room = luaL_buffinitsize(L, &buffer, count ? count : 1);
  status = lbr_file_open(path, &fd, &bytes, &why);
  if (status != LBR_OK) return lbr_refuse_file(L, status, path, &why);
  status = lbr_file_read(fd, at, room, count);
  close(fd);
  if (status != LBR_OK) return lbr_refuse(L, status, path);
  luaL_pushresultsize(&buffer, count);
  lua_pushinteger(L, bytes);
  return 2;
}

/* A feed that keeps the path, argument 1, for its messages. */
static lbr_feed_handle *push_feed_of_path(lua_State *L) {
  lbr_feed_handle *h = lbr_push_feed(L);
  lua_pushvalue(L, 1);
  lua_setiuservalue(L, -2, 1);
  return h;
}

/* Arguments 2 and 3 of what reads a stated layout: the list of channels, whose
 * length is returned, and the samples of each. */
static lua_Integer check_layout(lua_State *L, int64_t *samples) {
  luaL_checktype(L, 2, LUA_TTABLE);
  lua_settop(L, 3);
  lua_Integer channels = luaL_len(L, 2);
  luaL_argcheck(L, channels >= 1 && channels <= LBR_PACKED_MOST_CHANNELS, 2,
                "a list of 1 to 65536 channels");
  *samples = (int64_t)lbr_check_count(L, 3, 0, INT64_MAX / 2);
  return channels;
}

static void close_rows(void *context) { lbr_rows_close(context); }

/***
 * Opens a text file of rows of numbers as a feed.
 * Reads in bounded memory, to the last bit, in any locale.
 * @param path string: the file
 * @param spec table: at (byte offset of the first row), line (its number, for
 *   messages), columns, separator (",", ";" or "\t")
 * @return feed: one channel per column; or nil, message, code
 * @usage
 * local path = os.tmpname()
 * local file = io.open(path, "w")
 * file:write("a,b\n1,2.5\n3,-4e-1\n")
 * file:close()
 * local spec = { at = 4, line = 2, columns = 2, separator = "," }
 * local feed <close> = core.store.rows(path, spec)
 * assert(feed:samples() == 2 and feed:read(1, 2)[2][2] == -0.4)
 * os.remove(path)
 */
static int store_rows(lua_State *L) {
  const char *path = lbr_check_path(L, 1);
  luaL_checktype(L, 2, LUA_TTABLE);
  lbr_rows_spec spec;
  lbr_why why;
  size_t n;
  spec.data_at = integer_field(L, 2, "at", 0, INT64_MAX / 2);
  spec.first_line = integer_field(L, 2, "line", 1, INT64_MAX / 2);
  spec.columns = (size_t)integer_field(L, 2, "columns", 1,
                                       LBR_ROWS_MOST_COLUMNS);
  lua_getfield(L, 2, "separator");
  const char *separator = luaL_checklstring(L, -1, &n);
  luaL_argcheck(L, n == 1, 2, "separator must be one character");
  spec.separator = *separator;
  lbr_feed_handle *h = push_feed_of_path(L);
  lbr_rows *rows;
  int64_t count;
  lbr_status status = lbr_rows_open(path, &spec, &rows, &count, &why);
  if (status != LBR_OK) return lbr_refuse_file(L, status, path, &why);
  h->feed = lbr_rows_feed(rows);
  h->close = close_rows;
  return 1;
}

static void close_packed(void *context) { lbr_packed_close(context); }

/***
 * Opens a file of packed samples as a feed.
 * @param path string: the file
 * @param channels table: for each channel at (byte offset of its first sample),
 *   step (bytes from sample to sample), bits, integer, unsigned, big (the byte
 *   of most weight first), zero (taken off unsigned codes)
 * @param samples integer: of every channel
 * @return feed: the stored codes; or nil, message, code ("format": the file
 *   is shorter than that)
 * @usage
 * local path = os.tmpname()
 * local file = io.open(path, "wb")
 * file:write(string.pack(">i2i2i2i2", 1, -2, 3, -4))
 * file:close()
 * local function at(n)
 *   return { at = n, step = 4, bits = 16, integer = true, big = true }
 * end
 * local feed <close> = core.store.packed(path, { at(0), at(2) }, 2)
 * assert(feed:read(2, 1)[2][1] == -4)
 * os.remove(path)
 */
static int store_packed(lua_State *L) {
  const char *path = lbr_check_path(L, 1);
  int64_t samples;
  lua_Integer channels = check_layout(L, &samples);
  lbr_packed_channel *list = lua_newuserdatauv(
      L, (size_t)channels * sizeof *list, 0);
  for (lua_Integer k = 0; k < channels; k++) {
    lua_geti(L, 2, k + 1);
    int at = lua_gettop(L);
    lbr_check_coding(L, at, &list[k].coding);
    list[k].at = integer_field(L, at, "at", 0, INT64_MAX / 2);
    list[k].step = (size_t)integer_field(L, at, "step", 1, 65536);
    lua_pop(L, 1);
  }
  lbr_feed_handle *h = push_feed_of_path(L);
  lbr_packed *packed;
  lbr_why why;
  lbr_status status = lbr_packed_open(path, list, (size_t)channels, samples,
                                      &packed, &why);
  if (status != LBR_OK) return lbr_refuse_file(L, status, path, &why);
  h->feed = lbr_packed_feed(packed);
  h->close = close_packed;
  return 1;
}

static void close_columns(void *context) { lbr_columns_close(context); }

/***
 * Opens a text file with numbers in columns of fixed width as a feed.
 * @param path string: the file
 * @param channels table: for each channel at (byte offset of its first line),
 *   width (characters of a number), per_line (numbers in a line), line (bytes
 *   from line to line)
 * @param samples integer: of every channel
 * @return feed: the numbers; or nil, message, code
 * @usage
 * local path = os.tmpname()
 * local file = io.open(path, "w")
 * file:write("  1.5E+00 -2.5E-01\n  3.0E+00\n")
 * file:close()
 * local channel = { at = 0, width = 9, per_line = 2, line = 19 }
 * local feed <close> = core.store.columns(path, { channel }, 3)
 * assert(feed:read(2, 2)[1][1] == -0.25 and feed:read(3, 1)[1][1] == 3)
 * os.remove(path)
 */
static int store_columns(lua_State *L) {
  const char *path = lbr_check_path(L, 1);
  int64_t samples;
  lua_Integer channels = check_layout(L, &samples);
  lbr_columns_channel *list = lua_newuserdatauv(
      L, (size_t)channels * sizeof *list, 0);
  for (lua_Integer k = 0; k < channels; k++) {
    lua_geti(L, 2, k + 1);
    int at = lua_gettop(L);
    list[k].at = integer_field(L, at, "at", 0, INT64_MAX / 2);
    list[k].width = (size_t)integer_field(L, at, "width", 1, 64);
    list[k].per_line = (size_t)integer_field(L, at, "per_line", 1, 1024);
    list[k].line = (size_t)integer_field(L, at, "line", 1, 1024);
    lua_pop(L, 1);
  }
  lbr_feed_handle *h = push_feed_of_path(L);
  lbr_columns *columns;
  lbr_why why;
  lbr_status status = lbr_columns_open(path, list, (size_t)channels, samples,
                                       &columns, &why);
  if (status != LBR_OK) return lbr_refuse_file(L, status, path, &why);
  h->feed = lbr_columns_feed(columns);
  h->close = close_columns;
  return 1;
}

static const luaL_Reg functions[] = {
    {"columns", store_columns},
    {"head", store_head},
    {"rows", store_rows},
    {"packed", store_packed},
    {NULL, NULL}};

void lbr_add_files(lua_State *L) { luaL_setfuncs(L, functions, 0); }
