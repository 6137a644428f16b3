/* Gaussian, exp(-(alpha 2 u)^2 / 2), cut at the ends (Harris 1978). */
#include <math.h>

#include "window/families.h"
#include "window/fit.h"

static double shape(const void *context, double u) {
  double t = 2 * u * *(const double *)context;
  return exp(-0.5 * t * t);
}

static lbr_status fill(const lbr_window *window, double *out, size_t n) {
  for (size_t i = 0; i <= n / 2; i++) {
    double u = 0.5 - (double)i / (double)n;
    out[i] = shape(&window->parameter, u);
    if (i > 0) out[n - i] = out[i];
  }
  return LBR_OK;
}

static lbr_status expand(const lbr_window *window, lbr_series *out) {
  return lbr_fit_series(shape, &window->parameter, 24, 0, out);
}

const lbr_window_shape lbr_gaussian_shape = {
    "gaussian", "Gaussian", "Harris 1978 (alpha: half length over sigma)",
    0, {0}, "alpha", 0.5, 8, 3, fill, expand, NULL};
