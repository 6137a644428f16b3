/* Samples made from samples: functions of each, trends, differences, sums.
 */
#ifndef LBR_SAMPLES_SHAPE_H
#define LBR_SAMPLES_SHAPE_H

#include <stddef.h>

typedef enum lbr_function {
  LBR_ABS,    /* |x| */
  LBR_SQUARE, /* x^2 */
  LBR_SQRT,   /* square root, nan below 0 */
  LBR_LOG10,  /* logarithm to base 10, -inf at 0, nan below */
  LBR_LN,     /* natural logarithm, likewise */
  LBR_EXP,    /* e^x */
  LBR_ROUND   /* nearest whole number, halves away from 0 */
} lbr_function;

/* out[i] = function of x[i]; out may be x. */
void lbr_apply(lbr_function function, const double *x, double *out, size_t n);

/* out[i] = x[i] held between low and high; nan stays; out may be x. */
void lbr_limit(const double *x, double low, double high, double *out, size_t n);

typedef struct lbr_trend {
  double mean;  /* of the samples, in their unit */
  double slope; /* unit per sample, through the mean at place (n - 1) / 2 */
} lbr_trend;

/* The straight line of least squares; slope 0 for n < 2. */
lbr_trend lbr_trend_of(const double *x, size_t n);

/* out[i] = x[i] - mean - slope (i - (n - 1) / 2); out may be x. */
void lbr_detrend(const double *x, lbr_trend trend, double *out, size_t n);

/* out[i] = x[i + 1] - x[i], n - 1 values; out may be x. */
void lbr_differences(const double *x, double *out, size_t n);

/* out[i] = x[0] + ... + x[i], with compensation: rounding does not grow with
 * i; out may be x. */
void lbr_running_sum(const double *x, double *out, size_t n);

#endif
