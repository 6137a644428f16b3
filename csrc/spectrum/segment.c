#include "spectrum/segment.h"

#include "samples/measure.h"

#define CLONES __attribute__((target_clones("avx512f", "avx2", "default")))

CLONES static void window_plain(const double *restrict x,
                                const double *restrict w, size_t n,
                                double *restrict out) {
  for (size_t i = 0; i < n; i++) out[i] = w[i] * x[i];
}

CLONES static void window_less(const double *restrict x,
                               const double *restrict w, size_t n,
                               double level, double *restrict out) {
  for (size_t i = 0; i < n; i++) out[i] = w[i] * (x[i] - level);
}

/* Less level + slope (i - centre). */
CLONES static void window_line(const double *restrict x,
                               const double *restrict w, size_t n,
                               double level, double slope,
                               double *restrict out) {
  double centre = (double)(n - 1) / 2;
  for (size_t i = 0; i < n; i++)
    out[i] = w[i] * ((x[i] - level) - slope * ((double)(int)i - centre));
}

#define LANES 32
#define RUN 1024 /* samples summed straight, in lanes */

CLONES static double sum_run(const double *x, size_t n) {
  double lane[LANES] = {0}, sum = 0;
  size_t i = 0;
  for (; i + LANES <= n; i += LANES)
    for (size_t j = 0; j < LANES; j++) lane[j] += x[i + j];
  for (size_t j = 0; i + j < n; j++) lane[j] += x[i + j];
  for (size_t j = 0; j < LANES; j++) sum += lane[j];
  return sum;
}

/* Enough lanes to keep up with memory, which lbr_sum has not. */
static double mean_of(const double *x, size_t n) {
  double sum = 0;
  for (size_t from = 0; from < n; from += RUN)
    sum += sum_run(x + from, n - from < RUN ? n - from : RUN);
  return sum / (double)n;
}

#define BLOCK 128

/* Slope of the line of least squares: sum (i - c) x / sum (i - c)^2, by
 * blocks, the level taken off first. */
static double slope_of(const double *x, size_t n, double level) {
  double c = (double)(n - 1) / 2, sum = 0, m = (double)n;
  double ramp[BLOCK], less[BLOCK];
  for (size_t from = 0; from < n; from += BLOCK) {
    size_t count = n - from < BLOCK ? n - from : BLOCK;
    for (size_t i = 0; i < count; i++) {
      ramp[i] = (double)(from + i) - c;
      less[i] = x[from + i] - level;
    }
    sum += lbr_dot(ramp, less, count);
  }
  return n > 1 ? sum / (m * (m - 1) * (m + 1) / 12) : 0;
}

void lbr_segment_window(const double *x, const double *w, size_t n,
                        lbr_detrend detrend, double *out) {
  if (detrend == LBR_DETREND_NONE) {
    window_plain(x, w, n, out);
    return;
  }
  double level = mean_of(x, n);
  if (detrend == LBR_DETREND_MEAN)
    window_less(x, w, n, level, out);
  else
    window_line(x, w, n, level, slope_of(x, n, level), out);
}

CLONES static void add_power(const double *restrict z, size_t count,
                             double *restrict sum) {
  for (size_t k = 0; k < count; k++)
    sum[k] += z[2 * k] * z[2 * k] + z[2 * k + 1] * z[2 * k + 1];
}

CLONES static void set_power(const double *restrict z, size_t count,
                             double *restrict power) {
  for (size_t k = 0; k < count; k++)
    power[k] = z[2 * k] * z[2 * k] + z[2 * k + 1] * z[2 * k + 1];
}

CLONES static void most_power(const double *restrict z, size_t count,
                              double *restrict most) {
  for (size_t k = 0; k < count; k++) {
    double p = z[2 * k] * z[2 * k] + z[2 * k + 1] * z[2 * k + 1];
    most[k] = p > most[k] || p != p ? p : most[k];
  }
}

/* Real and imaginary sums apart: gcc 12 makes fused products with other bits
 * of the interleaved form, -ffp-contract=off or not. */
CLONES static void add_cross(const double *restrict a, const double *restrict b,
                             size_t count, double *restrict re,
                             double *restrict im) {
  for (size_t k = 0; k < count; k++) {
    double ar = a[2 * k], ai = a[2 * k + 1];
    double br = b[2 * k], bi = b[2 * k + 1];
    re[k] += ar * br + ai * bi;
    im[k] += ar * bi - ai * br;
  }
}

void lbr_segment_add_power(const double complex *bins, size_t count,
                           double *sum) {
  add_power((const double *)bins, count, sum);
}

void lbr_segment_set_power(const double complex *bins, size_t count,
                           double *power) {
  set_power((const double *)bins, count, power);
}

void lbr_segment_most_power(const double complex *bins, size_t count,
                            double *most) {
  most_power((const double *)bins, count, most);
}

void lbr_segment_add_cross(const double complex *a, const double complex *b,
                           size_t count, double *re, double *im) {
  add_cross((const double *)a, (const double *)b, count, re, im);
}
