#include "synth/warp.h"

#include <math.h>

#define PI 3.14159265358979323846
#define HALF LBR_WARP_HALF

/* Instant i without its jitter. */
static double instant(const lbr_warp *w, size_t i) {
  double t = (double)i;
  return t + w->shift + t * (w->stretch + w->bend * t / 2);
}

size_t lbr_warp_count(const lbr_warp *w, size_t n) {
  size_t low = 0, high = n;
  while (low < high) {
    size_t middle = low + (high - low) / 2;
    if (instant(w, middle) <= (double)(n - 1) + 0.5)
      low = middle + 1;
    else
      high = middle;
  }
  return low;
}

/* x[k], continued by odd reflection once, then held. */
static double sample_at(const double *x, int64_t n, int64_t k) {
  if (k >= 0 && k < n) return x[k];
  int64_t end = k < 0 ? 0 : n - 1, mirror = 2 * end - k;
  if (mirror < 0) mirror = 0;
  if (mirror >= n) mirror = n - 1;
  return 2 * x[end] - x[mirror];
}

static double window_of(double c) {
  return 0.35875 + c * (0.48829 + c * 0.14128 * 2 + c * c * 0.01168 * 4) -
         0.14128 - 3 * c * 0.01168;
}

/* The record at t; the window's cosine is turned from tap to tap. */
static double value_at(const double *x, int64_t n, double t) {
  double whole = floor(t), part = t - whole, sum = 0;
  int64_t k = (int64_t)whole;
  if (part == 0) return sample_at(x, n, k);
  double angle = PI * (part + HALF - 1) / HALF;
  double c = cos(angle), s = sin(angle);
  double step_c = cos(PI / HALF), step_s = -sin(PI / HALF);
  double sign = sin(PI * part) / PI * ((HALF - 1) % 2 ? -1 : 1);
  for (int64_t j = 1 - HALF; j <= HALF; j++) {
    double d = part - (double)j, turned = c * step_c - s * step_s;
    sum += sample_at(x, n, k + j) * window_of(c) * sign / d;
    s = s * step_c + c * step_s;
    c = turned;
    sign = -sign;
  }
  return sum;
}

void lbr_warp_run(const lbr_warp *w, const double *x, size_t n, double *out,
                  size_t count) {
  uint64_t held = UINT64_MAX;
  double g = 0, last = (double)n + HALF;
  for (size_t i = 0; i < count; i++) {
    uint64_t number = w->sigma != 0 ? i / w->period : 0;
    if (w->sigma != 0 && number != held)
      lbr_random_gaussian(&w->key, number, &g, 1);
    held = number;
    double t = instant(w, i) + w->sigma * g;
    out[i] = value_at(x, (int64_t)n, fmax(-HALF, fmin(last, t)));
  }
}
