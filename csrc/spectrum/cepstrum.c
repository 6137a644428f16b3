#include "spectrum/cepstrum.h"

#include <math.h>

lbr_status lbr_cepstrum(const lbr_transform *transform, double *x,
                        double complex *bins, double floor, bool power) {
  size_t n = lbr_transform_points(transform), half = n / 2 + 1;
  double largest = 0;
  if (!(floor >= 0 && floor <= 1)) return LBR_DOMAIN;
  lbr_transform_forward(transform, x, bins);
  for (size_t k = 0; k < half; k++) {
    double size = hypot(creal(bins[k]), cimag(bins[k]));
    bins[k] = CMPLX(size, 0);
    largest = fmax(largest, size);
  }
  for (size_t k = 0; k < half; k++) {
    double size = fmax(creal(bins[k]), floor * largest);
    if (!(size > 0) || !isfinite(size)) return LBR_DOMAIN;
    bins[k] = CMPLX((power ? 2 : 1) * log(size), 0);
  }
  lbr_transform_back(transform, bins, x);
  for (size_t i = 0; power && i < n; i++) x[i] *= x[i];
  return LBR_OK;
}
