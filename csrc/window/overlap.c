/* What overlapping records share: noise correlation and flatness of the sum,
 * on the samples of one length that many overlaps divide. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/checked.h"
#include "window/figures.h"
#include "window/fit.h"

#define LENGTH 10080 /* divisible by 2 .. 10; a sample is 0.01 % */
#define COARSE 42    /* first search; 1/2, 2/3, 3/4, 4/5, 5/6 are on it */
#define PLACES (LENGTH / COARSE)
#define STARTS 2     /* best places of it that are searched finely */

static double correlation_sampled(const double *w, size_t lag) {
  double cross = 0, power = 0;
  for (size_t i = 0; i < LENGTH; i++) power += w[i] * w[i];
  for (size_t i = 0; i + lag < LENGTH; i++) cross += w[i] * w[i + lag];
  /* halved ends: the periodic window leaves its last sample out */
  cross += (lag ? w[0] * w[LENGTH - lag] : 0) / 2 - w[0] * w[lag] / 2;
  return cross / power;
}

/* Integral of w(u) w(u + lag) for a cosine sum by Gauss's rule with five
 * points on panels short enough to be exact to rounding. */
static double product(const lbr_series *s, double lag) {
  static const double node[3] = {0, 0.53846931010568309104,
                                 0.90617984593866399280};
  static const double weight[3] = {0.56888888888888888889,
                                   0.47862867049936646804,
                                   0.23692688505618908751};
  const int panels = 200;
  double sum = 0, half = (1 - lag) / panels / 2;
  for (int i = 0; i < panels; i++)
    for (int j = -2; j <= 2; j++) {
      int a = abs(j);
      double u = -0.5 + half * (2 * i + 1 + (j < 0 ? -node[a] : node[a]));
      sum += weight[a] * lbr_fit_value(s, u) * lbr_fit_value(s, u + lag);
    }
  return sum * half;
}

static lbr_status fixed_overlaps(const lbr_window *window, const double *w,
                                 lbr_figures *out) {
  const lbr_window_shape *shape = window->shape;
  if (!shape->terms) {
    out->overlap_50 = correlation_sampled(w, LENGTH / 2);
    out->overlap_75 = correlation_sampled(w, LENGTH / 4);
    return LBR_OK;
  }
  lbr_series *s = lbr_alloc(1, sizeof *s);
  if (!s) return LBR_NO_MEMORY;
  s->whole.terms = shape->terms;
  memcpy(s->whole.shape, shape->terms_of, sizeof shape->terms_of);
  double power = product(s, 0);
  out->overlap_50 = product(s, 0.5) / power;
  out->overlap_75 = product(s, 0.25) / power;
  free(s);
  return LBR_OK;
}

/* Least over most of the sum of windows `hop` samples apart, or of squares. */
static double evenness(const double *w, size_t hop, int squares) {
  double least = INFINITY, most = 0;
  for (size_t i = 0; i < hop; i++) {
    double sum = 0;
    for (size_t j = i; j < LENGTH; j += hop)
      sum += squares ? w[j] * w[j] : w[j];
    least = fmin(least, sum);
    most = fmax(most, sum);
  }
  return least / most;
}

/* Windows with a step at their ends add up evenly at single overlaps (1/2,
 * 2/3) that a sample more or less would miss: the worst of three counts. */
static double merit(const double *w, size_t hop) {
  double even = evenness(w, hop, 0);
  even = fmin(even, evenness(w, hop - 1, 0));
  even = fmin(even, evenness(w, hop + 1, 0));
  return even - correlation_sampled(w, hop);
}

/* The best hop within reach of a place, from the value that has been found. */
static size_t refine(const double *w, size_t about, double *most) {
  size_t best = about;
  for (size_t hop = about - COARSE + 1; hop < about + COARSE; hop++) {
    double value = hop == about ? *most : merit(w, hop);
    if (value > *most) *most = value, best = hop;
  }
  return best;
}

/* Number of the best place of the coarse search; it is then struck out with
 * its neighbours. */
static size_t take_best(double *values, double *most) {
  size_t best = 1;
  for (size_t i = 1; i < PLACES; i++)
    if (values[i] > values[best]) best = i;
  *most = values[best];
  for (size_t i = best - 1; i <= best + 1 && i < PLACES; i++)
    values[i] = -INFINITY;
  return best;
}

static void recommend(const double *w, lbr_figures *out) {
  double values[PLACES], top = -INFINITY;
  size_t hop = LENGTH / 2;
  for (size_t i = 0; i < PLACES; i++) {
    size_t place = i * COARSE;
    values[i] = place < LENGTH / 20 ? -INFINITY : merit(w, place);
  }
  for (size_t i = 0; i < STARTS; i++) {
    double most;
    size_t place = take_best(values, &most) * COARSE;
    size_t fine = refine(w, place, &most);
    if (most > top) top = most, hop = fine;
  }
  out->overlap = 1 - (double)hop / LENGTH;
  out->amplitude_flatness = evenness(w, hop, 0);
  out->power_flatness = sqrt(fmax(0, evenness(w, hop, 1)));
  out->correlation = correlation_sampled(w, hop);
}

lbr_status lbr_figures_overlap(const lbr_window *window, lbr_figures *out) {
  double *w = lbr_alloc(LENGTH, sizeof *w);
  if (!w) return LBR_NO_MEMORY;
  lbr_status status = lbr_window_fill(window, w, LENGTH);
  if (status == LBR_OK) status = fixed_overlaps(window, w, out);
  if (status == LBR_OK) recommend(w, out);
  if (status == LBR_OK && window->shape->closed) {
    double sum = 0;
    for (size_t i = 0; i < LENGTH; i++) sum += w[i];
    out->coherent_gain = sum / LENGTH / w[LENGTH / 2];
  }
  free(w);
  return status;
}
