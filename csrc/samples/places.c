#include "samples/places.h"

#include <math.h>

#include "base/checked.h"

#define PI 3.14159265358979323846
#define STEPS LBR_PLACES_STEPS
#define MOST_HALF ((size_t)1 << 14)
#define LANES 8
#define CLONES __attribute__((target_clones("avx512f", "avx2", "default")))

static double bessel_i0(double x) {
  double term = 1, sum = 1, quarter = x * x / 4;
  for (int k = 1; k < 500 && term > 1e-18 * sum; k++) {
    term *= quarter / ((double)k * k);
    sum += term;
  }
  return sum;
}

/* Kaiser's shape parameter for a rejection (see filter/fir.h). */
static double shape_of(double db) {
  if (db > 50) return 0.1102 * (db - 8.7);
  return db > 21 ? 0.5842 * pow(db - 21, 0.4) + 0.07886 * (db - 21) : 0;
}

static double kernel(double t, double ratio, double half, double beta) {
  double edge = t / half;
  if (fabs(edge) >= 1) return 0;
  double angle = PI * ratio * t;
  double cardinal = t == 0 ? 1 : sin(angle) / angle;
  return ratio * cardinal * bessel_i0(beta * sqrt((1 - edge) * (1 + edge))) /
         bessel_i0(beta);
}

lbr_status lbr_places_make(double keep, double ratio, double db,
                           lbr_places *out) {
  if (!(keep > 0 && keep < 0.5) || !(ratio > 0 && ratio <= 1) ||
      !(db >= 8 && db <= 140))
    return LBR_DOMAIN;
  db += 6;
  double width = (1 - 2 * keep) * ratio, beta = shape_of(db);
  double reach = ceil(0.5 * (db - 7.95) / (2.285 * 2 * PI * width) + 0.5);
  if (!(reach <= (double)MOST_HALF)) return LBR_OVERFLOW;
  size_t half = (size_t)reach, span = 2 * half;
  double *row = lbr_alloc(STEPS + 3, span * sizeof *row);
  if (!row) return LBR_NO_MEMORY;
  for (size_t s = 0; s < STEPS + 3; s++)
    for (size_t j = 0; j < span; j++) {
      double t = (double)j - (double)(half - 1) - ((double)s - 1) / STEPS;
      row[s * span + j] = kernel(t, ratio, (double)half, beta);
    }
  *out = (lbr_places){half, row};
  return LBR_OK;
}

/* Weights of four values at -1, 0, 1, 2 for a place f between 0 and 1. */
static void cubic_weights(double f, double w[4]) {
  w[0] = -f * (f - 1) * (f - 2) / 6;
  w[1] = (f + 1) * (f - 1) * (f - 2) / 2;
  w[2] = -(f + 1) * f * (f - 2) / 2;
  w[3] = (f + 1) * f * (f - 1) / 6;
}

static inline double weigh(const double *k, size_t span, const double w[4],
                           const double *x) {
  double lane[LANES] = {0}, rest = 0;
  const double *k1 = k + span, *k2 = k1 + span, *k3 = k2 + span;
  size_t i = 0;
  for (; i + LANES <= span; i += LANES)
    for (size_t j = 0; j < LANES; j++)
      lane[j] += x[i + j] * ((w[0] * k[i + j] + w[1] * k1[i + j]) +
                             (w[2] * k2[i + j] + w[3] * k3[i + j]));
  for (; i < span; i++)
    rest += x[i] * ((w[0] * k[i] + w[1] * k1[i]) +
                    (w[2] * k2[i] + w[3] * k3[i]));
  return (((lane[0] + lane[4]) + (lane[2] + lane[6])) +
          ((lane[1] + lane[5]) + (lane[3] + lane[7]))) + rest;
}

static double beyond(const double *x, size_t n, ptrdiff_t at) {
  ptrdiff_t last = (ptrdiff_t)n - 1;
  if (at >= 0 && at <= last) return x[at];
  double end = at < 0 ? x[0] : x[last];
  ptrdiff_t inside = at < 0 ? -at : 2 * last - at;
  return inside >= 0 && inside <= last ? 2 * end - x[inside] : end;
}

/* The same sum where the kernel leaves the record. */
static double weigh_end(const lbr_places *p, const double *k,
                        const double w[4], const double *x, size_t n,
                        ptrdiff_t from) {
  double sum = 0;
  size_t span = 2 * p->half;
  for (size_t i = 0; i < span; i++)
    sum += beyond(x, n, from + (ptrdiff_t)i) *
           ((w[0] * k[i] + w[1] * k[span + i]) +
            (w[2] * k[2 * span + i] + w[3] * k[3 * span + i]));
  return sum;
}

CLONES static void take(const lbr_places *p, const double *x, size_t n,
                        const double *at, double *y, size_t count) {
  size_t span = 2 * p->half;
  for (size_t i = 0; i < count; i++) {
    double w[4], whole = floor(at[i]), fine = (at[i] - whole) * STEPS;
    size_t step = (size_t)fine;
    ptrdiff_t from = (ptrdiff_t)whole - (ptrdiff_t)(p->half - 1);
    cubic_weights(fine - (double)step, w);
    const double *k = p->row + step * span;
    if (from >= 0 && (size_t)from + span <= n)
      y[i] = weigh(k, span, w, x + from);
    else
      y[i] = weigh_end(p, k, w, x, n, from);
  }
}

void lbr_places_take(const lbr_places *p, const double *x, size_t n,
                     const double *at, double *y, size_t count) {
  take(p, x, n, at, y, count);
}

void lbr_table_even(const double *table, size_t n, size_t per, double *y,
                    size_t count) {
  double w[4];
  for (size_t i = 0; i < count; i++) {
    double at = (double)i / (double)per;
    size_t cell = at > 1 ? (size_t)at : 1;
    if (cell > n - 3) cell = n - 3;
    cubic_weights(at - (double)cell, w);
    const double *t = table + (cell - 1);
    y[i] = (w[1] * t[1] + w[2] * t[2]) + (w[0] * t[0] + w[3] * t[3]);
  }
}
