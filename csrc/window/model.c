/* Making a kernel: the series of a shape, and what bounds its remainders. */
#include "window/model.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/checked.h"

/* sum |w| |u|^power / |sum w| has its limit to a few parts in a thousand at 64
 * points; longer windows take that value with a quarter added. */
#define PROBE 64

static double shape_at(const lbr_series *s, double u) {
  double sum = 0;
  for (size_t k = 0; k < s->whole.count; k++)
    sum += s->whole.term[k] * cos(2 * LBR_PI * (double)k * u);
  for (size_t j = 0; j < s->half.count; j++)
    sum += s->half.term[j] * cos(2 * LBR_PI * ((double)j + 0.5) * u);
  return sum;
}

static lbr_spread spread_of(const lbr_series *s, size_t points) {
  lbr_spread sum = {0, 0, 0};
  for (size_t i = 0; i < points; i++) {
    double u = (double)i / (double)points - 0.5;
    double w = fabs(shape_at(s, u)), square = u * u;
    sum.none += w;
    sum.first += w * fabs(u);
    sum.sixth += w * square * square * square;
  }
  sum.none /= (double)points;
  sum.first /= (double)points;
  sum.sixth /= (double)points;
  return sum;
}

/* Closed forms serve all lengths for which the samples have no short series. */
static int is_closed(const lbr_kernel *k, size_t n) {
  return k->window.shape->closed && (n == 0 || n > LBR_SERIES_EXACT);
}

static void bound_derivatives(lbr_kernel *k) {
  const double h = 1.0 / LBR_GRID, turn = 2 * LBR_PI, half = LBR_PI;
  int probe = k->n == 0 || k->n > PROBE;
  int closed = is_closed(k, k->n);
  /* shapes in closed form fall from the middle: no wider than a rectangle */
  if (closed)
    k->spread = (lbr_spread){1, 0.25, 1.0 / 448};
  else if (!probe || !k->probed)
    k->spread = spread_of(&k->series, probe ? PROBE : k->n);
  k->probed = probe && !closed;
  lbr_spread sum = k->spread;
  double more = probe ? 1.25 : 1.0 + 1e-9;
  double edge = fabs(k->edge), misfit = closed ? 0 : k->series.misfit;
  double real = pow(turn, 6) * (sum.sixth * more + 1e-6);
  double sixth = real + 2 * edge * pow(half, 6);
  k->sixth = sixth;
  k->value_slack = sixth * pow(h, 6) / 46080 + misfit + 2e-13;
  k->slope_slack = 2.88e-4 * sixth * pow(h, 5) + LBR_PI * misfit + 1e-11;
  k->bend_slack = real * pow(h, 4) / 96 + 10 * misfit + 1e-9;
  k->slope_most = turn * (sum.first * more + 1e-6) + edge * half;
}

/* Samples of the window into the kernel's own memory. */
static lbr_status sample(lbr_kernel *k, size_t n) {
  if (n > k->work_size) {
    double *grown = lbr_alloc(n, sizeof *grown);
    if (!grown) return LBR_NO_MEMORY;
    free(k->work);
    k->work = grown;
    k->work_size = n;
  }
  return lbr_window_fill(&k->window, k->work, n);
}

static void take_terms(lbr_kernel *k) {
  const lbr_window_shape *shape = k->window.shape;
  k->series.half.terms = 0;
  k->series.whole.terms = shape->terms;
  memcpy(k->series.whole.shape, shape->terms_of, sizeof shape->terms_of);
}

/* The series of the window at length n: its own terms, an expansion for any
 * length, or for short records the transform of the samples. */
static lbr_status take_series(lbr_kernel *k, size_t n) {
  const lbr_window_shape *shape = k->window.shape;
  int own = shape->terms || (shape->expand && (n == 0 || n > LBR_SERIES_EXACT));
  if (own && k->expanded) return LBR_OK;
  k->expanded = own;
  k->probed = 0;
  k->series.misfit = 0;
  if (shape->terms) {
    take_terms(k);
    return LBR_OK;
  }
  if (own) return shape->expand(&k->window, &k->series);
  lbr_status status = sample(k, n);
  if (status == LBR_OK) lbr_series_from_samples(&k->series, k->work, n);
  return status;
}

/* How the transform is had at length n. */
static lbr_status take_transform(lbr_kernel *k, size_t n) {
  const lbr_closed *closed = k->window.shape->closed;
  if (is_closed(k, n)) {
    if (n == 0 && !closed->limit) return LBR_DOMAIN;
    k->edge = closed->edge(&k->window, n);
    return LBR_OK;
  }
  lbr_status status = take_series(k, n);
  if (status == LBR_OK) status = lbr_series_resize(&k->series, n);
  k->edge = k->series.edge;
  return status;
}

lbr_status lbr_kernel_resize(lbr_kernel *k, size_t n) {
  if (n != 0 && n < 4) return LBR_DOMAIN;
  lbr_status status = take_transform(k, n);
  if (status != LBR_OK) {
    k->expanded = 0;
    return status;
  }
  k->n = n;
  k->peak = 0;
  bound_derivatives(k);
  return LBR_OK;
}

lbr_status lbr_kernel_new(const lbr_window *window, size_t n,
                          lbr_kernel **out) {
  lbr_kernel *k = lbr_alloc(1, sizeof *k);
  if (!k) return LBR_NO_MEMORY;
  k->window = *window;
  lbr_status status = lbr_kernel_resize(k, n);
  if (status != LBR_OK) {
    lbr_kernel_free(k);
    return status;
  }
  *out = k;
  return LBR_OK;
}

void lbr_kernel_free(lbr_kernel *k) {
  if (!k) return;
  free(k->work);
  free(k);
}

void lbr_model_node(const lbr_kernel *k, size_t point, lbr_node *out) {
  if (is_closed(k, k->n))
    k->window.shape->closed->jet(&k->window, k->n, (double)point / LBR_GRID,
                                 out->real);
  else
    lbr_series_jet(&k->series, point, out->real);
  double sine = lbr_grid_sin(point), cosine = lbr_grid_sin(point + 8);
  out->edge[0] = k->edge * sine;
  out->edge[1] = k->edge * LBR_PI * cosine;
  out->edge[2] = -k->edge * LBR_PI * LBR_PI * sine;
}

double lbr_model_real(const lbr_kernel *k, double x) {
  double jet[3];
  if (!is_closed(k, k->n)) return lbr_series_real(&k->series, x);
  k->window.shape->closed->jet(&k->window, k->n, x, jet);
  return jet[0];
}

void lbr_model_beyond(const lbr_kernel *k, double x, double *value,
                      double *slope) {
  double edge = fabs(k->edge);
  if (is_closed(k, k->n)) {
    k->window.shape->closed->beyond(&k->window, k->n, x, value, slope);
  } else {
    lbr_series_beyond(&k->series, x, value, slope);
    *value += k->series.misfit;
    *slope += LBR_PI * k->series.misfit;
  }
  *value = hypot(*value, edge);
  *slope = fmin(hypot(*slope, edge * LBR_PI), k->slope_most);
}

double lbr_kernel_noise_bandwidth(const lbr_kernel *k) {
  if (is_closed(k, k->n))
    return k->window.shape->closed->bandwidth(&k->window, k->n);
  return lbr_series_noise_bandwidth(&k->series);
}
