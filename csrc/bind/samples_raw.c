/* Raw views: samples as stored, half or less of the memory of doubles.  The
 * memory is held by a block or by the Lua string that the samples came in.
 */
#include <math.h>
#include <string.h>

#include "bind/feed.h"
#include "bind/samples.h"
#include "samples/raw.h"

typedef struct raw_view {
  const unsigned char *data; /* first sample */
  size_t n;                  /* samples */
  lbr_raw_kind kind;
} raw_view;

/* Pushes an empty view whose user value is the value at the top, which it
 * replaces. */
static raw_view *push_view(lua_State *L) {
  raw_view *view = lua_newuserdatauv(L, sizeof *view, 1);
  *view = (raw_view){NULL, 0, LBR_RAW_INT16};
  lua_insert(L, -2);
  lua_setiuservalue(L, -2, 1);
  luaL_setmetatable(L, LBR_RAW_CLASS);
  return view;
}

static const raw_view *check_raw(lua_State *L) {
  return luaL_checkudata(L, 1, LBR_RAW_CLASS);
}

int lbr_test_raw(lua_State *L, int arg, lbr_raw_run *run) {
  const raw_view *view = luaL_testudata(L, arg, LBR_RAW_CLASS);
  if (view) *run = (lbr_raw_run){view->kind, view->data, view->n};
  return view != NULL;
}

/***
 * Makes a raw view of bytes, without copying them.
 * @param bytes string: samples, little-endian, tightly packed
 * @param kind string: "int16", "int24", "int32" or "float32"
 * @return raw: the view; raises where the length is no whole number of samples
 * @usage
 * local r = core.samples.raw(string.pack("<i2<i2", -32768, 100), "int16")
 * assert(#r == 2 and r[1] == -32768)
 */
static int samples_raw(lua_State *L) {
  size_t bytes;
  lbr_raw_kind kind;
  luaL_checktype(L, 1, LUA_TSTRING);
  const char *p = lua_tolstring(L, 1, &bytes);
  const char *name = luaL_checkstring(L, 2);
  if (lbr_raw_kind_of(name, &kind) != LBR_OK)
    return luaL_argerror(L, 2, lua_pushfstring(
        L, "\"%s\" is none of int16, int24, int32, float32", name));
  luaL_argcheck(L, bytes % lbr_raw_size(kind) == 0, 1,
                "the length is no whole number of samples");
  lua_pushvalue(L, 1);
  raw_view *view = push_view(L);
  *view = (raw_view){(const unsigned char *)p, bytes / lbr_raw_size(kind),
                     kind};
  return 1;
}

/***
 * A raw view of a part, made in no time.
 * @param first integer: index of its first sample, default 1; negative ones
 *   count from the end
 * @param last integer: index of its last sample, default the last
 * @return raw: the view
 * @usage
 * local r = core.samples.raw("\1\0\2\0\3\0", "int16")
 * assert(#r:slice(2) == 2 and r:slice(2)[1] == 2)
 */
static int raw_slice(lua_State *L) {
  size_t from, count;
  raw_view whole = *check_raw(L);
  lbr_check_range(L, 2, 3, whole.n, &from, &count);
  lua_getiuservalue(L, 1, 1);
  raw_view *part = push_view(L);
  *part = (raw_view){whole.data + from * lbr_raw_size(whole.kind), count,
                     whole.kind};
  return 1;
}

/***
 * The samples as doubles: code times scale.
 * @param scale number: unit per code (or per 1.0 of a float), default 1, which
 *   keeps the codes
 * @return samples: the values
 * @usage
 * local r = core.samples.raw(string.pack("<i2", 16384), "int16")
 * assert(r:tosamples(5 / 32768)[1] == 2.5)
 */
static int raw_tosamples(lua_State *L) {
  const raw_view *r = check_raw(L);
  double scale = luaL_optnumber(L, 2, 1);
  luaL_argcheck(L, isfinite(scale), 2, "the scale is not finite");
  double *out = lbr_push_unset_samples(L, r->n);
  lbr_raw_doubles(r->kind, r->data, r->n, scale, out);
  return 1;
}

/***
 * The kind of the stored samples.
 * @return string: "int16", "int24", "int32" or "float32"
 * @usage
 * assert(core.samples.raw("", "int24"):kind() == "int24")
 */
static int raw_kind(lua_State *L) {
  lua_pushstring(L, lbr_raw_name(check_raw(L)->kind));
  return 1;
}

/***
 * Counts how often every code occurs.
 * @param first integer: first code counted; default the lowest of int16
 * @param last integer: last code counted; default the highest of int16
 * @return samples: counts, [1] is that of the first code
 * @return integer: samples with a lower code
 * @return integer: samples with a higher code; raises for floats
 * @usage
 * local r = core.samples.raw(string.pack("<i2<i2<i2", 5, 5, -7), "int16")
 * local count, below = r:codes(0, 9)
 * assert(count[6] == 2 and below == 1)
 */
static int raw_codes(lua_State *L) {
  const raw_view *r = check_raw(L);
  return lbr_raw_codes(L, r->data, r->n, r->kind);
}

static int raw_length(lua_State *L) {
  lua_pushinteger(L, (lua_Integer)check_raw(L)->n);
  return 1;
}

/* r[i], nil outside; other keys are methods (upvalue 1). */
static int raw_index(lua_State *L) {
  const raw_view *r = check_raw(L);
  int whole;
  lua_Integer at = lua_tointegerx(L, 2, &whole), n = (lua_Integer)r->n;
  if (lua_type(L, 2) != LUA_TNUMBER || !whole) {
    lua_settop(L, 2);
    lua_rawget(L, lua_upvalueindex(1));
    return 1;
  }
  if (at < 0) at += n + 1;
  if (at < 1 || at > n) return 0;
  double value;
  size_t place = (size_t)(at - 1) * lbr_raw_size(r->kind);
  lbr_raw_doubles(r->kind, r->data + place, 1, 1, &value);
  lua_pushnumber(L, value);
  return 1;
}

static int raw_tostring(lua_State *L) {
  const raw_view *r = check_raw(L);
  lua_pushfstring(L, "%I raw samples, %s", (LUAI_UACINT)r->n,
                  lbr_raw_name(r->kind));
  return 1;
}

static const luaL_Reg functions[] = {{"raw", samples_raw}, {NULL, NULL}};
static const luaL_Reg methods[] = {{"slice", raw_slice},
                                   {"tosamples", raw_tosamples},
                                   {"kind", raw_kind},
                                   {"codes", raw_codes},
                                   {NULL, NULL}};
static const luaL_Reg meta[] = {
    {"__len", raw_length}, {"__tostring", raw_tostring}, {NULL, NULL}};

void lbr_open_raw(lua_State *L) {
  luaL_setfuncs(L, functions, 0);
  luaL_newmetatable(L, LBR_RAW_CLASS);
  luaL_setfuncs(L, meta, 0);
  lua_newtable(L);
  luaL_setfuncs(L, methods, 0);
  lua_pushcclosure(L, raw_index, 1);
  lua_setfield(L, -2, "__index");
  lua_pushliteral(L, LBR_RAW_CLASS);
  lua_setfield(L, -2, "__metatable");
  lua_pop(L, 1);
}
