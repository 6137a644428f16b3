#include "samples/shape.h"

#include <math.h>

#include "samples/measure.h"

#define RUN 128
#define LANES 8
#define CLONES __attribute__((target_clones("avx512f", "avx2", "default")))

#define EACH(expression)                                \
  for (size_t i = 0; i < n; i++) out[i] = (expression); \
  return

void lbr_apply(lbr_function function, const double *x, double *out,
               size_t n) {
  switch (function) {
    case LBR_ABS: EACH(fabs(x[i]));
    case LBR_SQUARE: EACH(x[i] * x[i]);
    case LBR_SQRT: EACH(sqrt(x[i]));
    case LBR_LOG10: EACH(log10(x[i]));
    case LBR_LN: EACH(log(x[i]));
    case LBR_EXP: EACH(exp(x[i]));
    case LBR_ROUND: EACH(round(x[i]));
  }
}

CLONES static void clip(const double *x, double low, double high, double *out,
                        size_t n) {
  for (size_t i = 0; i < n; i++) {
    double v = x[i] < low ? low : x[i];
    out[i] = v > high ? high : v;
  }
}

void lbr_limit(const double *x, double low, double high, double *out,
              size_t n) {
  clip(x, low, high, out, n);
}

CLONES static double lever_run(const double *x, size_t n, double at,
                               double mean) {
  double lane[LANES] = {0};
  for (size_t i = 0; i < n; i += LANES) {
    size_t some = n - i < LANES ? n - i : LANES;
    for (size_t j = 0; j < some; j++)
      lane[j] += ((double)(i + j) + at) * (x[i + j] - mean);
  }
  return ((lane[0] + lane[4]) + (lane[2] + lane[6])) +
         ((lane[1] + lane[5]) + (lane[3] + lane[7]));
}

/* sum (i + at) (x[i] - mean), pairwise. */
static double lever(const double *x, size_t n, double at, double mean) {
  if (n <= RUN) return lever_run(x, n, at, mean);
  size_t half = (n / RUN + 1) / 2 * RUN;
  return lever(x, half, at, mean) +
         lever(x + half, n - half, at + (double)half, mean);
}

lbr_trend lbr_trend_of(const double *x, size_t n) {
  lbr_trend trend = {0, 0};
  if (n == 0) return trend;
  double count = (double)n;
  trend.mean = lbr_sum(x, n) / count;
  if (n < 2) return trend;
  trend.slope = lever(x, n, -0.5 * (count - 1), trend.mean) /
                (count * (count - 1) / 12 * (count + 1));
  return trend;
}

CLONES static void detrend(const double *x, lbr_trend trend, double *out,
                           size_t n) {
  double middle = 0.5 * ((double)n - 1);
  for (size_t i = 0; i < n; i++)
    out[i] = (x[i] - trend.mean) - trend.slope * ((double)i - middle);
}

void lbr_detrend(const double *x, lbr_trend trend, double *out, size_t n) {
  detrend(x, trend, out, n);
}

void lbr_differences(const double *x, double *out, size_t n) {
  for (size_t i = 0; i + 1 < n; i++) out[i] = x[i + 1] - x[i];
}

/* Neumaier's compensation (Z. angew. Math. Mech. 54 (1974) 39). */
void lbr_running_sum(const double *x, double *out, size_t n) {
  double sum = 0, lost = 0;
  for (size_t i = 0; i < n; i++) {
    double next = sum + x[i];
    lost += fabs(sum) >= fabs(x[i]) ? (sum - next) + x[i]
                                    : (x[i] - next) + sum;
    sum = next;
    out[i] = isfinite(sum) ? sum + lost : sum;
  }
}
