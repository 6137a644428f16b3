#define _GNU_SOURCE /* madvise */
#include "bind/samples.h"

#include <stdint.h>
#include <string.h>
#include <sys/mman.h>
#include <unistd.h>

#define ALIGNMENT 64
#define HUGE_PAGE ((size_t)2 << 20)
#define MOST_SAMPLES (SIZE_MAX / 16)

/* Memory beyond what the machine has is refused before anything asks for it:
 * a system that promises more than it has would end the process later. */
static void check_bytes(lua_State *L, size_t n, size_t size, const char *what) {
  long pages = sysconf(_SC_PHYS_PAGES), page = sysconf(_SC_PAGESIZE);
  size_t most = pages > 0 && page > 0 ? (size_t)pages * (size_t)page
                                      : SIZE_MAX / 4;
  if (n > most / size) lbr_raise(L, LBR_NO_MEMORY, what);
}

static void *align(void *block) {
  uintptr_t address = (uintptr_t)block + ALIGNMENT - 1;
  return (void *)(address & ~(uintptr_t)(ALIGNMENT - 1));
}

/* Large blocks on large pages: first writes cost a tenth.  Only a hint. */
static void advise(void *data, size_t bytes) {
  uintptr_t from = ((uintptr_t)data + HUGE_PAGE - 1) & ~(HUGE_PAGE - 1);
  uintptr_t to = ((uintptr_t)data + bytes) & ~(HUGE_PAGE - 1);
  if (to > from) (void)madvise((void *)from, to - from, MADV_HUGEPAGE);
}

double *lbr_push_unset_samples(lua_State *L, size_t n) {
  check_bytes(L, n, sizeof(double), "samples");
  lbr_view *view = lua_newuserdatauv(L, sizeof *view, 1);
  *view = (lbr_view){NULL, 0};
  size_t bytes = n * sizeof(double);
  view->data = align(lua_newuserdatauv(L, bytes + ALIGNMENT, 0));
  view->n = n;
  if (bytes >= 2 * HUGE_PAGE) advise(view->data, bytes);
  lua_setiuservalue(L, -2, 1);
  luaL_setmetatable(L, LBR_SAMPLES_CLASS);
  return view->data;
}

double *lbr_push_samples(lua_State *L, size_t n) {
  double *data = lbr_push_unset_samples(L, n);
  memset(data, 0, n * sizeof *data);
  return data;
}

double *lbr_check_writable_samples(lua_State *L, int arg, size_t *n) {
  const lbr_view *view = luaL_checkudata(L, arg, LBR_SAMPLES_CLASS);
  *n = view->n;
  return view->data;
}

const double *lbr_check_samples(lua_State *L, int arg, size_t *n) {
  return lbr_check_writable_samples(L, arg, n);
}

static size_t check_end(lua_State *L, int arg, lua_Integer absent, size_t n) {
  lua_Integer at = luaL_optinteger(L, arg, absent), count = (lua_Integer)n;
  lua_Integer place = at < 0 ? at + count + 1 : at;
  if (place < 0 || place > count + 1)
    luaL_argerror(L, arg, lua_pushfstring(L, "%I is outside 1 .. %I", at,
                                          (LUAI_UACINT)count));
  return (size_t)place;
}

void lbr_check_range(lua_State *L, int first, int last, size_t n, size_t *from,
                     size_t *count) {
  size_t a = check_end(L, first, 1, n);
  size_t b = check_end(L, last, (lua_Integer)n, n);
  luaL_argcheck(L, a >= 1, first, "0 is no index; the first sample is 1");
  luaL_argcheck(L, b <= n, last, "the range ends behind the last sample");
  luaL_argcheck(L, b + 1 >= a, last, "the range ends before it begins");
  *from = a - 1;
  *count = b + 1 - a;
}

/***
 * Makes a block of samples that are all 0.
 * @param n integer: how many, 0 or more
 * @return samples: the new block
 * @usage
 * local x = core.samples.new(3)
 * assert(#x == 3 and x[3] == 0)
 */
static int samples_new(lua_State *L) {
  lbr_push_samples(L, lbr_check_count(L, 1, 0, MOST_SAMPLES));
  return 1;
}

/***
 * Makes samples from a list of numbers.
 * @param list table: numbers, without gaps
 * @return samples: as many as the list has items; raises where an item is no
 *   number
 * @usage
 * local x = core.samples.from { 1, 2.5, -3 }
 * assert(#x == 3 and x[2] == 2.5)
 */
static int samples_from(lua_State *L) {
  luaL_checktype(L, 1, LUA_TTABLE);
  size_t n = lua_rawlen(L, 1);
  double *x = lbr_push_samples(L, n);
  for (size_t i = 0; i < n; i++) {
    int kind = lua_rawgeti(L, 1, (lua_Integer)i + 1);
    if (kind != LUA_TNUMBER)
      return luaL_argerror(L, 1, lua_pushfstring(
          L, "item %I is a %s, not a number", (LUAI_UACINT)(i + 1),
          luaL_typename(L, -1)));
    x[i] = lua_tonumber(L, -1);
    lua_pop(L, 1);
  }
  return 1;
}

/***
 * Makes samples from bytes: little-endian doubles, as pack writes them.
 * @param bytes string: 8 bytes a sample
 * @return samples: the samples; raises where the length is no multiple of 8
 * @usage
 * local x = core.samples.unpack(string.pack("<d<d", 0.1, -2))
 * assert(#x == 2 and x[1] == 0.1)
 */
static int samples_unpack(lua_State *L) {
  size_t bytes;
  const char *p = luaL_checklstring(L, 1, &bytes);
  luaL_argcheck(L, bytes % sizeof(double) == 0, 1,
                "the length is not a multiple of 8 bytes");
  memcpy(lbr_push_unset_samples(L, bytes / sizeof(double)), p, bytes);
  return 1;
}

/***
 * Tells whether a value is samples.
 * @param value any: what is in question
 * @return boolean: true for samples
 * @usage
 * assert(core.samples.is(core.samples.new(1)) and not core.samples.is(1))
 */
static int samples_is(lua_State *L) {
  luaL_checkany(L, 1);
  lua_pushboolean(L, luaL_testudata(L, 1, LBR_SAMPLES_CLASS) != NULL);
  return 1;
}

/***
 * A view of a part, made in no time: both share the memory.
 * @param first integer: index of its first sample, default 1; negative ones
 *   count from the end
 * @param last integer: index of its last sample, default the last; first - 1
 *   gives an empty view
 * @return samples: the view; raises where an end is outside
 * @usage
 * local x = core.samples.from { 1, 2, 3, 4 }
 * local y = x:slice(2, -2)
 * y[1] = 20
 * assert(#y == 2 and x[2] == 20)
 */
static int samples_slice(lua_State *L) {
  size_t n, from, count;
  double *x = lbr_check_writable_samples(L, 1, &n);
  lbr_check_range(L, 2, 3, n, &from, &count);
  lbr_view *part = lua_newuserdatauv(L, sizeof *part, 1);
  *part = (lbr_view){x + from, count};
  lua_getiuservalue(L, 1, 1);
  lua_setiuservalue(L, -2, 1);
  luaL_setmetatable(L, LBR_SAMPLES_CLASS);
  return 1;
}

/***
 * Copies samples into a block of their own.
 * @return samples: the copy
 * @usage
 * local x = core.samples.from { 1, 2 }
 * local y = x:copy()
 * y[1] = 7
 * assert(x[1] == 1)
 */
static int samples_copy(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  memcpy(lbr_push_unset_samples(L, n), x, n * sizeof *x);
  return 1;
}

/***
 * Writes one value, or other samples, into all samples.
 * @param value number or samples: samples must be as many
 * @return samples: these samples
 * @usage
 * assert(core.samples.new(4):fill(2.5):sum() == 10)
 */
static int samples_fill(lua_State *L) {
  size_t n, m;
  double *x = lbr_check_writable_samples(L, 1, &n);
  if (lua_type(L, 2) == LUA_TUSERDATA) {
    const double *y = lbr_check_samples(L, 2, &m);
    luaL_argcheck(L, m == n, 2, "not as many samples");
    memmove(x, y, n * sizeof *x);
  } else {
    double value = luaL_checknumber(L, 2);
    for (size_t i = 0; i < n; i++) x[i] = value;
  }
  lua_settop(L, 1);
  return 1;
}

/***
 * The samples as a list of numbers.
 * @param first integer: index of the first sample wanted, default 1
 * @param last integer: index of the last sample wanted, default the last
 * @return table: list of numbers
 * @usage
 * local list = core.samples.from { 1, 2, 3 }:totable(2)
 * assert(#list == 2 and list[2] == 3)
 */
static int samples_totable(lua_State *L) {
  size_t n, from, count;
  const double *x = lbr_check_samples(L, 1, &n);
  lbr_check_range(L, 2, 3, n, &from, &count);
  lua_createtable(L, count > INT32_MAX ? 0 : (int)count, 0);
  for (size_t i = 0; i < count; i++) {
    lua_pushnumber(L, x[from + i]);
    lua_rawseti(L, -2, (lua_Integer)i + 1);
  }
  return 1;
}

/***
 * The samples as bytes: little-endian doubles.
 * @return string: 8 bytes a sample
 * @usage
 * assert(core.samples.from { 0.1 }:pack() == string.pack("<d", 0.1))
 */
static int samples_pack(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  lua_pushlstring(L, (const char *)x, n * sizeof *x);
  return 1;
}

static int samples_length(lua_State *L) {
  size_t n;
  lbr_check_samples(L, 1, &n);
  lua_pushinteger(L, (lua_Integer)n);
  return 1;
}

/* Place of index `at` counted from 0, or n when there is none. */
static size_t place_of(lua_Integer at, size_t n) {
  lua_Integer count = (lua_Integer)n;
  if (at < 0) at += count + 1;
  return at >= 1 && at <= count ? (size_t)at - 1 : n;
}

/* x[i], nil outside; other keys are methods (upvalue 1). */
static int samples_index(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  int whole;
  lua_Integer at = lua_tointegerx(L, 2, &whole);
  if (lua_type(L, 2) == LUA_TNUMBER && whole) {
    size_t place = place_of(at, n);
    if (place == n) return 0;
    lua_pushnumber(L, x[place]);
    return 1;
  }
  lua_settop(L, 2);
  lua_rawget(L, lua_upvalueindex(1));
  return 1;
}

static int samples_set(lua_State *L) {
  size_t n;
  double *x = lbr_check_writable_samples(L, 1, &n);
  lua_Integer at = luaL_checkinteger(L, 2);
  size_t place = place_of(at, n);
  if (place == n)
    return luaL_argerror(L, 2, lua_pushfstring(L, "%I is outside 1 .. %I", at,
                                               (LUAI_UACINT)n));
  x[place] = luaL_checknumber(L, 3);
  return 0;
}

static const luaL_Reg functions[] = {{"new", samples_new},
                                     {"from", samples_from},
                                     {"unpack", samples_unpack},
                                     {"is", samples_is},
                                     {NULL, NULL}};

static const luaL_Reg methods[] = {{"slice", samples_slice},
                                   {"copy", samples_copy},
                                   {"fill", samples_fill},
                                   {"totable", samples_totable},
                                   {"pack", samples_pack},
                                   {NULL, NULL}};

static const luaL_Reg meta[] = {
    {"__len", samples_length},
    {"__newindex", samples_set},
    {NULL, NULL}};

static void make_class(lua_State *L) {
  luaL_newmetatable(L, LBR_SAMPLES_CLASS);
  luaL_setfuncs(L, meta, 0);
  luaL_setfuncs(L, lbr_samples_math_meta, 0);
  luaL_setfuncs(L, lbr_samples_shape_meta, 0);
  lua_newtable(L);
  luaL_setfuncs(L, methods, 0);
  luaL_setfuncs(L, lbr_samples_math_methods, 0);
  luaL_setfuncs(L, lbr_samples_stats_methods, 0);
  luaL_setfuncs(L, lbr_samples_shape_methods, 0);
  luaL_setfuncs(L, lbr_samples_angle_methods, 0);
  luaL_setfuncs(L, lbr_samples_calculus_methods, 0);
  lua_pushcclosure(L, samples_index, 1);
  lua_setfield(L, -2, "__index");
  lua_pushliteral(L, LBR_SAMPLES_CLASS);
  lua_setfield(L, -2, "__metatable");
  lua_pop(L, 1);
}

int lbr_open_samples(lua_State *L) {
  make_class(L);
  luaL_newlib(L, functions);
  luaL_setfuncs(L, lbr_samples_shape_functions, 0);
  lbr_open_raw(L);
  return 1;
}
