#include "spectrum/response.h"

#include <math.h>

void lbr_coherence(const lbr_pair *p, double *out) {
  for (size_t k = 0; k < p->n; k++) {
    double size = hypot(p->re[k], p->im[k]);
    double g = size / p->xx[k] * (size / p->yy[k]);
    out[k] = g > 1 ? 1 : g;
  }
}

/* The real gain that stands before Sxy / |Sxy|^2, free of cancellation. */
static double total_gain(double xx, double yy, double cross2, double r) {
  double d = yy - r * xx, root = sqrt(d * d + 4 * r * cross2);
  return d >= 0 ? (d + root) / 2 : 2 * r * cross2 / (root - d);
}

void lbr_response(const lbr_pair *p, lbr_estimate estimate, double noise_ratio,
                  double *re, double *im) {
  for (size_t k = 0; k < p->n; k++) {
    double a = p->re[k], b = p->im[k], gain = 1 / p->xx[k];
    double cross2 = a * a + b * b;
    if (estimate == LBR_RESPONSE_H2)
      gain = p->yy[k] / cross2;
    else if (estimate == LBR_RESPONSE_TOTAL)
      gain = total_gain(p->xx[k], p->yy[k], cross2, noise_ratio) / cross2;
    re[k] = gain * a;
    im[k] = gain * b;
  }
}

void lbr_response_error(const double *coherence, size_t n, double averages,
                        double *out) {
  for (size_t k = 0; k < n; k++)
    out[k] = sqrt((1 - coherence[k]) / (2 * averages * coherence[k]));
}

/* Distance from peak k at which the power has fallen to a half going `step`
 * by step, linear in between; NAN: it meets an end or a larger value first. */
static double half_distance(const double *p, size_t n, size_t k, int step) {
  double half = p[k] / 2;
  size_t i = k;
  for (;;) {
    if (step < 0 ? i == 0 : i + 1 == n) return NAN;
    size_t next = step < 0 ? i - 1 : i + 1;
    if (p[next] > p[k]) return NAN;
    if (p[next] <= half) {
      double part = (p[i] - half) / (p[i] - p[next]);
      return fabs((double)i - (double)k) + part;
    }
    i = next;
  }
}

size_t lbr_narrow_peaks(const double *p, size_t n, double least,
                        lbr_narrow *out, size_t most) {
  size_t found = 0;
  for (size_t k = 1; k + 1 < n; k++) {
    if (!(p[k] > p[k - 1] && p[k] >= p[k + 1])) continue;
    double width = half_distance(p, n, k, -1) + half_distance(p, n, k, 1);
    if (!(width < least)) continue;
    if (found < most) out[found] = (lbr_narrow){k, width};
    found++;
  }
  return found;
}
