/* Powers of a cosine lobe, w = cos(pi u)^p, p = 1 .. 12 (Harris 1978). */
#include <math.h>

#include "window/families.h"
#include "window/series.h"

static lbr_status fill(const lbr_window *window, double *out, size_t n) {
  for (size_t i = 0; i < n; i++) {
    double lobe = sin(LBR_PI * (double)(i < n - i ? i : n - i) / (double)n);
    out[i] = pow(lobe, round(window->parameter));
  }
  return LBR_OK;
}

/* cos^p = 2^(1 - p) sum_j C(p, j) cos((p - 2 j) pi u), half of it at p = 2 j */
static lbr_status expand(const lbr_window *window, lbr_series *out) {
  size_t power = (size_t)lround(window->parameter);
  double term = ldexp(1, 1 - (int)power);
  for (size_t j = 0; 2 * j <= power; j++) {
    size_t twice = power - 2 * j;
    if (twice % 2)
      out->half.shape[twice / 2] = term;
    else
      out->whole.shape[twice / 2] = twice ? term : term / 2;
    term *= (double)(power - j) / (double)(j + 1);
  }
  out->whole.terms = power % 2 ? 0 : power / 2 + 1;
  out->half.terms = power % 2 ? (power + 1) / 2 : 0;
  out->misfit = 0;
  return LBR_OK;
}

const lbr_window_shape lbr_cosine_power_shape = {
    "cosine_power", "Power of a cosine lobe", "Harris 1978, Table I", 0, {0},
    "power", 1, 12, 1, fill, expand, NULL};
