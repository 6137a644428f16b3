#include "spectrum/kurtosis.h"

#include <math.h>

void lbr_kurtosis_add(const lbr_transform *transform, const double *x,
                      const double *w, double *scratch, double complex *bins,
                      double *sum, double *squares) {
  size_t n = lbr_transform_points(transform);
  lbr_transform_windowed(transform, x, w, n, scratch, bins);
  for (size_t k = 0; k <= n / 2; k++) {
    double a = creal(bins[k]), b = cimag(bins[k]), power = a * a + b * b;
    sum[k] += power;
    squares[k] += power * power;
  }
}

lbr_status lbr_kurtosis_of(const double *sum, const double *squares,
                           size_t bins, size_t segments, bool unbiased,
                           double *out) {
  if (segments < 2) return LBR_DOMAIN;
  double k = (double)segments;
  for (size_t i = 0; i < bins; i++) {
    double ratio = sum[i] > 0 ? squares[i] / (sum[i] * sum[i]) : NAN;
    out[i] = unbiased ? k / (k - 1) * ((k + 1) * ratio - 2) : k * ratio - 2;
  }
  return LBR_OK;
}
