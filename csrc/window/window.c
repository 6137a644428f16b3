#include "window/window.h"

#include <math.h>
#include <string.h>

#include "window/cosine.h"
#include "window/families.h"

/* Shapes that are not cosine sums, one row per file of their own. */
static const lbr_window_shape *const families[] = {
    LBR_FAMILIES
};

#define FAMILIES (sizeof families / sizeof *families)

size_t lbr_window_shapes(void) { return lbr_cosine_rows() + FAMILIES; }

const lbr_window_shape *lbr_window_shape_at(size_t i) {
  size_t rows = lbr_cosine_rows();
  return i < rows ? lbr_cosine_row(i) : families[i - rows];
}

lbr_status lbr_window_find(const char *name, double parameter,
                           lbr_window *out) {
  for (size_t i = 0; i < lbr_window_shapes(); i++) {
    const lbr_window_shape *shape = lbr_window_shape_at(i);
    if (strcmp(shape->name, name) != 0) continue;
    if (!shape->parameter_name) {
      if (!isnan(parameter)) return LBR_DOMAIN;
      parameter = 0;
    } else if (isnan(parameter)) {
      parameter = shape->parameter_default;
    }
    if (shape->parameter_name && !(parameter >= shape->parameter_least &&
                                   parameter <= shape->parameter_most))
      return LBR_DOMAIN;
    *out = (lbr_window){shape, parameter};
    return LBR_OK;
  }
  return LBR_UNKNOWN;
}

/* sum_k (-1)^k a_k cos(k t) by Clenshaw's recurrence, c = -cos t. */
static double cosine_sum(const double *a, size_t terms, double c) {
  double u1 = 0, u2 = 0;
  for (size_t k = terms - 1; k > 0; k--) {
    double u = a[k] + 2 * c * u1 - u2;
    u2 = u1;
    u1 = u;
  }
  return a[0] + c * u1 - u2;
}

static void fill_cosine(const lbr_window_shape *shape, double *out, size_t n) {
  for (size_t i = 0; i <= n / 2; i++) {
    /* measured from the middle, so that the ends keep their small values */
    double c = -cos(2 * 3.14159265358979323846 * (double)i / (double)n);
    double value = cosine_sum(shape->terms_of, shape->terms, c);
    out[i] = value;
    if (i > 0) out[n - i] = value;
  }
}

lbr_status lbr_window_fill(const lbr_window *window, double *out, size_t n) {
  if (n == 0) return LBR_DOMAIN;
  if (window->shape->fill) return window->shape->fill(window, out, n);
  fill_cosine(window->shape, out, n);
  return LBR_OK;
}
