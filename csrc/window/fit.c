#include "window/fit.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/checked.h"

#define POINTS 192
#define COLUMNS (2 * LBR_SERIES_MOST)

/* Columns of the least squares problem and its right side. */
typedef struct fit {
  size_t columns, rank;
  double a[COLUMNS][POINTS]; /* a[j] is column j */
  double right[POINTS];
  size_t order[COLUMNS]; /* which term column j is */
} fit;

/* Points of 0 .. 1/2 that crowd at 1/2, moved to inner samples where the shape
 * has no others. */
static double point_at(double i, double count, size_t samples) {
  double u = 0.5 * sin(0.5 * LBR_PI * i / count), n = (double)samples;
  if (samples == 0) return u;
  double lag = samples % 2 ? 0.5 : 0;
  return (fmin(round(u * n - lag), n / 2 - 1 - lag) + lag) / n;
}

static void swap_columns(fit *f, size_t i, size_t j) {
  double kept[POINTS];
  size_t term = f->order[i];
  if (i == j) return;
  memcpy(kept, f->a[i], sizeof kept);
  memcpy(f->a[i], f->a[j], sizeof kept);
  memcpy(f->a[j], kept, sizeof kept);
  f->order[i] = f->order[j];
  f->order[j] = term;
}

static double norm_from(const double *x, size_t from) {
  double sum = 0;
  for (size_t i = from; i < POINTS; i++) sum += x[i] * x[i];
  return sqrt(sum);
}

/* x -= 2 v (v . x) / (v . v) over rows from .. */
static void reflect(double *x, const double *v, size_t from, double square) {
  double dot = 0;
  for (size_t i = from; i < POINTS; i++) dot += v[i] * x[i];
  dot *= 2 / square;
  for (size_t i = from; i < POINTS; i++) x[i] -= dot * v[i];
}

/* Makes the upper triangle; columns past .rank add nothing. */
static void factor(fit *f) {
  double first = 0, v[POINTS];
  for (f->rank = 0; f->rank < f->columns; f->rank++) {
    size_t k = f->rank, best = k;
    double most = 0;
    for (size_t j = k; j < f->columns; j++) {
      double size = norm_from(f->a[j], k);
      if (size > most) most = size, best = j;
    }
    if (k == 0) first = most;
    if (most <= 2e-15 * first) return;
    swap_columns(f, k, best);
    memcpy(v, f->a[k], sizeof v);
    double head = v[k] < 0 ? -most : most;
    v[k] += head;
    double square = 2 * most * fabs(v[k]);
    for (size_t j = k + 1; j < f->columns; j++) reflect(f->a[j], v, k, square);
    reflect(f->right, v, k, square);
    f->a[k][k] = -head;
  }
}

static void solve(const fit *f, lbr_series *out) {
  double x[COLUMNS] = {0};
  for (size_t k = f->rank; k-- > 0;) {
    double sum = f->right[k];
    for (size_t j = k + 1; j < f->rank; j++) sum -= f->a[j][k] * x[j];
    x[k] = sum / f->a[k][k];
  }
  for (size_t k = 0; k < f->columns; k++) {
    size_t term = f->order[k];
    if (term % 2)
      out->half.shape[term / 2] = x[k];
    else
      out->whole.shape[term / 2] = x[k];
  }
  out->whole.terms = out->half.terms = f->columns / 2;
}

double lbr_fit_value(const lbr_series *s, double u) {
  double sum = 0;
  for (size_t k = 0; k < s->whole.terms; k++)
    sum += s->whole.shape[k] * cos(2 * LBR_PI * (double)k * u);
  for (size_t k = 0; k < s->half.terms; k++)
    sum += s->half.shape[k] * cos(LBR_PI * (double)(2 * k + 1) * u);
  return sum;
}

static double misfit(lbr_even_shape shape, const void *context,
                     size_t samples, const lbr_series *s) {
  const int checks = 2 * POINTS + 1;
  double worst = 0, mean = 0, size = 0;
  for (int i = 0; i <= checks; i++) {
    double u = point_at(i, checks, samples), value = shape(context, u);
    worst = fmax(worst, fabs(lbr_fit_value(s, u) - value));
    /* du is proportional to cos of the angle */
    mean += value * cos(0.5 * LBR_PI * i / checks) * LBR_PI / 2 / checks;
  }
  for (size_t k = 0; k < s->whole.terms; k++)
    size += fabs(s->whole.shape[k]) + fabs(s->half.shape[k]);
  return (2 * worst + 2e-16 * size) / mean;
}

lbr_status lbr_fit_series(lbr_even_shape shape, const void *context,
                          size_t pairs, size_t samples, lbr_series *out) {
  fit *f = lbr_alloc(1, sizeof *f);
  if (!f) return LBR_NO_MEMORY;
  f->columns = 2 * pairs;
  for (size_t j = 0; j < f->columns; j++) f->order[j] = j;
  for (size_t i = 0; i < POINTS; i++) {
    double u = point_at((double)i + 0.5, POINTS, samples);
    f->right[i] = shape(context, u);
    for (size_t j = 0; j < f->columns; j++)
      f->a[j][i] = cos(LBR_PI * (double)j * u);
  }
  factor(f);
  solve(f, out);
  free(f);
  out->misfit = misfit(shape, context, samples, out);
  return LBR_OK;
}
