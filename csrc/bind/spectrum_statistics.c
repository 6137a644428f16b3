/* core.spectrum: what averages are worth, and what pairs of them tell. */
#include <math.h>

#include "bind/bind.h"
#include "bind/samples.h"
#include "bind/spectrum.h"
#include "spectrum/confidence.h"
#include "spectrum/median.h"
#include "spectrum/response.h"

static double check_positive(lua_State *L, int arg) {
  double x = luaL_checknumber(L, arg);
  luaL_argcheck(L, x > 0 && isfinite(x), arg, "not a positive number");
  return x;
}

/***
 * How many independent averages overlapping segments are worth.
 * K / (1 + 2 sum over j < K of (1 - j / K) rho_j^2), rho_j being the
 * correlation of the window with itself j steps later (Welch 1967, equations
 * 13 ff; Harris 1978, equation 18).
 * @param window samples: of one segment
 * @param step integer: samples from one segment to the next
 * @param segments integer: how many, K
 * @return number: effective averages
 * @usage
 * local w = lb.window("hann"):samples(1024)
 * assert(core.spectrum.effective_averages(w, 1024, 8) == 8)
 * assert(core.spectrum.effective_averages(w, 512, 8) < 8)
 */
static int effective_averages(lua_State *L) {
  size_t n;
  const double *w = lbr_check_samples(L, 1, &n);
  luaL_argcheck(L, n >= 1, 1, "an empty window");
  size_t step = lbr_check_count(L, 2, 1, (size_t)1 << 53);
  size_t count = lbr_check_count(L, 3, 1, (size_t)1 << 53);
  lua_pushnumber(L, lbr_effective_averages(w, n, step, count));
  return 1;
}

/***
 * The value below which a share of a chi-square distribution lies.
 * @param dof number: degrees of freedom, positive, need not be whole
 * @param share number: between 0 and 1
 * @return number: the quantile
 * @usage
 * assert(math.abs(core.spectrum.chi_square(2, 0.5) - 2 * math.log(2)) < 1e-14)
 */
static int chi_square(lua_State *L) {
  double dof = check_positive(L, 1), share = luaL_checknumber(L, 2), x;
  luaL_argcheck(L, share > 0 && share < 1, 2, "not between 0 and 1");
  lbr_status status = lbr_chi_square_quantile(dof, share, &x);
  if (status != LBR_OK) return lbr_raise(L, status, "chi-square quantile");
  lua_pushnumber(L, x);
  return 1;
}

/***
 * The median of n powers of noise over their mean.
 * 1 - 1/2 + 1/3 ... + 1/n for odd n (Allen et al. 2012, Phys. Rev. D 85,
 * 122006, appendix B), continued to all n from 1.
 * @param n number: powers, independent ones, 1 or more
 * @return number: 1 for one power, ln 2 for many
 * @usage
 * assert(math.abs(core.spectrum.median_bias(3) - (1 - 1 / 2 + 1 / 3)) < 1e-15)
 */
static int median_bias(lua_State *L) {
  double n = luaL_checknumber(L, 1);
  luaL_argcheck(L, n >= 1 && isfinite(n), 1, "less than 1");
  lua_pushnumber(L, lbr_median_bias(n));
  return 1;
}

/***
 * The median of samples.
 * @param x samples: at least one
 * @return number: the middle value, the mean of the two middle ones for an
 *   even number
 * @usage
 * assert(core.spectrum.median(core.samples.from { 5, 1, 2, 9 }) == 3.5)
 */
static int median(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  luaL_argcheck(L, n >= 1, 1, "no samples");
  double *copy = lua_newuserdatauv(L, n * sizeof *copy, 0);
  for (size_t i = 0; i < n; i++) copy[i] = x[i];
  lua_pushnumber(L, lbr_median(copy, n));
  return 1;
}

static lbr_pair check_pair(lua_State *L) {
  lbr_pair p;
  size_t m[3];
  p.xx = lbr_check_samples(L, 1, &p.n);
  p.yy = lbr_check_samples(L, 2, &m[0]);
  p.re = lbr_check_samples(L, 3, &m[1]);
  p.im = lbr_check_samples(L, 4, &m[2]);
  for (int i = 0; i < 3; i++)
    luaL_argcheck(L, m[i] == p.n, i + 2, "not as many values as the first");
  return p;
}

/***
 * The coherence of two channels, |Sxy|^2 / (Sxx Syy).
 * @param xx samples: averaged power of the input
 * @param yy samples: averaged power of the output
 * @param re samples: real parts of the cross spectrum
 * @param im samples: imaginary parts
 * @return samples: 0 to 1; not a number where there is no power
 * @usage
 * local function one(v) return core.samples.from { v } end
 * assert(core.spectrum.coherence(one(2), one(8), one(0), one(2))[1] == 0.25)
 */
static int coherence(lua_State *L) {
  lbr_pair p = check_pair(L);
  lbr_coherence(&p, lbr_push_samples(L, p.n));
  return 1;
}

/***
 * The response of a system from input to output.
 * @param xx samples: averaged power of the input
 * @param yy samples: averaged power of the output
 * @param re samples: real parts of the cross spectrum, mean of conj(X) Y
 * @param im samples: imaginary parts
 * @param estimate string: "h1" (noise on the output), "h2" (noise on the
 *   input), "total" (noise on both: total least squares)
 * @param noise_ratio number: noise power on the output over that on the
 *   input; for "total" alone, and needed there
 * @return samples: real parts
 * @return samples: imaginary parts
 * @usage
 * local function one(v) return core.samples.from { v } end
 * local re = core.spectrum.response(one(2), one(8), one(4), one(0), "h1")
 * assert(re[1] == 2)
 */
static int response(lua_State *L) {
  static const char *const names[] = {"h1", "h2", "total", NULL};
  lbr_pair p = check_pair(L);
  int estimate = luaL_checkoption(L, 5, NULL, names);
  double ratio = 1;
  if (estimate == LBR_RESPONSE_TOTAL) ratio = check_positive(L, 6);
  double *re = lbr_push_samples(L, p.n), *im = lbr_push_samples(L, p.n);
  lbr_response(&p, (lbr_estimate)estimate, ratio, re, im);
  return 2;
}

/***
 * The random error of the size of a response, as a share of it.
 * sqrt((1 - g2) / (2 n g2)) (Bendat and Piersol, Random Data).
 * @param coherence samples: g2, 0 to 1
 * @param averages number: effective averages, n
 * @return samples: standard deviation over value
 * @usage
 * local e = core.spectrum.response_error(core.samples.from { 0.5 }, 50)
 * assert(math.abs(e[1] - 0.1) < 1e-15)
 */
static int response_error(lua_State *L) {
  size_t n;
  const double *g = lbr_check_samples(L, 1, &n);
  double averages = check_positive(L, 2);
  lbr_response_error(g, n, averages, lbr_push_samples(L, n));
  return 1;
}

#define MOST_NARROW 64

/***
 * Peaks of a power that are narrower at half power than a limit.
 * @param power samples: the power, such as |H|^2
 * @param least number: the limit, bins
 * @return table: list of { bin = from 1, width = bins }, 64 at most
 * @return integer: how many there are
 * @usage
 * local p = core.samples.from { 1, 1, 9, 1, 1 }
 * local list, count = core.spectrum.narrow_peaks(p, 4)
 * assert(count == 1 and list[1].bin == 3 and list[1].width < 2)
 */
static int narrow_peaks(lua_State *L) {
  size_t n;
  lbr_narrow found[MOST_NARROW];
  const double *p = lbr_check_samples(L, 1, &n);
  double least = check_positive(L, 2);
  size_t count = lbr_narrow_peaks(p, n, least, found, MOST_NARROW);
  size_t listed = count < MOST_NARROW ? count : MOST_NARROW;
  lua_createtable(L, (int)listed, 0);
  for (size_t i = 0; i < listed; i++) {
    lua_createtable(L, 0, 2);
    lua_pushinteger(L, (lua_Integer)found[i].bin + 1);
    lua_setfield(L, -2, "bin");
    lua_pushnumber(L, found[i].width);
    lua_setfield(L, -2, "width");
    lua_rawseti(L, -2, (lua_Integer)i + 1);
  }
  lua_pushinteger(L, (lua_Integer)count);
  return 2;
}

/***
 * Square roots, one by one, times a factor.
 * @param x samples: 0 or more
 * @param factor number: what the roots are multiplied by, default 1
 * @return samples: factor sqrt(x)
 * @usage
 * assert(core.spectrum.root(core.samples.from { 9 }, 2)[1] == 6)
 */
static int root(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  double factor = luaL_optnumber(L, 2, 1);
  double *out = lbr_push_unset_samples(L, n);
  for (size_t i = 0; i < n; i++) out[i] = factor * sqrt(x[i]);
  return 1;
}

/***
 * Levels: factor log10(x / reference), one by one.
 * @param x samples: positive values (0 gives minus infinity)
 * @param reference number: what 0 dB stands for, positive
 * @param factor number: 10 for powers, 20 for amplitudes
 * @return samples: dB
 * @usage
 * assert(core.spectrum.levels(core.samples.from { 100 }, 1, 10)[1] == 20)
 */
static int levels(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  double reference = check_positive(L, 2), factor = luaL_checknumber(L, 3);
  double *out = lbr_push_unset_samples(L, n);
  for (size_t i = 0; i < n; i++) out[i] = factor * log10(x[i] / reference);
  return 1;
}

static const luaL_Reg functions[] = {
    {"chi_square", chi_square},
    {"coherence", coherence},
    {"effective_averages", effective_averages},
    {"levels", levels},
    {"median", median},
    {"median_bias", median_bias},
    {"narrow_peaks", narrow_peaks},
    {"response", response},
    {"response_error", response_error},
    {"root", root},
    {NULL, NULL}};

void lbr_add_statistics(lua_State *L) { luaL_setfuncs(L, functions, 0); }
