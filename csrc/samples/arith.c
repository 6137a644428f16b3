#include "samples/arith.h"

#define EACH(expression)                                   \
  for (size_t i = 0; i < n; i++) out[i] = (expression);    \
  return

void lbr_arith(lbr_operation op, const double *x, const double *y, double *out,
               size_t n) {
  switch (op) {
    case LBR_ADD: EACH(x[i] + y[i]);
    case LBR_SUBTRACT: EACH(x[i] - y[i]);
    case LBR_MULTIPLY: EACH(x[i] * y[i]);
    case LBR_DIVIDE: EACH(x[i] / y[i]);
  }
}

static void number_before(lbr_operation op, double k, const double *x,
                          double *out, size_t n) {
  switch (op) {
    case LBR_ADD: EACH(k + x[i]);
    case LBR_SUBTRACT: EACH(k - x[i]);
    case LBR_MULTIPLY: EACH(k * x[i]);
    case LBR_DIVIDE: EACH(k / x[i]);
  }
}

static void number_behind(lbr_operation op, const double *x, double k,
                          double *out, size_t n) {
  switch (op) {
    case LBR_ADD: EACH(x[i] + k);
    case LBR_SUBTRACT: EACH(x[i] - k);
    case LBR_MULTIPLY: EACH(x[i] * k);
    case LBR_DIVIDE: EACH(x[i] / k);
  }
}

void lbr_arith_number(lbr_operation op, const double *x, double k,
                      bool number_first, double *out, size_t n) {
  if (number_first)
    number_before(op, k, x, out, n);
  else
    number_behind(op, x, k, out, n);
}

void lbr_add_scaled(double *x, const double *y, double factor, size_t n) {
  for (size_t i = 0; i < n; i++) x[i] += factor * y[i];
}

bool lbr_all_equal(const double *x, const double *y, size_t n) {
  for (size_t i = 0; i < n; i++)
    if (x[i] != y[i]) return false;
  return true;
}
