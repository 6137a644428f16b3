#include "spectrum/bands.h"

#include <math.h>
#include <stdbool.h>

#define OCTAVE_LG 0.3  /* lg G */
#define FAINT 1e20     /* power ratio that is left out: 200 dB */

/* Table 1 of IEC 61260-1:2014: breakpoints G^e of octave bands, limits in dB.
 */
typedef struct row {
  double e;
  double least[2], most[2]; /* of class 1, class 2 */
} row;

static const row inside[] = {
    {0, {-0.4, -0.6}, {0.4, 0.6}},     {0.125, {-0.4, -0.6}, {0.5, 0.7}},
    {0.25, {-0.4, -0.6}, {0.7, 0.9}},  {0.375, {-0.4, -0.6}, {1.4, 1.7}},
    {0.5, {-0.4, -0.6}, {5.3, 5.8}},
};

static const row outside[] = {
    {0.5, {1.2, 0.8}, {INFINITY, INFINITY}},
    {1, {16.6, 15.6}, {INFINITY, INFINITY}},
    {2, {40.5, 39.5}, {INFINITY, INFINITY}},
    {3, {60, 54}, {INFINITY, INFINITY}},
    {4, {70, 60}, {INFINITY, INFINITY}},
};

#define ROWS 5

static bool fraction_good(int b) { return b >= 1 && b <= LBR_MOST_FRACTION; }

/* lg of the mid-band frequency over 1 Hz. */
static double lg_mid(int b, int x) {
  double steps = b % 2 ? 2.0 * x : 2.0 * x + 1;
  return 3 + OCTAVE_LG * steps / (2.0 * b);
}

lbr_status lbr_band_of(int b, int x, lbr_band *out) {
  if (!fraction_good(b) || x < -LBR_MOST_BAND || x > LBR_MOST_BAND)
    return LBR_DOMAIN;
  double lg = lg_mid(b, x), half = OCTAVE_LG / (2.0 * b);
  *out = (lbr_band){pow(10, lg), pow(10, lg - half), pow(10, lg + half)};
  return LBR_OK;
}

lbr_status lbr_band_at(int b, double hz, int *x) {
  lbr_band band;
  if (!fraction_good(b) || !(hz > 0) || !isfinite(hz)) return LBR_DOMAIN;
  double steps = (log10(hz) - 3) * b / OCTAVE_LG - (b % 2 ? 0 : 0.5);
  double number = floor(steps + 0.5);
  if (!(fabs(number) < LBR_MOST_BAND)) return LBR_DOMAIN;
  int guess = (int)number;
  for (int k = guess - 1; k <= guess + 1; k++) {
    lbr_status status = lbr_band_of(b, k, &band);
    if (status != LBR_OK) return status;
    if (hz >= band.low && hz < band.high) guess = k;
  }
  *x = guess;
  return LBR_OK;
}

/* lg of the breakpoint of 1/b octaves that stands for G^e. */
static double lg_breakpoint(int b, double e) {
  double narrow = pow(10, OCTAVE_LG / (2.0 * b)) - 1;
  double wide = pow(10, OCTAVE_LG / 2) - 1;
  return log10(1 + narrow / wide * (pow(10, OCTAVE_LG * e) - 1));
}

static double between(double at, double from, double to, double a, double b) {
  if (isinf(a) || isinf(b)) return a;
  return a + (b - a) * (at - from) / (to - from);
}

static void look_up(const row *rows, int b, int c, double lg, double *least,
                    double *most) {
  for (int i = 1; i < ROWS; i++) {
    double from = lg_breakpoint(b, rows[i - 1].e);
    double to = lg_breakpoint(b, rows[i].e);
    if (lg > to && i + 1 < ROWS) continue;
    double at = fmin(lg, to);
    *least = between(at, from, to, rows[i - 1].least[c], rows[i].least[c]);
    *most = between(at, from, to, rows[i - 1].most[c], rows[i].most[c]);
    return;
  }
}

lbr_status lbr_band_limits(int b, int class_number, double ratio,
                           double *least, double *most) {
  if (!fraction_good(b) || class_number < 1 || class_number > 2 ||
      !(ratio > 0) || !isfinite(ratio))
    return LBR_DOMAIN;
  double lg = fabs(log10(ratio));
  bool beyond = lg >= OCTAVE_LG / (2.0 * b);
  look_up(beyond ? outside : inside, b, class_number - 1, lg, least, most);
  return LBR_OK;
}

/* 1 / (e - 1 / e) */
static double edge_scale(int b) {
  double edge = pow(10, OCTAVE_LG / (2.0 * b));
  return 1 / (edge - 1 / edge);
}

static double power_of(double x, int n) {
  double result = 1;
  for (; n > 0; n >>= 1, x *= x)
    if (n & 1) result *= x;
  return result;
}

lbr_status lbr_band_attenuation(int b, int order, double ratio, double *db) {
  if (!fraction_good(b) || order < 1 || order > LBR_MOST_BAND_ORDER ||
      !(ratio > 0) || !isfinite(ratio))
    return LBR_DOMAIN;
  double x = (ratio - 1 / ratio) * edge_scale(b);
  *db = 10 * log1p(power_of(x * x, order)) / log(10);
  return LBR_OK;
}

/* Power of one band: from the first to the last bin that counts. */
static double band_power(const double *power, size_t bins, double step_hz,
                         double mid, double scale, int order, double reach) {
  double low = ceil(mid / reach / step_hz), high = mid * reach / step_hz;
  size_t k = low < 1 ? 1 : low < (double)bins ? (size_t)low : bins;
  size_t end = high < (double)bins ? (size_t)high + 1 : bins;
  double sum = 0, ratio_step = step_hz / mid;
  for (; k < end; k++) {
    double ratio = (double)k * ratio_step;
    double x = (ratio - 1 / ratio) * scale;
    sum += power[k] / (1 + power_of(x * x, order));
  }
  return sum;
}

lbr_status lbr_band_powers(const double *power, size_t bins, double step_hz,
                           int b, int order, int first, size_t count,
                           double *out) {
  lbr_band band;
  if (!(step_hz > 0) || !isfinite(step_hz) || order < 1 ||
      order > LBR_MOST_BAND_ORDER || !fraction_good(b) ||
      count > 2 * LBR_MOST_BAND)
    return LBR_DOMAIN;
  double scale = edge_scale(b);
  double x = pow(FAINT, 0.5 / order) / scale;
  double reach = (x + sqrt(x * x + 4)) / 2;
  for (size_t i = 0; i < count; i++) {
    lbr_status status = lbr_band_of(b, first + (int)i, &band);
    if (status != LBR_OK) return status;
    out[i] = band_power(power, bins, step_hz, band.mid, scale, order, reach);
  }
  return LBR_OK;
}
