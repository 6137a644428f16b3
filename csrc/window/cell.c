#include "window/cell.h"

#include <math.h>

#include "window/series.h"

static void hermite(const double *left, const double *right, double *b) {
  const double h = 1.0 / LBR_GRID;
  b[0] = left[0];
  b[1] = left[0] + h * left[1] / 5;
  b[2] = left[0] + 2 * h * left[1] / 5 + h * h * left[2] / 20;
  b[3] = right[0] - 2 * h * right[1] / 5 + h * h * right[2] / 20;
  b[4] = right[0] - h * right[1] / 5;
  b[5] = right[0];
}

void lbr_curve_between(const lbr_node *left, const lbr_node *right,
                       lbr_curve *out) {
  out->degree = 5;
  hermite(left->real, right->real, out->real);
  /* the edge part has the same sine at all points: zero is zero everywhere */
  out->real_only = left->edge[1] == 0 && right->edge[1] == 0 &&
                   left->edge[0] == 0 && right->edge[0] == 0;
  hermite(left->edge, right->edge, out->edge);
}

void lbr_curve_derive(const lbr_curve *curve, lbr_curve *out) {
  int degree = curve->degree;
  out->real_only = curve->real_only;
  for (int i = 0; i < degree; i++) {
    double scale = (double)degree * LBR_GRID;
    out->real[i] = scale * (curve->real[i + 1] - curve->real[i]);
    out->edge[i] = scale * (curve->edge[i + 1] - curve->edge[i]);
  }
  out->degree = degree - 1;
}

static inline double least_of(double a, double b) { return a < b ? a : b; }
static inline double most_of(double a, double b) { return a > b ? a : b; }

/* Keeps t1 <= t <= t2: first t <= t2, then t >= at = t1 / t2. */
static inline void keep(double *b, int degree, double t2, double at) {
  if (t2 < 1)
    for (int step = 1; step <= degree; step++)
      for (int i = degree; i >= step; i--)
        b[i] = b[i - 1] + t2 * (b[i] - b[i - 1]);
  if (at > 0)
    for (int step = 1; step <= degree; step++)
      for (int i = 0; i <= degree - step; i++) b[i] += at * (b[i + 1] - b[i]);
}

/* The same for a degree that the compiler knows. */
static void keep_part(double *b, int degree, double t2, double at) {
  if (degree == 5)
    keep(b, 5, t2, at);
  else
    keep(b, degree, t2, at);
}

void lbr_curve_part(lbr_curve *curve, double t1, double t2) {
  if (t1 <= 0 && t2 >= 1) return;
  double at = t2 > 0 ? least_of(t1 / t2, 1) : 0;
  keep_part(curve->real, curve->degree, t2, at);
  if (!curve->real_only) keep_part(curve->edge, curve->degree, t2, at);
}

/* Bounds of a curve without an edge part. */
static int hull_real(const lbr_curve *c, double *low, double *high) {
  const double *b = c->real;
  int n = c->degree;
  double least = b[0], most = b[0];
  for (int i = 1; i <= n; i++) {
    least = least_of(least, b[i]);
    most = most_of(most, b[i]);
  }
  *low = most_of(0, most_of(least, -most));
  *high = most_of(most, -least);
  return *high > most_of(fabs(b[0]), fabs(b[n]));
}

/* The curve lies in the hull of its coefficients: the farthest of them bounds
 * it from above, their nearest projection on the middle's direction and the
 * sign change of either part from below. */
static int hull(const lbr_curve *c, double *low, double *high) {
  if (c->real_only) return hull_real(c, low, high);
  int n = c->degree, top = 0;
  double most = 0, real_least = c->real[0], real_most = c->real[0];
  double edge_least = c->edge[0], edge_most = c->edge[0];
  double x = c->real[0] + c->real[n], y = c->edge[0] + c->edge[n];
  double length = sqrt(x * x + y * y), along = INFINITY;
  for (int i = 0; i <= n; i++) {
    double r = c->real[i], e = c->edge[i], size = r * r + e * e;
    if (size > most) most = size, top = i;
    real_least = least_of(real_least, r), real_most = most_of(real_most, r);
    edge_least = least_of(edge_least, e), edge_most = most_of(edge_most, e);
    along = least_of(along, r * x + e * y);
  }
  double r = most_of(0, most_of(real_least, -real_most));
  double e = most_of(0, most_of(edge_least, -edge_most));
  *low = sqrt(r * r + e * e);
  if (length > 0 && along > *low * length) *low = along / length;
  *high = sqrt(most);
  return top > 0 && top < n;
}

void lbr_curve_size(const lbr_curve *curve, double *low, double *high) {
  if (!hull(curve, low, high)) return;
  lbr_curve left = *curve, right = *curve;
  double low2, high2;
  lbr_curve_part(&left, 0, 0.5);
  lbr_curve_part(&right, 0.5, 1);
  hull(&left, low, high);
  hull(&right, &low2, &high2);
  *low = least_of(*low, low2);
  *high = most_of(*high, high2);
}
