#include "window/kernel.h"

#include <math.h>

#include "window/model.h"

/* fmin and fmax are calls, for the sake of values that are not numbers */
static inline double least_of(double a, double b) { return a < b ? a : b; }
static inline double most_of(double a, double b) { return a > b ? a : b; }

#define SEARCH 256 /* bins that are looked at before a bound must do */

/* An interval folded into 0 <= x <= N / 2. */
typedef struct stretch {
  double from, to;
} stretch;

/* At most three stretches whose images are the interval's. */
static int fold_interval(size_t n, double x1, double x2, stretch out[3]) {
  double n1 = (double)n, half = n1 / 2;
  if (x1 >= 0 && (n == 0 || x2 <= half)) {
    out[0] = (stretch){x1, x2};
    return 1;
  }
  if (n == 0) {
    if (x1 < 0 && x2 > 0) {
      out[0] = (stretch){0, most_of(-x1, x2)};
      return 1;
    }
    out[0] = (stretch){-x2, -x1};
    return 1;
  }
  if (!(x2 - x1 < n1)) {
    out[0] = (stretch){0, half};
    return 1;
  }
  double start = remainder(x1, n1), end = start + (x2 - x1);
  int count = 0;
  while (count < 3) {
    double edge = half * (floor(start / half) + 1), stop = least_of(edge, end);
    double a = fabs(remainder(start, n1)), b = fabs(remainder(stop, n1));
    out[count++] = (stretch){least_of(a, b), most_of(a, b)};
    if (stop >= end) break;
    start = edge;
  }
  return count;
}

/* Walks over the cells of a stretch, one shared node apart. */
typedef struct walk {
  const lbr_kernel *kernel;
  stretch over;
  size_t point, last; /* cell in hand, and the last one */
  lbr_node left, right;
} walk;

static void walk_start(walk *w, const lbr_kernel *k, stretch over) {
  size_t most = k->n ? LBR_GRID * k->n / 2 - 1 : (size_t)-1;
  w->kernel = k;
  w->over = over;
  w->point = (size_t)(over.from * LBR_GRID);
  w->last = (size_t)(over.to * LBR_GRID);
  if (w->last > w->point && (double)w->last >= over.to * LBR_GRID) w->last--;
  if (w->last > most) w->last = most;
  if (w->point > most) w->point = most;
  lbr_model_node(k, w->point, &w->right);
}

/* Readies the next cell; its part inside the stretch is t1 .. t2. */
static void walk_cell(walk *w, lbr_curve *curve, double *t1, double *t2) {
  double start = (double)w->point;
  w->left = w->right;
  lbr_model_node(w->kernel, w->point + 1, &w->right);
  lbr_curve_between(&w->left, &w->right, curve);
  *t1 = least_of(1, most_of(0, w->over.from * LBR_GRID - start));
  *t2 = most_of(*t1, least_of(1, w->over.to * LBR_GRID - start));
  w->point++;
}

/* True at whole bins where nothing farther out can exceed `high` by more than
 * one part in a thousand, with at
 * least one more bin, and so a zero of any far response, to come. */
static int settled(const walk *w, size_t first, double high, int slope,
                   double *bound) {
  double value, steep;
  if (w->point % LBR_GRID || w->point + LBR_GRID > w->last) return 0;
  lbr_model_beyond(w->kernel, (double)w->point / LBR_GRID, &value, &steep);
  *bound = slope ? steep : value;
  return *bound <= high * 1.001 || w->point - first > SEARCH * LBR_GRID;
}

static void range_over(const lbr_kernel *k, stretch over, double *low,
                       double *high) {
  walk w;
  lbr_curve curve;
  double t1, t2, least, most, bound;
  walk_start(&w, k, over);
  size_t first = w.point;
  while (w.point <= w.last) {
    if (settled(&w, first, *high, 0, &bound)) {
      *low = 0;
      *high = most_of(*high, bound);
      return;
    }
    walk_cell(&w, &curve, &t1, &t2);
    lbr_curve_part(&curve, t1, t2);
    lbr_curve_size(&curve, &least, &most);
    *low = least_of(*low, least);
    *high = most_of(*high, most);
  }
}

void lbr_kernel_range(lbr_kernel *k, double x1, double x2, double *low,
                      double *high) {
  stretch part[3];
  int parts = fold_interval(k->n, x1, x2, part);
  double least = INFINITY, most = 0;
  for (int i = 0; i < parts; i++) range_over(k, part[i], &least, &most);
  *low = most_of(0, least - k->value_slack);
  *high = most + k->value_slack;
}

double lbr_kernel_gain(const lbr_kernel *k, double x) {
  stretch at[3];
  fold_interval(k->n, x, x, at);
  double real = lbr_model_real(k, at[0].from);
  double edge = k->edge * lbr_sin_pi(at[0].from);
  return hypot(real, edge);
}

static double slope_over(const lbr_kernel *k, stretch over, double most) {
  walk w;
  lbr_curve curve, steep;
  double t1, t2, low, high, bound;
  walk_start(&w, k, over);
  size_t first = w.point;
  while (w.point <= w.last) {
    if (settled(&w, first, most, 1, &bound)) return most_of(most, bound);
    walk_cell(&w, &curve, &t1, &t2);
    lbr_curve_derive(&curve, &steep);
    lbr_curve_part(&steep, t1, t2);
    lbr_curve_size(&steep, &low, &high);
    most = most_of(most, high);
  }
  return most;
}

double lbr_kernel_slope(lbr_kernel *k, double x1, double x2) {
  stretch part[3];
  int parts = fold_interval(k->n, x1, x2, part);
  double most = 0;
  for (int i = 0; i < parts; i++) most = slope_over(k, part[i], most);
  return least_of(most + k->slope_slack, k->slope_most);
}

double lbr_kernel_curvature(lbr_kernel *k, double radius) {
  walk w;
  lbr_curve curve, steep, bend;
  double t1, t2, least = INFINITY;
  if (k->n) radius = least_of(radius, (double)k->n / 2);
  walk_start(&w, k, (stretch){0, most_of(radius, 0)});
  while (w.point <= w.last && least > 0) {
    walk_cell(&w, &curve, &t1, &t2);
    lbr_curve_derive(&curve, &steep);
    lbr_curve_derive(&steep, &bend);
    lbr_curve_part(&bend, t1, t2);
    for (int i = 0; i <= bend.degree; i++)
      least = least_of(least, -bend.real[i]);
  }
  return most_of(0, least - k->bend_slack);
}

double lbr_kernel_peak(lbr_kernel *k) {
  if (k->peak > 0) return k->peak;
  double low, high, far = k->n ? (double)k->n / 2 : 2 * SEARCH;
  lbr_kernel_range(k, 0, far, &low, &high);
  k->peak = lbr_kernel_absolute(k) <= 1 + 1e-12 ? 1 : most_of(1, high);
  return k->peak;
}

/* The first point of a cell that is not surely above the level. */
static double first_below(const lbr_kernel *k, const lbr_curve *cell,
                          double level) {
  double from = 0, to = 1, low, high;
  while (to - from > 1e-9) {
    double middle = from + (to - from) / 2;
    lbr_curve part = *cell;
    lbr_curve_part(&part, from, middle);
    lbr_curve_size(&part, &low, &high);
    if (low - k->value_slack > level)
      from = middle;
    else
      to = middle;
  }
  return from;
}

double lbr_kernel_reach(lbr_kernel *k, double level) {
  walk w;
  lbr_curve curve;
  double t1, t2, low, high;
  double far = k->n ? (double)k->n / 2 : 4 * SEARCH;
  if (level >= 1) return 0;
  walk_start(&w, k, (stretch){0, far});
  while (w.point <= w.last) {
    walk_cell(&w, &curve, &t1, &t2);
    lbr_curve_size(&curve, &low, &high);
    if (low - k->value_slack > level) continue;
    double t = first_below(k, &curve, level);
    if (t < 1 - 1e-8) return ((double)(w.point - 1) + t) / LBR_GRID;
  }
  return INFINITY;
}
