/* The sum of |w| over that of w.
 *
 * Only cosine sums (flat tops) have negative samples.  Between two sign
 * changes of the shape the samples are a run of cosines, which has a closed
 * sum; short records are summed one by one. */
#include <math.h>

#include "window/model.h"

#define SCAN 512 /* steps in which sign changes are looked for */

/* The shape at the distance v from its edge, u = 1/2 - v. */
static double at_distance(const lbr_window_shape *shape, double v) {
  double sum = 0;
  for (size_t k = 0; k < shape->terms; k++)
    sum += (k % 2 ? -1 : 1) * shape->terms_of[k] *
           cos(2 * LBR_PI * (double)k * v);
  return sum;
}

static double sign_change(const lbr_window_shape *shape, double from,
                          double to) {
  double sign = at_distance(shape, from) < 0 ? -1 : 1;
  for (int i = 0; i < 60; i++) {
    double middle = (from + to) / 2;
    if (sign * at_distance(shape, middle) >= 0)
      from = middle;
    else
      to = middle;
  }
  return (from + to) / 2;
}

/* The sum of w over the samples p .. q counted from the edge, over N; or its
 * integral between distances for N = 0. */
static double run(const lbr_window_shape *shape, size_t n, double p, double q) {
  double sum = 0, count = n ? (q - p + 1) / (double)n : q - p;
  for (size_t k = 0; k < shape->terms; k++) {
    double half = LBR_PI * (double)k, middle = p + q, term = count;
    if (n) middle /= (double)n;
    if (k > 0)
      term = sin(half * count) /
             (n ? (double)n * sin(half / (double)n) : half) *
             cos(half * middle);
    sum += (k % 2 ? -1 : 1) * shape->terms_of[k] * term;
  }
  return sum;
}

/* Adds |run| of the samples after `first` and not beyond distance v. */
static double stretch(const lbr_window_shape *shape, size_t n, double *first,
                      double v) {
  double to = n ? floor(v * (double)n) : v, from = *first;
  if (to < from) return 0;
  *first = n ? to + 1 : to;
  return fabs(run(shape, n, from, to));
}

static double sum_of_sizes(const lbr_window_shape *shape, size_t n) {
  const double step = 0.5 / SCAN;
  double first = 0, half = 0, before = 0;
  for (int i = 1; i <= SCAN; i++) {
    double value = at_distance(shape, step * (i - 0.5));
    if (before * value < 0)
      half += stretch(shape, n, &first,
                      sign_change(shape, step * (i - 1.5), step * (i - 0.5)));
    before = value;
  }
  half += stretch(shape, n, &first, 0.5);
  if (n == 0) return 2 * half;
  /* the edge sample is there once, so is the middle one of even lengths */
  double once = fabs(at_distance(shape, 0));
  if (n % 2 == 0) once += fabs(at_distance(shape, 0.5));
  return 2 * half - once / (double)n;
}

double lbr_kernel_absolute(const lbr_kernel *k) {
  const lbr_window_shape *shape = k->window.shape;
  if (shape->terms == 0) return 1;
  if (k->n && k->n <= LBR_SERIES_EXACT) return k->spread.none;
  return fmax(1, sum_of_sizes(shape, k->n) / k->series.sum);
}
