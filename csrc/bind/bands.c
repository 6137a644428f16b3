/* core.bands: fractional octaves, weightings, groups, cepstrum, envelope,
 * spectral kurtosis. */
#include <math.h>
#include <string.h>

#include "bind/bind.h"
#include "bind/samples.h"
#include "spectrum/bands.h"
#include "spectrum/cepstrum.h"
#include "spectrum/envelope.h"
#include "spectrum/groups.h"
#include "spectrum/kurtosis.h"
#include "spectrum/weighting.h"

#define JOB_CLASS "libration.bands.job"

/* A transform with its buffers, owned by a userdata so that an error raised on
 * the way loses nothing. */
typedef struct job {
  lbr_transform *transform;
  double *x, *y;
  double complex *bins, *spare;
} job;

static int job_close(lua_State *L) {
  job *j = luaL_checkudata(L, 1, JOB_CLASS);
  lbr_transform_put(j->transform);
  lbr_transform_drop(j->x);
  lbr_transform_drop(j->y);
  lbr_transform_drop(j->bins);
  lbr_transform_drop(j->spare);
  *j = (job){NULL, NULL, NULL, NULL, NULL};
  return 0;
}

static const luaL_Reg job_methods[] = {{NULL, NULL}};
static const luaL_Reg job_meta[] = {
    {"__gc", job_close}, {"__close", job_close}, {NULL, NULL}};

/* Pushes a job that is closed when its slot is; two: with y and spare. */
static job *push_job(lua_State *L, size_t points, bool two) {
  size_t bins = 2 * (points / 2 + 1);
  job *j = lua_newuserdatauv(L, sizeof *j, 0);
  *j = (job){NULL, NULL, NULL, NULL, NULL};
  lbr_set_class(L, JOB_CLASS, job_methods, job_meta);
  lua_toclose(L, -1);
  lbr_status status = lbr_transform_get(points, &j->transform);
  if (status != LBR_OK) lbr_raise(L, status, "transform");
  j->x = lbr_transform_buffer(points);
  j->bins = (double complex *)lbr_transform_buffer(bins);
  if (two) {
    j->y = lbr_transform_buffer(points);
    j->spare = (double complex *)lbr_transform_buffer(bins);
  }
  if (!j->x || !j->bins || (two && (!j->y || !j->spare)))
    lbr_raise(L, LBR_NO_MEMORY, "transform");
  return j;
}

/* Closes the job at the top and pops it. */
static void pop_job(lua_State *L) {
  lua_closeslot(L, -1);
  lua_pop(L, 1);
}

/* A record that can be transformed. */
static const double *check_record(lua_State *L, int arg, size_t *n) {
  const double *x = lbr_check_samples(L, arg, n);
  luaL_argcheck(L, *n > 0, arg, "no samples");
  luaL_argcheck(L, *n <= LBR_TRANSFORM_MOST, arg, "more than 2^27 samples");
  return x;
}

static int check_fraction(lua_State *L, int arg) {
  return (int)lbr_check_count(L, arg, 1, LBR_MOST_FRACTION);
}

/***
 * Exact frequencies of a fractional-octave band (IEC 61260-1:2014).
 * @param fraction integer: b of bands of 1/b octave, 1 to 48
 * @param number integer: band number, 0 at or just above 1 kHz
 * @return number: mid-band frequency, Hz
 * @return number: low edge, Hz
 * @return number: high edge, Hz
 * @usage
 * local mid, low, high = core.bands.band(3, 0)
 * assert(mid == 1000 and math.abs(low - 891.2509381) < 1e-6 and high > 1122)
 */
static int bands_band(lua_State *L) {
  lbr_band band;
  int b = check_fraction(L, 1);
  lua_Integer x = luaL_checkinteger(L, 2);
  luaL_argcheck(L, x >= -LBR_MOST_BAND && x <= LBR_MOST_BAND, 2,
                "outside -4096 .. 4096");
  lbr_status status = lbr_band_of(b, (int)x, &band);
  if (status != LBR_OK) return lbr_raise(L, status, "band");
  lua_pushnumber(L, band.mid);
  lua_pushnumber(L, band.low);
  lua_pushnumber(L, band.high);
  return 3;
}

/***
 * Number of the fractional-octave band that holds a frequency.
 * @param fraction integer: b of bands of 1/b octave, 1 to 48
 * @param hz number: frequency, Hz, above 0
 * @return integer: band number
 * @usage
 * assert(core.bands.at(3, 1000) == 0 and core.bands.at(3, 31.5) == -15)
 */
static int bands_at(lua_State *L) {
  int x, b = check_fraction(L, 1);
  lbr_status status = lbr_band_at(b, luaL_checknumber(L, 2), &x);
  if (status != LBR_OK) return lbr_raise(L, status, "hz");
  lua_pushinteger(L, x);
  return 1;
}

/***
 * Limits of the relative attenuation of a band filter (IEC 61260-1:2014).
 * @param fraction integer: b of bands of 1/b octave, 1 to 48
 * @param class integer: 1 or 2
 * @param ratio number: frequency over mid-band frequency, above 0
 * @return number: least attenuation, dB
 * @return number: largest attenuation, dB; infinite outside the band
 * @usage
 * local least, most = core.bands.limits(1, 1, 2)
 * assert(least > 16.6 and most == math.huge)
 */
static int bands_limits(lua_State *L) {
  double least, most;
  int b = check_fraction(L, 1), c = (int)lbr_check_count(L, 2, 1, 2);
  lbr_status status =
      lbr_band_limits(b, c, luaL_checknumber(L, 3), &least, &most);
  if (status != LBR_OK) return lbr_raise(L, status, "ratio");
  lua_pushnumber(L, least);
  lua_pushnumber(L, most);
  return 2;
}

/***
 * Relative attenuation of the band-pass that band powers are made with.
 * @param fraction integer: b of bands of 1/b octave, 1 to 48
 * @param order integer: of the Butterworth magnitude, 1 to 32
 * @param ratio number: frequency over mid-band frequency, above 0
 * @return number: attenuation, dB
 * @usage
 * assert(math.abs(core.bands.attenuation(1, 6, 10 ^ 0.15) - 3.0103) < 1e-4)
 */
static int bands_attenuation(lua_State *L) {
  double db;
  int b = check_fraction(L, 1);
  int order = (int)lbr_check_count(L, 2, 1, LBR_MOST_BAND_ORDER);
  lbr_status status =
      lbr_band_attenuation(b, order, luaL_checknumber(L, 3), &db);
  if (status != LBR_OK) return lbr_raise(L, status, "ratio");
  lua_pushnumber(L, db);
  return 1;
}

/***
 * Powers of lines as powers of fractional-octave bands.
 * @param power samples: squared rms of the lines at 0, step_hz, 2 step_hz ...
 * @param step_hz number: Hz between lines
 * @param fraction integer: b of bands of 1/b octave, 1 to 48
 * @param order integer: of the band-pass, 1 to 32
 * @param first integer: number of the first band
 * @param count integer: how many bands
 * @return samples: squared rms of each band; raises where one is out of range
 * @usage
 * local power = core.samples.new(2001)
 * power[1001] = 4
 * local bands = core.bands.powers(power, 1, 3, 6, -1, 3)
 * assert(bands[2] == 4 and bands[1] < 1e-3)
 */
static int bands_powers(lua_State *L) {
  size_t bins;
  const double *power = lbr_check_samples(L, 1, &bins);
  double step_hz = luaL_checknumber(L, 2);
  int b = check_fraction(L, 3);
  int order = (int)lbr_check_count(L, 4, 1, LBR_MOST_BAND_ORDER);
  lua_Integer first = luaL_checkinteger(L, 5);
  luaL_argcheck(L, first >= -LBR_MOST_BAND && first <= LBR_MOST_BAND, 5,
                "outside -4096 .. 4096");
  size_t count = lbr_check_count(L, 6, 0, 2 * LBR_MOST_BAND);
  double *out = lbr_push_samples(L, count);
  lbr_status status = lbr_band_powers(power, bins, step_hz, b, order,
                                      (int)first, count, out);
  return status == LBR_OK ? 1 : lbr_raise(L, status, "bands");
}

/***
 * Squared rms of the lines of a record, one-sided; their sum is the mean
 * square where there is no window.
 * @param x samples: the record
 * @param window samples: as many, or nil for none; the powers are divided by
 *   its mean square, so that noise keeps its power
 * @return samples: #x // 2 + 1 powers
 * @usage
 * local x = core.samples.from { 1, -1, 1, -1 }
 * assert(core.bands.line_powers(x)[3] == 1)
 */
static int bands_line_powers(lua_State *L) {
  size_t n, m;
  double squares = 0;
  const double *x = check_record(L, 1, &n), *w = NULL;
  if (!lua_isnoneornil(L, 2)) {
    w = lbr_check_samples(L, 2, &m);
    luaL_argcheck(L, m == n, 2, "not as many window samples");
  }
  for (size_t i = 0; i < n; i++) squares += w ? w[i] * w[i] : 1;
  luaL_argcheck(L, squares > 0, 2, "a window of zeros");
  double *out = lbr_push_unset_samples(L, n / 2 + 1);
  job *j = push_job(L, n, false);
  lbr_transform_windowed(j->transform, x, w, n, j->x, j->bins);
  for (size_t k = 0; k <= n / 2; k++) {
    double a = creal(j->bins[k]), b = cimag(j->bins[k]);
    double sides = k == 0 || 2 * k == n ? 1 : 2;
    out[k] = sides * (a * a + b * b) / ((double)n * squares);
  }
  pop_job(L);
  return 1;
}

static lbr_weighting check_weighting(lua_State *L, int arg) {
  lbr_weighting weighting = LBR_WEIGHTING_Z;
  const char *name = luaL_checkstring(L, arg);
  if (lbr_weighting_of(name, &weighting) != LBR_OK)
    luaL_argerror(L, arg, lua_pushfstring(L, "%s is not A, C or Z", name));
  return weighting;
}

/***
 * Gain of a frequency weighting of IEC 61672-1.
 * @param name string: "A", "C" or "Z"
 * @param hz number: frequency, Hz, 0 or more
 * @return number: amplitude ratio, 1 at 1 kHz
 * @usage
 * assert(core.bands.weighting("A", 1000) == 1)
 */
static int bands_weighting(lua_State *L) {
  lbr_weighting weighting = check_weighting(L, 1);
  double hz = luaL_checknumber(L, 2);
  luaL_argcheck(L, hz >= 0 && isfinite(hz), 2, "no frequency");
  lua_pushnumber(L, lbr_weighting_gain(weighting, hz));
  return 1;
}

/***
 * Line powers with a frequency weighting applied.
 * @param name string: "A", "C" or "Z"
 * @param power samples: squared rms of the lines at 0, step_hz, 2 step_hz ...
 * @param step_hz number: Hz between lines, above 0
 * @return samples: the weighted powers
 * @usage
 * local power = core.bands.weigh("A", core.samples.from { 1, 1 }, 1000)
 * assert(power[1] == 0 and power[2] == 1)
 */
static int bands_weigh(lua_State *L) {
  size_t n;
  lbr_weighting weighting = check_weighting(L, 1);
  const double *power = lbr_check_samples(L, 2, &n);
  double step_hz = luaL_checknumber(L, 3);
  luaL_argcheck(L, step_hz > 0 && isfinite(step_hz), 3, "not above 0");
  lbr_weigh_powers(weighting, power, n, step_hz, lbr_push_unset_samples(L, n));
  return 1;
}

/***
 * Harmonic and interharmonic groups of a mains spectrum (IEC 61000-4-7).
 * @param power samples: squared rms of the lines of one window
 * @param cycles integer: mains cycles in the window, even, 4 or more
 * @param orders integer: how many harmonics
 * @return samples: squared rms of the groups of harmonics 1 .. orders
 * @return samples: of their subgroups
 * @return samples: of the interharmonic groups above harmonics 0 .. orders - 1
 * @return samples: of the centred interharmonic subgroups
 * @usage
 * local power = core.samples.new(60)
 * power[11], power[12] = 9, 1
 * local group, subgroup, inter = core.bands.groups(power, 10, 2)
 * assert(group[1] == 10 and subgroup[1] == 10 and inter[2] == 1)
 */
static int bands_groups(lua_State *L) {
  size_t bins;
  const double *power = lbr_check_samples(L, 1, &bins);
  size_t cycles = lbr_check_count(L, 2, 4, 4096);
  size_t orders = lbr_check_count(L, 3, 1, 4096);
  luaL_argcheck(L, cycles % 2 == 0, 2, "not even");
  luaL_argcheck(L, bins >= orders * cycles + cycles / 2 + 1, 1,
                "not as many lines as the harmonics need");
  lbr_groups out;
  out.group = lbr_push_samples(L, orders);
  out.subgroup = lbr_push_samples(L, orders);
  out.inter = lbr_push_samples(L, orders);
  out.inter_centred = lbr_push_samples(L, orders);
  lbr_status status = lbr_groups_of(power, bins, cycles, orders, &out);
  return status == LBR_OK ? 4 : lbr_raise(L, status, "groups");
}

/***
 * The cepstrum of a record.
 * @param x samples: the record
 * @param kind string: "real" (ln of magnitudes) or "power" (squared, of ln of
 *   powers)
 * @param floor number: magnitudes below this share of the largest count as it,
 *   0 to 1, default 0
 * @return samples: as many; value n + 1 is quefrency n; or nil, message, code
 *   when a magnitude is 0 and there is no floor
 * @usage
 * local c = core.bands.cepstrum(core.samples.from { 2, 0, 0, 0 }, "real")
 * assert(math.abs(c[1] - math.log(2)) < 1e-15)
 */
static int bands_cepstrum(lua_State *L) {
  static const char *const kinds[] = {"real", "power", NULL};
  size_t n;
  const double *x = check_record(L, 1, &n);
  bool power = luaL_checkoption(L, 2, NULL, kinds) == 1;
  double floor_share = luaL_optnumber(L, 3, 0);
  luaL_argcheck(L, floor_share >= 0 && floor_share <= 1, 3, "outside 0 .. 1");
  double *out = lbr_push_unset_samples(L, n);
  job *j = push_job(L, n, false);
  memcpy(j->x, x, n * sizeof *x);
  lbr_status status =
      lbr_cepstrum(j->transform, j->x, j->bins, floor_share, power);
  if (status == LBR_OK) memcpy(out, j->x, n * sizeof *out);
  pop_job(L);
  if (status == LBR_OK) return 1;
  return lbr_refuse(L, status, "cepstrum: a magnitude is 0 or not finite");
}

/***
 * A band of a record as an analytic signal.
 * @param x samples: the record, taken as one period
 * @param low number: low edge, cycles per sample, 0 or more
 * @param high number: high edge, cycles per sample, at most 1/2
 * @return samples: the in-phase part
 * @return samples: the quadrature part; raises where no bin lies in the band
 * @usage
 * local re, im = core.bands.analytic(core.samples.from { 1, 0, -1, 0 }, 0, 0.5)
 * assert(math.abs(re[1] - 1) < 1e-15 and math.abs(im[2] - 1) < 1e-15)
 */
static int bands_analytic(lua_State *L) {
  size_t n;
  const double *x = check_record(L, 1, &n);
  double low = luaL_checknumber(L, 2), high = luaL_checknumber(L, 3);
  double *re = lbr_push_unset_samples(L, n);
  double *im = lbr_push_unset_samples(L, n);
  job *j = push_job(L, n, true);
  memcpy(j->x, x, n * sizeof *x);
  lbr_status status =
      lbr_analytic(j->transform, low, high, j->x, j->y, j->bins, j->spare);
  memcpy(re, j->x, n * sizeof *re);
  memcpy(im, j->y, n * sizeof *im);
  pop_job(L);
  return status == LBR_OK ? 2 : lbr_raise(L, status, "band");
}

/***
 * Magnitudes of complex values.
 * @param re samples: real parts
 * @param im samples: imaginary parts, as many
 * @return samples: sqrt(re^2 + im^2)
 * @usage
 * local from = core.samples.from
 * assert(core.bands.magnitudes(from { 3 }, from { 4 })[1] == 5)
 */
static int bands_magnitudes(lua_State *L) {
  size_t n, m;
  const double *re = lbr_check_samples(L, 1, &n);
  const double *im = lbr_check_samples(L, 2, &m);
  luaL_argcheck(L, m == n, 2, "not as many values as the real parts");
  lbr_magnitudes(re, im, n, lbr_push_unset_samples(L, n));
  return 1;
}

/***
 * Spectral kurtosis of a record cut into segments.
 * @param x samples: the record
 * @param window samples: of a segment, as long as it
 * @param hop integer: samples from one segment to the next, 1 or more
 * @param unbiased boolean: 0 for noise at any number of segments
 * @return samples: the kurtosis of each bin
 * @return samples: the mean power of each bin, |X|^2
 * @return integer: segments; raises where there are fewer than 2
 * @usage
 * local w = core.samples.new(4):fill(1)
 * local k, power, n = core.bands.kurtosis(core.samples.new(8):fill(1), w, 4)
 * assert(n == 2 and k[1] == -1 and power[1] == 16)
 */
static int bands_kurtosis(lua_State *L) {
  size_t n, points;
  const double *x = lbr_check_samples(L, 1, &n);
  const double *w = check_record(L, 2, &points);
  size_t hop = lbr_check_count(L, 3, 1, LBR_TRANSFORM_MOST), bins;
  bool unbiased = lua_toboolean(L, 4);
  size_t segments = n < points ? 0 : (n - points) / hop + 1;
  luaL_argcheck(L, segments >= 2, 1, "fewer than two segments");
  bins = points / 2 + 1;
  double *squares = lbr_push_samples(L, bins);
  double *sum = lbr_push_samples(L, bins);
  job *j = push_job(L, points, false);
  for (size_t i = 0; i < segments; i++)
    lbr_kurtosis_add(j->transform, x + i * hop, w, j->x, j->bins, sum,
                     squares);
  pop_job(L);
  lbr_status status =
      lbr_kurtosis_of(sum, squares, bins, segments, unbiased, squares);
  if (status != LBR_OK) return lbr_raise(L, status, "kurtosis");
  for (size_t k = 0; k < bins; k++) sum[k] /= (double)segments;
  lua_pushinteger(L, (lua_Integer)segments);
  return 3;
}

static const luaL_Reg functions[] = {
    {"analytic", bands_analytic},
    {"at", bands_at},
    {"attenuation", bands_attenuation},
    {"band", bands_band},
    {"cepstrum", bands_cepstrum},
    {"groups", bands_groups},
    {"kurtosis", bands_kurtosis},
    {"limits", bands_limits},
    {"line_powers", bands_line_powers},
    {"magnitudes", bands_magnitudes},
    {"powers", bands_powers},
    {"weigh", bands_weigh},
    {"weighting", bands_weighting},
    {NULL, NULL}};

int lbr_open_bands(lua_State *L) {
  luaL_newlib(L, functions);
  return 1;
}
