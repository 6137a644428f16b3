/* core.spectrum: transforms of one record of any length, again and again. */
#include <string.h>

#include "bind/bind.h"
#include "bind/samples.h"
#include "bind/spectrum.h"
#include "spectrum/single.h"
#include "spectrum/transform.h"

#define CLASS "libration.transform.single"
#define KEPT_MOST ((size_t)1 << 21) /* points of an object kept for reuse */

typedef struct holder {
  lbr_single *single; /* NULL: closed */
} holder;

/***
 * Gives back the workspace before it is collected.
 * @usage
 * local t = core.spectrum.single(1000)
 * t:close()
 * assert(not pcall(t.run, t, core.samples.new(1000)))
 */
static int holder_close(lua_State *L) {
  holder *h = luaL_checkudata(L, 1, CLASS);
  lbr_single_free(h->single);
  h->single = NULL;
  return 0;
}

static double *block_at(lua_State *L, int arg, size_t bins) {
  size_t n;
  if (lua_isnil(L, arg)) return lbr_push_unset_samples(L, bins);
  double *block = lbr_check_writable_samples(L, arg, &n);
  luaL_argcheck(L, n == bins, arg, "not points // 2 + 1 values");
  lua_pushvalue(L, arg);
  return block;
}

/***
 * The transform of a record, without making anything anew.
 * @param x samples: the record, up to as many as the object has points
 * @param window samples: as long as the record; nil: none
 * @param re samples: points // 2 + 1 values that take the real parts, default
 *   a new block
 * @param im samples: the same for the imaginary parts
 * @return samples: real parts
 * @return samples: imaginary parts
 * @usage
 * local t = core.spectrum.single(1009)
 * local x = core.samples.new(1009):fill(2)
 * local re, im = t:run(x)
 * t:run(x * 2, nil, re, im)
 * assert(math.abs(re[1] - 4 * 1009) < 1e-9)
 */
static int run(lua_State *L) {
  holder *h = luaL_checkudata(L, 1, CLASS);
  luaL_argcheck(L, h->single, 1, "the transform is closed");
  size_t n, m = 0, points = lbr_single_points(h->single);
  lua_settop(L, 5);
  const double *x = lbr_check_samples(L, 2, &n);
  luaL_argcheck(L, n >= 1 && n <= points, 2, "none, or more than points");
  const double *w = lua_isnil(L, 3) ? NULL : lbr_check_samples(L, 3, &m);
  luaL_argcheck(L, !w || m == n, 3, "not as many as the record");
  double *re = block_at(L, 4, points / 2 + 1);
  double *im = block_at(L, 5, points / 2 + 1);
  luaL_argcheck(L, re != im, 5, "the same block twice");
  lbr_status status = lbr_single_run(h->single, x, w, n, re, im);
  if (status != LBR_OK) return lbr_raise(L, status, "transform");
  return 2;
}

static const luaL_Reg methods[] = {
    {"close", holder_close}, {"run", run}, {NULL, NULL}};

static const luaL_Reg meta[] = {
    {"__gc", holder_close}, {"__close", holder_close}, {NULL, NULL}};

static holder *push_holder(lua_State *L, size_t points, unsigned workers) {
  holder *h = lua_newuserdatauv(L, sizeof *h, 0);
  h->single = NULL;
  lbr_set_class(L, CLASS, methods, meta);
  lbr_status status = lbr_single_new(points, workers, &h->single);
  if (status != LBR_OK) lbr_raise(L, status, "transform");
  return h;
}

/***
 * An object that transforms records of one length, with its own workspace.
 * Any length: long ones are cut up and shared among threads, those with large
 * prime factors go by a chirp.
 * @param points integer: length after zero padding, 1 to 2^27
 * @param workers integer: threads; default 0: one per core
 * @return transform: methods run(x, window, re, im) and close()
 * @usage
 * local re = core.spectrum.single(8):run(core.samples.from { 1, 1 })
 * assert(#re == 5 and re[1] == 2)
 */
static int single(lua_State *L) {
  size_t points = lbr_check_count(L, 1, 1, LBR_TRANSFORM_MOST);
  size_t workers = lua_isnoneornil(L, 2) ? 0 : lbr_check_count(L, 2, 0, 1024);
  push_holder(L, points, (unsigned)workers);
  return 1;
}

static const char kept; /* its address is the key in the registry */

void lbr_run_single(lua_State *L, const double *x, const double *w, size_t n,
                    size_t points, double *re, double *im) {
  lua_rawgetp(L, LUA_REGISTRYINDEX, &kept);
  holder *h = luaL_testudata(L, -1, CLASS);
  if (!h || !h->single || lbr_single_points(h->single) != points) {
    lua_pop(L, 1);
    h = push_holder(L, points, 0);
    if (points <= KEPT_MOST) {
      lua_pushvalue(L, -1);
      lua_rawsetp(L, LUA_REGISTRYINDEX, &kept);
    }
  }
  lbr_status status = lbr_single_run(h->single, x, w, n, re, im);
  if (status != LBR_OK) lbr_raise(L, status, "transform");
  if (points > KEPT_MOST) {
    lbr_single_free(h->single);
    h->single = NULL;
  }
  lua_pop(L, 1);
}

static const luaL_Reg functions[] = {{"single", single}, {NULL, NULL}};

void lbr_add_singles(lua_State *L) { luaL_setfuncs(L, functions, 0); }
