#include "lines/normal.h"

#include <math.h>

lbr_status lbr_normal_factor(double *g, size_t n, size_t width,
                             size_t *column) {
  for (size_t i = 0; i < n; i++) {
    double *row = g + i * width, full = row[i];
    for (size_t j = 0; j < i; j++) {
      const double *above = g + j * width;
      double rest = row[j];
      for (size_t k = 0; k < j; k++) rest -= row[k] * above[k];
      row[j] = rest / above[j];
    }
    double pivot = full;
    for (size_t k = 0; k < i; k++) pivot -= row[k] * row[k];
    if (!(pivot > LBR_NORMAL_LEAST * full)) {
      *column = i;
      return LBR_DOMAIN;
    }
    row[i] = sqrt(pivot);
  }
  return LBR_OK;
}

void lbr_normal_solve(const double *factor, size_t n, size_t width,
                      double *b) {
  for (size_t i = 0; i < n; i++) {
    const double *row = factor + i * width;
    for (size_t k = 0; k < i; k++) b[i] -= row[k] * b[k];
    b[i] /= row[i];
  }
  for (size_t i = n; i-- > 0;) {
    const double *row = factor + i * width;
    b[i] /= row[i];
    for (size_t k = 0; k < i; k++) b[k] -= row[k] * b[i];
  }
}

/* Rows of the inverse of the factor: column by column would jump. */
static void invert_factor(const double *factor, size_t n, size_t width,
                          double *out) {
  for (size_t i = 0; i < n; i++) {
    const double *row = factor + i * width;
    double *own = out + i * width;
    for (size_t k = 0; k < i; k++) own[k] = 0;
    for (size_t j = 0; j < i; j++) {
      const double *other = out + j * width;
      for (size_t k = 0; k <= j; k++) own[k] -= row[j] * other[k];
    }
    for (size_t k = 0; k < i; k++) own[k] /= row[i];
    own[i] = 1 / row[i];
  }
}

void lbr_normal_invert(const double *factor, size_t n, size_t width,
                       double *inverse) {
  invert_factor(factor, n, width, inverse);
  for (size_t i = 0; i < n; i++)
    for (size_t j = 0; j <= i; j++) {
      double sum = 0;
      for (size_t k = i; k < n; k++)
        sum += inverse[k * width + i] * inverse[k * width + j];
      inverse[i * width + j] = sum;
    }
}
