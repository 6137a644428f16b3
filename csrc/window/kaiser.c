/* Kaiser's window, I0(beta sqrt(1 - 4 u^2)) / I0(beta); beta = pi alpha.
 * Kaiser and Schafer, IEEE Trans. ASSP 28(1) 1980, 105-107; Harris 1978. */
#include <math.h>

#include "window/families.h"
#include "window/fit.h"

/* I0(x) exp(-top), by its power series; all terms are positive. */
static double bessel(double x, double top) {
  double quarter = x * x / 4, term = exp(-top), sum = term;
  for (int k = 1; term > 1e-18 * sum; k++) {
    term *= quarter / ((double)k * k);
    sum += term;
  }
  return sum;
}

static double shape(const void *context, double u) {
  double beta = *(const double *)context;
  double root = sqrt(fmax(0, (1 - 2 * u) * (1 + 2 * u)));
  return bessel(beta * root, beta) / bessel(beta, beta);
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

const lbr_window_shape lbr_kaiser_shape = {
    "kaiser", "Kaiser",
    "Kaiser and Schafer 1980; Harris 1978 (alpha = beta/pi)",
    0, {0}, "beta", 0, 40, 8.6, fill, expand, NULL};
