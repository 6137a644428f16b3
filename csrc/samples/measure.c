#include "samples/measure.h"

#include <math.h>

#define LANES 8
#define RUN 128 /* samples summed straight, in lanes */
#define CLONES __attribute__((target_clones("avx512f", "avx2", "default")))

static inline double lanes_sum(const double *lane) {
  return ((lane[0] + lane[4]) + (lane[2] + lane[6])) +
         ((lane[1] + lane[5]) + (lane[3] + lane[7]));
}

CLONES static double sum_run(const double *x, size_t n) {
  double lane[LANES] = {0};
  size_t i = 0;
  for (; i + LANES <= n; i += LANES)
    for (size_t j = 0; j < LANES; j++) lane[j] += x[i + j];
  for (size_t j = 0; i + j < n; j++) lane[j] += x[i + j];
  return lanes_sum(lane);
}

CLONES static double dot_run(const double *x, const double *y, size_t n) {
  double lane[LANES] = {0};
  size_t i = 0;
  for (; i + LANES <= n; i += LANES)
    for (size_t j = 0; j < LANES; j++) lane[j] += x[i + j] * y[i + j];
  for (size_t j = 0; i + j < n; j++) lane[j] += x[i + j] * y[i + j];
  return lanes_sum(lane);
}

/* Half of n, a whole number of runs. */
static size_t half_of(size_t n) { return (n / RUN + 1) / 2 * RUN; }

double lbr_sum(const double *x, size_t n) {
  if (n <= RUN) return sum_run(x, n);
  size_t half = half_of(n);
  return lbr_sum(x, half) + lbr_sum(x + half, n - half);
}

double lbr_dot(const double *x, const double *y, size_t n) {
  if (n <= RUN) return dot_run(x, y, n);
  size_t half = half_of(n);
  return lbr_dot(x, y, half) + lbr_dot(x + half, y + half, n - half);
}

/* Squares after division by the peak. */
static double scaled_rms(const double *x, size_t n) {
  double peak = lbr_extremes_of(x, n).peak, sum = 0;
  if (peak == 0 || !isfinite(peak)) return peak;
  for (size_t i = 0; i < n; i++) sum += (x[i] / peak) * (x[i] / peak);
  return peak * sqrt(sum / (double)n);
}

double lbr_rms(const double *x, size_t n) {
  double squares = lbr_dot(x, x, n);
  if (squares > 0x1p-900 && squares < INFINITY)
    return sqrt(squares / (double)n);
  return scaled_rms(x, n);
}

CLONES static lbr_extremes scan(const double *x, size_t n) {
  double least = x[0], most = x[0];
  int odd = 0;
  for (size_t i = 0; i < n; i++) {
    least = x[i] < least ? x[i] : least;
    most = x[i] > most ? x[i] : most;
    odd |= x[i] != x[i];
  }
  if (odd) return (lbr_extremes){NAN, NAN, NAN};
  return (lbr_extremes){least, most, fmax(-least, most)};
}

lbr_extremes lbr_extremes_of(const double *x, size_t n) { return scan(x, n); }
