#include "spectrum/envelope.h"

#include <math.h>

lbr_status lbr_analytic(const lbr_transform *transform, double low,
                        double high, double *re, double *im,
                        double complex *bins, double complex *spare) {
  size_t n = lbr_transform_points(transform), half = n / 2 + 1, kept = 0;
  if (!(low >= 0 && low <= high && high <= 0.5)) return LBR_DOMAIN;
  lbr_transform_forward(transform, re, bins);
  for (size_t k = 0; k < half; k++) {
    double f = (double)k / (double)n, a = creal(bins[k]), b = cimag(bins[k]);
    int in = f >= low && f <= high, once = k == 0 || 2 * k == n;
    kept += (size_t)in;
    bins[k] = in ? CMPLX(a, b) : CMPLX(0, 0);
    spare[k] = in && !once ? CMPLX(b, -a) : CMPLX(0, 0);
  }
  if (kept == 0) return LBR_DOMAIN;
  lbr_transform_back(transform, bins, re);
  lbr_transform_back(transform, spare, im);
  return LBR_OK;
}

void lbr_magnitudes(const double *re, const double *im, size_t n,
                    double *out) {
  for (size_t i = 0; i < n; i++) out[i] = sqrt(re[i] * re[i] + im[i] * im[i]);
}
