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
  hermite(left->edge, right->edge, out->edge);
}

void lbr_curve_derive(const lbr_curve *curve, lbr_curve *out) {
  int degree = curve->degree;
  for (int i = 0; i < degree; i++) {
    double scale = (double)degree * LBR_GRID;
    out->real[i] = scale * (curve->real[i + 1] - curve->real[i]);
    out->edge[i] = scale * (curve->edge[i + 1] - curve->edge[i]);
  }
  out->degree = degree - 1;
}

/* Keeps t <= at. */
static void keep_left(double *b, int degree, double at) {
  for (int step = 1; step <= degree; step++)
    for (int i = degree; i >= step; i--)
      b[i] = b[i - 1] + at * (b[i] - b[i - 1]);
}

/* Keeps t >= at. */
static void keep_right(double *b, int degree, double at) {
  for (int step = 1; step <= degree; step++)
    for (int i = 0; i <= degree - step; i++) b[i] += at * (b[i + 1] - b[i]);
}

void lbr_curve_part(lbr_curve *curve, double t1, double t2) {
  int degree = curve->degree;
  if (t2 < 1) {
    keep_left(curve->real, degree, t2);
    keep_left(curve->edge, degree, t2);
  }
  if (t1 <= 0) return;
  double at = t2 > 0 ? t1 / t2 : 0;
  keep_right(curve->real, degree, at < 1 ? at : 1);
  keep_right(curve->edge, degree, at < 1 ? at : 1);
}

/* The curve lies in the hull of its coefficients: the farthest of them bounds
 * it from above, their nearest projection on the middle's direction and the
 * sign change of either part from below. */
static int hull(const lbr_curve *c, double *low, double *high) {
  int n = c->degree, top = 0;
  double most = 0, real_least = c->real[0], real_most = c->real[0];
  double edge_least = c->edge[0], edge_most = c->edge[0];
  double x = c->real[0] + c->real[n], y = c->edge[0] + c->edge[n];
  double length = sqrt(x * x + y * y), along = INFINITY;
  for (int i = 0; i <= n; i++) {
    double r = c->real[i], e = c->edge[i], size = r * r + e * e;
    if (size > most) most = size, top = i;
    real_least = fmin(real_least, r), real_most = fmax(real_most, r);
    edge_least = fmin(edge_least, e), edge_most = fmax(edge_most, e);
    along = fmin(along, r * x + e * y);
  }
  double r = fmax(0, fmax(real_least, -real_most));
  double e = fmax(0, fmax(edge_least, -edge_most));
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
  *low = fmin(*low, low2);
  *high = fmax(*high, high2);
}
