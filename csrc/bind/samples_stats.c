/* How samples are distributed: moments, percentiles, histograms.
 */
#include <math.h>
#include <string.h>

#include "bind/samples.h"
#include "samples/measure.h"
#include "samples/moments.h"
#include "samples/raw.h"

#define MOST_BINS 16777216
#define BLOCK 1024

static lbr_moments check_moments(lua_State *L, size_t least) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  if (n < least)
    luaL_argerror(L, 1, lua_pushfstring(L, "%I samples; it takes %d or more",
                                        (LUAI_UACINT)n, (int)least));
  return lbr_moments_of(x, n);
}

/***
 * Variance: squared deviations from the mean, summed, over n - 1.
 * @return number: the variance, unit squared; raises below two samples
 * @usage
 * assert(core.samples.from { 1, 2, 3 }:variance() == 1)
 */
static int samples_variance(lua_State *L) {
  size_t count, least = 2;
  lbr_moments m = check_moments(L, least);
  lbr_check_samples(L, 1, &count);
  double n = (double)count;
  lua_pushnumber(L, m.second * (n / (n - 1)));
  return 1;
}

/***
 * Standard deviation: the root of the variance.
 * @return number: the standard deviation; raises below two samples
 * @usage
 * assert(core.samples.from { 1, 3, 5 }:deviation() == 2)
 */
static int samples_deviation(lua_State *L) {
  samples_variance(L);
  lua_pushnumber(L, sqrt(lua_tonumber(L, -1)));
  return 1;
}

/***
 * Skewness: third central moment over the 1.5th power of the second.
 * Both moments are means (over n).
 * @return number: 0 for a symmetric distribution, nan where all samples are
 *   the same; raises without samples
 * @usage
 * assert(core.samples.from { -1, 0, 1 }:skewness() == 0)
 */
static int samples_skewness(lua_State *L) {
  lbr_moments m = check_moments(L, 1);
  lua_pushnumber(L, m.third / (m.second * sqrt(m.second)));
  return 1;
}

/***
 * Kurtosis: fourth central moment over the square of the second.
 * Both moments are means (over n); 3 is not subtracted.
 * @return number: 3 for normal noise, 1.5 for a sine, nan where all samples
 *   are the same; raises without samples
 * @usage
 * assert(core.samples.from { -1, 1 }:kurtosis() == 1)
 */
static int samples_kurtosis(lua_State *L) {
  lbr_moments m = check_moments(L, 1);
  lua_pushnumber(L, m.fourth / (m.second * m.second));
  return 1;
}

/***
 * Crest factor: largest magnitude over root mean square.
 * @return number: 1 or more, sqrt(2) for a sine, nan for zeros; raises
 *   without samples
 * @usage
 * assert(core.samples.from { 3, -3 }:crest() == 1)
 */
static int samples_crest(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  luaL_argcheck(L, n > 0, 1, "no samples");
  lua_pushnumber(L, lbr_extremes_of(x, n).peak / lbr_rms(x, n));
  return 1;
}

static double check_percent(lua_State *L, int arg) {
  double percent = luaL_checknumber(L, arg);
  if (!(percent >= 0 && percent <= 100))
    luaL_argerror(L, arg, lua_pushfstring(L, "%f is outside 0 .. 100 percent",
                                          percent));
  return percent;
}

/***
 * Percentiles, by exact selection.
 * Between two samples the value is linear in the rank, percent / 100 (n - 1)
 * (definition 7 of Hyndman and Fan, 1996).
 * @param percent number: 0 (the smallest) to 100 (the largest); more numbers
 *   may follow
 * @return number: the percentile, one per argument; nan where a sample is no
 *   number; raises without samples
 * @usage
 * local x = core.samples.from { 4, 1, 3, 2, 5 }
 * local median, low = x:percentile(50, 10)
 * assert(median == 3 and low == 1.4)
 */
static int samples_percentile(lua_State *L) {
  size_t n;
  int last = lua_gettop(L);
  const double *x = lbr_check_samples(L, 1, &n);
  luaL_argcheck(L, n > 0, 1, "no samples");
  check_percent(L, 2);
  luaL_checkstack(L, last + 2, "percentiles");
  for (int arg = 2; arg <= last; arg++) check_percent(L, arg);
  double *own = lbr_push_unset_samples(L, n);
  memcpy(own, x, n * sizeof *own);
  for (int arg = 2; arg <= last; arg++)
    lua_pushnumber(L, lbr_percentile(own, n, lua_tonumber(L, arg)));
  return last - 1;
}

static int push_tails(lua_State *L, const lbr_tails *tails) {
  lua_pushinteger(L, (lua_Integer)tails->below);
  lua_pushinteger(L, (lua_Integer)tails->above);
  lua_pushinteger(L, (lua_Integer)tails->odd);
  return 4;
}

/***
 * Counts samples in equal bins.
 * @param low number: lower edge of the first bin
 * @param high number: upper edge of the last bin, above low
 * @param bins integer: how many, 1 to 2^24
 * @return samples: the counts; a bin holds its lower edge, the last both
 * @return integer: samples below low
 * @return integer: samples above high
 * @return integer: samples that are not numbers
 * @usage
 * local x = core.samples.from { 0, 0.5, 1, 2, 9 }
 * local count, below, above = x:histogram(0, 2, 2)
 * assert(count[1] == 2 and count[2] == 2 and below == 0 and above == 1)
 */
static int samples_histogram(lua_State *L) {
  size_t n;
  lbr_tails tails = {0, 0, 0};
  const double *x = lbr_check_samples(L, 1, &n);
  double low = luaL_checknumber(L, 2), high = luaL_checknumber(L, 3);
  luaL_argcheck(L, isfinite(low), 2, "the lower edge must be finite");
  luaL_argcheck(L, isfinite(high) && high > low && isfinite(high - low), 3,
                "the upper edge must be finite and above the lower one");
  size_t bins = lbr_check_count(L, 4, 1, MOST_BINS);
  luaL_argcheck(L, isfinite((double)bins / (high - low)), 3,
                "the edges are too close to each other");
  double *count = lbr_push_samples(L, bins);
  lbr_histogram(x, n, low, high, count, bins, &tails);
  return push_tails(L, &tails);
}

/* Edges of one bin a code over first .. last. */
static void count_codes(const void *data, size_t n, lbr_raw_kind kind,
                        double first, double *count, size_t bins,
                        lbr_tails *tails) {
  double block[BLOCK];
  const unsigned char *p = data;
  for (size_t at = 0; at < n; at += BLOCK) {
    size_t some = n - at < BLOCK ? n - at : BLOCK;
    lbr_raw_doubles(kind, p + at * lbr_raw_size(kind), some, 1, block);
    lbr_histogram(block, some, first - 0.5,
                  first + (double)bins - 0.5, count, bins, tails);
  }
}

int lbr_raw_codes(lua_State *L, const void *data, size_t n,
                  lbr_raw_kind kind) {
  lbr_tails tails = {0, 0, 0};
  lua_Integer least = kind == LBR_RAW_INT16 ? -32768 : 0;
  luaL_argcheck(L, kind != LBR_RAW_FLOAT32, 1, "floats have no codes");
  lua_Integer first = kind == LBR_RAW_INT16 ? luaL_optinteger(L, 2, least)
                                            : luaL_checkinteger(L, 2);
  lua_Integer last = kind == LBR_RAW_INT16 ? luaL_optinteger(L, 3, 32767)
                                           : luaL_checkinteger(L, 3);
  luaL_argcheck(L, first >= -2147483648LL && first <= 2147483647, 2,
                "no code of this kind");
  luaL_argcheck(L, last >= first && last - first < MOST_BINS, 3,
                "the last code must not be below the first, and no more than "
                "2^24 codes are counted");
  size_t bins = (size_t)(last - first) + 1;
  double *count = lbr_push_samples(L, bins);
  count_codes(data, n, kind, (double)first, count, bins, &tails);
  lua_pushinteger(L, (lua_Integer)tails.below);
  lua_pushinteger(L, (lua_Integer)tails.above);
  return 3;
}

const luaL_Reg lbr_samples_stats_methods[] = {
    {"variance", samples_variance},     {"deviation", samples_deviation},
    {"skewness", samples_skewness},     {"kurtosis", samples_kurtosis},
    {"crest", samples_crest},           {"percentile", samples_percentile},
    {"histogram", samples_histogram},   {NULL, NULL}};
