/* core.spectrum: narrow bands of long records, and the analytic signal. */
#include <math.h>

#include "bind/bind.h"
#include "bind/samples.h"
#include "bind/spectrum.h"
#include "spectrum/analytic.h"
#include "spectrum/zoom.h"

#define CLASS "libration.zoom"

typedef struct holder {
  lbr_zoom *zoom; /* NULL: closed */
} holder;

/***
 * Gives back the workspace before it is collected.
 * @usage
 * local z = core.spectrum.zoom(100, 0.1, 0.001, 10)
 * z:close()
 * assert(not pcall(z.decimation, z))
 */
static int holder_close(lua_State *L) {
  holder *h = luaL_checkudata(L, 1, CLASS);
  lbr_zoom_free(h->zoom);
  h->zoom = NULL;
  return 0;
}

static const lbr_zoom *check_zoom(lua_State *L) {
  const holder *h = luaL_checkudata(L, 1, CLASS);
  luaL_argcheck(L, h->zoom, 1, "the zoom is closed");
  return h->zoom;
}

/***
 * The band of a record.
 * @param x samples: as many as the zoom was made for
 * @return samples: real parts, a value per point
 * @return samples: imaginary parts
 * @usage
 * local z = core.spectrum.zoom(3, 0.25, 0.25, 2)
 * local re, im = z:run(core.samples.from { 1, 2, 0 })
 * assert(math.abs(im[1] + 2) < 1e-14 and math.abs(re[2] + 1) < 1e-14)
 */
static int run(lua_State *L) {
  holder *h = luaL_checkudata(L, 1, CLASS);
  size_t points = lbr_zoom_points(check_zoom(L)), n;
  const double *x = lbr_check_samples(L, 2, &n);
  if (n != lbr_zoom_samples(h->zoom))
    luaL_argerror(L, 2, lua_pushfstring(
        L, "%I samples for a zoom of %I", (LUAI_UACINT)n,
        (LUAI_UACINT)lbr_zoom_samples(h->zoom)));
  double *re = lbr_push_unset_samples(L, points);
  double *im = lbr_push_unset_samples(L, points);
  lbr_status status = lbr_zoom_run(h->zoom, x, re, im);
  if (status != LBR_OK) return lbr_raise(L, status, "zoom");
  return 2;
}

/***
 * By how much the record is thinned out on the way.
 * @return integer: 1 when it is not
 * @usage
 * assert(core.spectrum.zoom(100000, 0.1, 1e-6, 100):decimation() > 100)
 */
static int decimation(lua_State *L) {
  lua_pushinteger(L, (lua_Integer)lbr_zoom_decimation(check_zoom(L)));
  return 1;
}

static const luaL_Reg methods[] = {{"close", holder_close},
                                   {"decimation", decimation},
                                   {"run", run},
                                   {NULL, NULL}};

static const luaL_Reg meta[] = {
    {"__gc", holder_close}, {"__close", holder_close}, {NULL, NULL}};

static double check_frequency(lua_State *L, int arg) {
  double f = luaL_checknumber(L, arg);
  luaL_argcheck(L, fabs(f) <= 1, arg, "not within -1 to 1 cycles per sample");
  return f;
}

/***
 * A zoom: the transform of records at equally spaced frequencies of any
 * spacing.
 * @param n integer: samples of a record
 * @param first number: first frequency, cycles per sample
 * @param step number: spacing, cycles per sample
 * @param points integer: how many frequencies
 * @param workers integer: threads; default 0: one per core
 * @return zoom: methods run(x), decimation(), close()
 * @usage
 * local x = core.samples.from { 1, 1, 1, 1 }
 * local re = core.spectrum.zoom(4, 0, 0.25, 3):run(x)
 * assert(math.abs(re[1] - 4) < 1e-14 and math.abs(re[2]) < 1e-14)
 */
static int zoom(lua_State *L) {
  size_t n = lbr_check_count(L, 1, 1, LBR_CHIRP_MOST);
  double first = check_frequency(L, 2), step = check_frequency(L, 3);
  size_t points = lbr_check_count(L, 4, 1, LBR_CHIRP_MOST);
  size_t workers = lua_isnoneornil(L, 5) ? 0 : lbr_check_count(L, 5, 0, 1024);
  holder *h = lua_newuserdatauv(L, sizeof *h, 0);
  h->zoom = NULL;
  lbr_set_class(L, CLASS, methods, meta);
  lbr_status status =
      lbr_zoom_new(n, first, step, points, (unsigned)workers, &h->zoom);
  if (status != LBR_OK) return lbr_raise(L, status, "zoom");
  return 1;
}

/***
 * The quadrature of a record: every line turned back by a quarter turn.
 * x + i quadrature(x) is the analytic signal; the record is taken as a period.
 * @param x samples: the record, up to 2^27
 * @return samples: as many
 * @usage
 * local x = core.samples.from { 1, 0, -1, 0 }
 * assert(math.abs(core.spectrum.quadrature(x)[2] - 1) < 1e-15)
 */
static int quadrature(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  luaL_argcheck(L, n >= 1, 1, "no samples");
  lbr_status status = lbr_quadrature(x, n, lbr_push_unset_samples(L, n));
  if (status != LBR_OK) return lbr_raise(L, status, "quadrature");
  return 1;
}

static const luaL_Reg functions[] = {
    {"quadrature", quadrature}, {"zoom", zoom}, {NULL, NULL}};

void lbr_add_zoom(lua_State *L) { luaL_setfuncs(L, functions, 0); }
