/* core.spectrum: transforms of samples. */
#include <string.h>

#include "bind/bind.h"
#include "bind/samples.h"
#include "bind/spectrum.h"
#include "spectrum/transform.h"

#define JOB_CLASS "libration.transform.job"

/* One transform with its buffers, owned by a userdata so that an error raised
 * on the way loses nothing. */
typedef struct job {
  lbr_transform *transform;
  double *scratch;
  double complex *bins;
} job;

static int job_close(lua_State *L) {
  job *j = luaL_checkudata(L, 1, JOB_CLASS);
  lbr_transform_put(j->transform);
  lbr_transform_drop(j->scratch);
  lbr_transform_drop(j->bins);
  *j = (job){NULL, NULL, NULL};
  return 0;
}

static const luaL_Reg job_methods[] = {{NULL, NULL}};
static const luaL_Reg job_meta[] = {
    {"__gc", job_close}, {"__close", job_close}, {NULL, NULL}};

/* Pushes a job; the caller marks its slot to be closed. */
static job *push_job(lua_State *L, size_t points, const char *what) {
  job *j = lua_newuserdatauv(L, sizeof *j, 0);
  *j = (job){NULL, NULL, NULL};
  lbr_set_class(L, JOB_CLASS, job_methods, job_meta);
  lua_toclose(L, -1);
  lbr_status status = lbr_transform_get(points, &j->transform);
  if (status != LBR_OK) lbr_raise(L, status, what);
  j->scratch = lbr_transform_buffer(points);
  j->bins = (double complex *)lbr_transform_buffer(2 * (points / 2 + 1));
  if (!j->scratch || !j->bins) lbr_raise(L, LBR_NO_MEMORY, what);
  return j;
}

#define SMALL 1024 /* points that are transformed on the stack */

/* No allocation, and nothing that can raise, while the plan is held. */
static void run_small(lua_State *L, const double *x, const double *w, size_t n,
                      size_t points, double *re, double *im) {
  _Alignas(64) double scratch[SMALL];
  _Alignas(64) double complex bins[SMALL / 2 + 1];
  lbr_transform *t;
  lbr_status status = lbr_transform_get(points, &t);
  if (status != LBR_OK) {
    lbr_raise(L, status, "transform");
    return;
  }
  lbr_transform_windowed(t, x, w, n, scratch, bins);
  lbr_transform_put(t);
  for (size_t k = 0; k <= points / 2; k++) {
    re[k] = creal(bins[k]);
    im[k] = cimag(bins[k]);
  }
}

/* One of the two blocks that take the result: argument `arg` or a new one. */
static double *block_at(lua_State *L, int arg, size_t bins) {
  size_t n;
  if (lua_isnoneornil(L, arg)) return lbr_push_unset_samples(L, bins);
  double *block = lbr_check_writable_samples(L, arg, &n);
  luaL_argcheck(L, n == bins, arg, "not points // 2 + 1 values");
  lua_pushvalue(L, arg);
  return block;
}

/* Windowed and padded transform of argument 1 into two views, those of
 * arguments points_arg + 1 and + 2 or new ones. */
static int forward_of(lua_State *L, const double *w, int points_arg) {
  size_t n;
  lua_settop(L, points_arg + 2);
  const double *x = lbr_check_samples(L, 1, &n);
  if (n < 1) luaL_argerror(L, 1, "no samples to transform");
  size_t points = lua_isnil(L, points_arg)
                      ? n
                      : lbr_check_count(L, points_arg, n, LBR_TRANSFORM_MOST);
  if (points > LBR_TRANSFORM_MOST)
    luaL_argerror(L, 1, "more than 2^27 samples");
  double *re = block_at(L, points_arg + 1, points / 2 + 1);
  double *im = block_at(L, points_arg + 2, points / 2 + 1);
  luaL_argcheck(L, re != im, points_arg + 2, "the same block twice");
  if (points <= SMALL)
    run_small(L, x, w, n, points, re, im);
  else
    lbr_run_single(L, x, w, n, points, re, im);
  return 2;
}

/*** The discrete Fourier transform of real samples.
 * X[k] = sum over n of x[n] exp(-2 pi i k n / points), for k = 0 to points / 2,
 * as the real and the imaginary parts; nothing is scaled.  Any length up to
 * 2^27, products of small primes fastest.  Raises on other lengths.
 * @param x samples: the record, at least one sample
 * @param points integer: length after zero padding, at least #x, default #x
 * @param re samples: points // 2 + 1 values that take the real parts, default
 *   a new block
 * @param im samples: the same for the imaginary parts
 * @return samples: real parts, points // 2 + 1 values
 * @return samples: imaginary parts
 * @usage
 * local x = core.samples.from { 1, 0, 0, 0 }
 * local re, im = core.spectrum.forward(x)
 * assert(re[1] == 1 and re[3] == 1 and im[2] == 0)
 */
static int forward(lua_State *L) { return forward_of(L, NULL, 2); }

/*** The transform of a record times a window.
 * Like forward, with w[n] x[n] in place of x[n].
 * @param x samples: the record
 * @param w samples: the window, as long as the record
 * @param points integer: length after zero padding, at least #x, default #x
 * @param re samples: points // 2 + 1 values that take the real parts, default
 *   a new block
 * @param im samples: the same for the imaginary parts
 * @return samples: real parts, points // 2 + 1 values
 * @return samples: imaginary parts
 * @usage
 * local x = core.samples.from { 1, 1, 1, 1 }
 * local w = core.samples.from { 0, 0.5, 1, 0.5 }
 * local re = core.spectrum.windowed(x, w, 8)
 * assert(#re == 5 and re[1] == 2)
 */
static int windowed(lua_State *L) {
  size_t n, m;
  lbr_check_samples(L, 1, &n);
  const double *w = lbr_check_samples(L, 2, &m);
  if (m != n)
    luaL_argerror(L, 2, lua_pushfstring(L, "%I window samples for %I samples",
                                        (LUAI_UACINT)m, (LUAI_UACINT)n));
  return forward_of(L, w, 3);
}

/*** The samples whose transform is given.
 * The inverse of forward: back(forward(x), #x) is x but for rounding.
 * @param re samples: real parts, points // 2 + 1 values
 * @param im samples: imaginary parts, as many
 * @param points integer: length of the record
 * @return samples: the record
 * @usage
 * local x = core.samples.from { 3, -1, 2 }
 * local re, im = core.spectrum.forward(x)
 * local y = core.spectrum.back(re, im, 3)
 * assert(math.abs(y[1] - 3) < 1e-15 and math.abs(y[3] - 2) < 1e-15)
 */
static int back(lua_State *L) {
  size_t n, m;
  const double *re = lbr_check_samples(L, 1, &n);
  const double *im = lbr_check_samples(L, 2, &m);
  size_t points = lbr_check_count(L, 3, 1, LBR_TRANSFORM_MOST);
  luaL_argcheck(L, n == points / 2 + 1, 1, "not points // 2 + 1 values");
  luaL_argcheck(L, m == n, 2, "not as many values as the real parts");
  double *x = lbr_push_samples(L, points);
  job *j = push_job(L, points, "transform");
  for (size_t k = 0; k < n; k++) j->bins[k] = CMPLX(re[k], im[k]);
  lbr_transform_back(j->transform, j->bins, j->scratch);
  memcpy(x, j->scratch, points * sizeof *x);
  lua_closeslot(L, -1);
  lua_pop(L, 1);
  return 1;
}

/*** The smallest length that transforms fast.
 * Fast lengths have no prime factors but 2, 3 and 5.
 * @param n integer: the least length, 1 to 2^27
 * @return integer: the smallest fast length that is not less
 * @usage
 * assert(core.spectrum.fast_length(1021) == 1024)
 */
static int fast_length(lua_State *L) {
  size_t n = lbr_check_count(L, 1, 1, LBR_TRANSFORM_MOST);
  lua_pushinteger(L, (lua_Integer)lbr_transform_fast_length(n));
  return 1;
}

/*** Tries out plans for transforms of a length and keeps the fastest.
 * For long jobs: 0.3 s for 8192 points, 1 s for 65536, minutes beyond 2^22;
 * averages gain 10 to 20 %.  Holds until forget; results may change in their
 * last bits.
 * @param points integer: length after zero padding, 1 to 2^27
 * @usage
 * core.spectrum.tune(64)
 */
static int tune(lua_State *L) {
  size_t points = lbr_check_count(L, 1, 1, LBR_TRANSFORM_MOST);
  lbr_status status = lbr_transform_tune(points);
  if (status != LBR_OK) return lbr_raise(L, status, "tuning");
  return 0;
}

/*** Forgets all transform plans that are kept for reuse.
 * For leak checks; the next transform of each length plans again.
 * @usage
 * core.spectrum.forget()
 */
static int forget(lua_State *L) {
  (void)L;
  lbr_transform_forget();
  return 0;
}

static const luaL_Reg functions[] = {
    {"back", back},         {"fast_length", fast_length}, {"forget", forget},
    {"forward", forward},   {"tune", tune},
    {"windowed", windowed}, {NULL, NULL}};

int lbr_open_spectrum(lua_State *L) {
  luaL_newlib(L, functions);
  lbr_add_averages(L);
  lbr_add_singles(L);
  lbr_add_statistics(L);
  lbr_add_zoom(L);
  return 1;
}
