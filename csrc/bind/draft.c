#include "bind/draft.h"

#include <math.h>
#include <string.h>

#include "bind/samples.h"
#include "bind/sound.h"
#include "store/draft.h"
#include "store/encode.h"
#include "store/sound.h"

#define CLASS "libration.draft"
#define MOST_COLUMNS 4096

typedef struct handle {
  lbr_draft *draft; /* NULL: finished or dropped */
} handle;

static lbr_draft *check_draft(lua_State *L) {
  handle *h = luaL_checkudata(L, 1, CLASS);
  luaL_argcheck(L, h->draft, 1, "the draft is closed");
  return h->draft;
}

/* The draft itself for success, so that calls can follow one another. */
static int answer(lua_State *L, lbr_status status, const lbr_why *why) {
  if (status == LBR_OK) {
    lua_pushvalue(L, 1);
    return 1;
  }
  lua_getiuservalue(L, 1, 1);
  return lbr_refuse_file(L, status, lua_tostring(L, -1), why);
}

/***
 * Appends bytes to the draft.
 * @param bytes string: any
 * @return draft: itself; or nil, message, code
 * @usage
 * local path = os.tmpname()
 * local draft <close> = core.store.draft(path)
 * assert(draft:put "one\n" and draft:finish())
 * assert(io.open(path):read "a" == "one\n")
 * os.remove(path)
 */
static int draft_put(lua_State *L) {
  lbr_draft *d = check_draft(L);
  size_t n;
  lbr_why why;
  const char *bytes = luaL_checklstring(L, 2, &n);
  return answer(L, lbr_draft_put(d, bytes, n, &why), &why);
}

/* The blocks of the list at `arg`: their pointers, in memory of the state that
 * stays on the stack. */
static const double **check_blocks(lua_State *L, int arg, size_t *columns,
                                   size_t *rows) {
  luaL_checktype(L, arg, LUA_TTABLE);
  size_t n = (size_t)luaL_len(L, arg);
  luaL_argcheck(L, n >= 1 && n <= MOST_COLUMNS, arg,
                "a list of 1 to 4096 blocks of samples");
  const double **out = lua_newuserdatauv(L, n * sizeof *out, 0);
  for (size_t k = 0; k < n; k++) {
    size_t count;
    lua_geti(L, arg, (lua_Integer)k + 1);
    out[k] = lbr_check_samples(L, -1, &count);
    luaL_argcheck(L, k == 0 || count == *rows, arg,
                  "all blocks must have the same number of samples");
    *rows = count;
    lua_pop(L, 1);
  }
  *columns = n;
  return out;
}

/***
 * Appends rows of numbers, as the shortest text that reads back.
 * @param blocks table: one block of samples per column
 * @param separator string: one character between columns
 * @param first integer: number of the first row, from 0, for its time
 * @param over integer: numerator of the rate, S/s; nil writes no times
 * @param under integer: denominator of the rate; a first column then holds
 *   (first + i) * under / over, s
 * @return draft: itself; or nil, message, code
 * @usage
 * local path = os.tmpname()
 * local draft <close> = core.store.draft(path)
 * assert(draft:rows({ core.samples.from { 0.1, 2 } }, ",", 0, 4, 1))
 * assert(draft:finish() and io.open(path):read "a" == "0,0.1\n0.25,2\n")
 * os.remove(path)
 */
static int draft_rows(lua_State *L) {
  lbr_draft *d = check_draft(L);
  size_t n;
  lbr_why why;
  const char *separator = luaL_checklstring(L, 3, &n);
  luaL_argcheck(L, n == 1, 3, "one character");
  lbr_rows_out o = {.separator = *separator, .first = luaL_optinteger(L, 4, 0),
                    .rate_over = luaL_optinteger(L, 5, 0),
                    .rate_under = luaL_optinteger(L, 6, 1)};
  o.column = check_blocks(L, 2, &o.columns, &o.rows);
  return answer(L, lbr_draft_rows(d, &o, &why), &why);
}

/***
 * Appends numbers in columns of fixed width, with exponents.
 * @param samples samples: the numbers
 * @param width integer: characters of a column, 8 .. 60
 * @param digits integer: digits behind the point, 1 .. 17
 * @param per_line integer: columns in a line; the last line may be shorter
 * @return draft: itself; or nil, message, code ("domain": one does not fit)
 * @usage
 * local path = os.tmpname()
 * local draft <close> = core.store.draft(path)
 * assert(draft:columns(core.samples.from { 0.25 }, 13, 5, 6))
 * assert(draft:finish() and io.open(path):read "a" == "  2.50000E-01\n")
 * os.remove(path)
 */
static int draft_columns(lua_State *L) {
  lbr_draft *d = check_draft(L);
  size_t n;
  lbr_why why;
  const double *x = lbr_check_samples(L, 2, &n);
  int width = (int)lbr_check_count(L, 3, 8, 60);
  int digits = (int)lbr_check_count(L, 4, 1, 17);
  size_t per_line = lbr_check_count(L, 5, 1, 100);
  return answer(L, lbr_draft_columns(d, x, n, width, digits, per_line, &why),
                &why);
}

void lbr_check_coding(lua_State *L, int arg, lbr_coding *coding) {
  luaL_checktype(L, arg, LUA_TTABLE);
  lua_getfield(L, arg, "bits");
  coding->bits = (int)lua_tointeger(L, -1);
  lua_getfield(L, arg, "integer");
  coding->is_integer = lua_toboolean(L, -1);
  lua_getfield(L, arg, "unsigned");
  coding->is_unsigned = lua_toboolean(L, -1);
  lua_getfield(L, arg, "big");
  coding->is_big = lua_toboolean(L, -1);
  lua_getfield(L, arg, "zero");
  coding->zero = lua_tonumber(L, -1);
  lua_pop(L, 5);
  lbr_plain plain = {0, 0, 1, 8, *coding};
  luaL_argcheck(L, lbr_plain_can(&plain) && isfinite(coding->zero), arg,
                "integers have 8, 16, 24 or 32 bits, floats 32 or 64");
}

/***
 * Appends frames of packed samples; nothing is rounded to fit integers.
 * @param blocks table: one block of samples per channel
 * @param coding table: bits (integers 8, 16, 24, 32; floats 32, 64), integer,
 *   unsigned, big (the byte of most weight first)
 * @param scales table: what is stored is sample * scale; nil: 1
 * @return draft: itself; or nil, message, code ("domain": one does not fit)
 * @usage
 * local path = os.tmpname()
 * local draft <close> = core.store.draft(path)
 * local blocks = { core.samples.from { 1, -2 } }
 * assert(draft:frames(blocks, { bits = 16, integer = true, big = true }))
 * assert(draft:finish() and io.open(path):read "a" == "\0\1\255\254")
 * os.remove(path)
 */
static int draft_frames(lua_State *L) {
  lbr_draft *d = check_draft(L);
  size_t channels, frames;
  lbr_coding coding;
  lbr_why why;
  lua_settop(L, 4);
  lbr_check_coding(L, 3, &coding);
  const double **block = check_blocks(L, 2, &channels, &frames);
  double *scale = lua_newuserdatauv(L, channels * sizeof *scale, 0);
  for (size_t k = 0; k < channels; k++) {
    scale[k] = 1;
    if (lua_isnil(L, 4)) continue;
    lua_geti(L, 4, (lua_Integer)k + 1);
    scale[k] = luaL_checknumber(L, -1);
    lua_pop(L, 1);
  }
  return answer(L, lbr_draft_frames(d, &coding, block, scale, channels, frames,
                                    &why), &why);
}

/***
 * Flushes the draft to the disk and gives it its name.
 * @return boolean: true; or nil, message, code
 * @usage
 * local draft = core.store.draft "never.csv"
 * draft:close()
 * assert(not pcall(draft.finish, draft))
 */
static int draft_finish(lua_State *L) {
  lbr_draft *d = check_draft(L);
  lbr_why why;
  lbr_status status = lbr_draft_finish(d, &why);
  if (status != LBR_OK) return answer(L, status, &why);
  handle *h = lua_touserdata(L, 1);
  h->draft = NULL;
  lbr_draft_drop(d);
  lua_pushboolean(L, 1);
  return 1;
}

/***
 * The name of the temporary file, for a library that writes it by itself.
 * @return string: a path
 * @usage
 * local draft <close> = core.store.draft "x.csv"
 * assert(draft:name():find "%.part$")
 */
static int draft_name(lua_State *L) {
  lua_pushstring(L, lbr_draft_name(check_draft(L)));
  return 1;
}

/***
 * Drops a draft that is not finished; doing so again is allowed.
 * @usage
 * local draft = core.store.draft "never.csv"
 * draft:close()
 * assert(not io.open "never.csv")
 */
static int draft_close(lua_State *L) {
  handle *h = luaL_checkudata(L, 1, CLASS);
  lbr_draft *d = h->draft;
  h->draft = NULL;
  lbr_draft_drop(d);
  return 0;
}

static const luaL_Reg methods[] = {
    {"put", draft_put},       {"rows", draft_rows},
    {"columns", draft_columns}, {"frames", draft_frames},
    {"finish", draft_finish}, {"name", draft_name},
    {"close", draft_close},   {NULL, NULL},
};

static const luaL_Reg meta[] = {
    {"__gc", draft_close}, {"__close", draft_close}, {NULL, NULL}};

/***
 * Starts a file that will be there whole or not at all.
 * @param path string: the file; a regular file of that name is replaced
 * @return draft: methods put, rows, columns, frames, finish, close; or nil,
 *   message, code ("io")
 * @usage
 * local draft, message, code = core.store.draft "/none/x.csv"
 * assert(not draft and code == "io" and message:find "/none/x.csv")
 */
static int store_draft(lua_State *L) {
  const char *path = lbr_check_path(L, 1);
  lbr_why why;
  handle *h = lua_newuserdatauv(L, sizeof *h, 1);
  h->draft = NULL;
  lbr_set_class(L, CLASS, methods, meta);
  lua_pushvalue(L, 1);
  lua_setiuservalue(L, -2, 1);
  lbr_status status = lbr_draft_open(path, &h->draft, &why);
  return status == LBR_OK ? 1 : lbr_refuse_file(L, status, path, &why);
}

static const luaL_Reg functions[] = {{"draft", store_draft}, {NULL, NULL}};

void lbr_add_drafts(lua_State *L) { luaL_setfuncs(L, functions, 0); }
