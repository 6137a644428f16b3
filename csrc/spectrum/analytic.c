#include "spectrum/analytic.h"

#include <complex.h>
#include <string.h>

#include "spectrum/transform.h"

/* Times -i; 0 Hz and half the rate have no quadrature. */
static void turn(double complex *bins, size_t n) {
  bins[0] = 0;
  if (n % 2 == 0) bins[n / 2] = 0;
  for (size_t k = 1; k <= (n - 1) / 2; k++)
    bins[k] = CMPLX(cimag(bins[k]), -creal(bins[k]));
}

lbr_status lbr_quadrature(const double *x, size_t n, double *out) {
  lbr_transform *t = NULL;
  lbr_status status = lbr_transform_get(n, &t);
  if (status != LBR_OK) return status;
  double *scratch = lbr_transform_unset(n);
  double complex *bins =
      (double complex *)lbr_transform_unset(2 * (n / 2 + 1));
  if (scratch && bins) {
    lbr_transform_windowed(t, x, NULL, n, scratch, bins);
    turn(bins, n);
    lbr_transform_back(t, bins, scratch);
    memcpy(out, scratch, n * sizeof *out);
  } else {
    status = LBR_NO_MEMORY;
  }
  lbr_transform_drop(scratch);
  lbr_transform_drop(bins);
  lbr_transform_put(t);
  return status;
}
