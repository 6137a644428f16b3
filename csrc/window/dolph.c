/* Dolph-Chebyshev: all side lobes of the symmetric window at one level, the
 * parameter in dB (Dolph, Proc. IRE 34(6) 1946, 335-348; Harris 1978).
 *
 * The transform of n + 1 symmetric samples is T_n(x0 cos(pi x / n)).  The
 * periodic window leaves one of the two end samples E out, which takes
 * E exp(i pi x) from it.  There is no limit shape: the end samples keep their
 * size while all others fall with the length. */
#include <math.h>
#include <stdlib.h>

#include "base/checked.h"

#include "window/closed.h"
#include "window/families.h"
#include "window/fit.h"
#include "window/jet.h"

#define DIRECT 512 /* samples up to which each one is summed */

/* x0 = cosh(width / n), T_n(x0) = cosh(width) = ratio. */
typedef struct plan {
  double n, ratio, width, rise; /* rise: x0 - 1 */
  double edge;                  /* E over ratio */
} plan;

static plan plan_of(const lbr_window *window, size_t n) {
  plan p;
  p.n = (double)n;
  p.ratio = pow(10, window->parameter / 20);
  p.width = acosh(p.ratio);
  double s = sinh(p.width / (2 * p.n));
  p.rise = 2 * s * s;
  p.edge = exp(p.n * log1p(p.rise)) / 2 / p.ratio;
  return p;
}

/* G = (n acos z)^2 and two derivatives by q = 1 - z, z >= 0; analytic at q = 0
 * and negative for z > 1: 2 sum (2 q)^k / (k^2 C(2 k, k)). */
static void square_angle(double n, double q, double out[3]) {
  double square = n * n, z = 1 - q, sides = q * (2 - q);
  if (fabs(q) > 0.1) {
    double root = sqrt(fabs(sides)), angle = q > 0 ? acos(z) : acosh(z);
    out[0] = q > 0 ? square * angle * angle : -square * angle * angle;
    out[1] = square * 2 * angle / root;
    out[2] = square * (2 - 2 * z * angle / root) / sides;
    return;
  }
  double term = 1, power = 1, second = 0; /* term: 2^k / (k^2 C(2 k, k)) */
  double value = q, first = 1;
  for (int k = 2; k < 24; k++) {
    term *= (k - 1.0) * (k - 1) / (k * (2.0 * k - 1));
    value += term * power * q * q;
    first += k * term * power * q;
    second += k * (k - 1.0) * term * power;
    power *= q;
  }
  out[0] = 2 * square * value;
  out[1] = 2 * square * first;
  out[2] = 2 * square * second;
}

/* cos sqrt(G) and two derivatives by G, over ratio. */
static void wave(double g, double ratio, double out[3]) {
  if (fabs(g) < 0.25) {
    double term = 1 / ratio; /* (-1)^k g^(k - 2) k (k - 1) / (2 k)! and such */
    out[0] = out[1] = out[2] = 0;
    for (int k = 0; k < 10; k++) {
      double j = k;
      out[0] += term * pow(g, j);
      if (k > 0) out[1] += term * j * pow(g, j - 1);
      if (k > 1) out[2] += term * j * (j - 1) * pow(g, j - 2);
      term /= -(2 * j + 1) * (2 * j + 2);
    }
    return;
  }
  double root = sqrt(fabs(g)), c, s; /* s: sin(root) / root */
  if (g > 0) {
    c = cos(root) / ratio;
    s = sin(root) / root / ratio;
  } else {
    c = cosh(root) / ratio;
    s = sinh(root) / root / ratio;
  }
  out[0] = c;
  out[1] = -s / 2;
  out[2] = (s - c) / (4 * g);
}

/* T_n(x0 cos(pi x / n)) / ratio */
static lbr_jet chebyshev(const plan *p, double x) {
  double thin = LBR_PI / p->n, sine = sin(thin * x / 2), g[3], w[3];
  double x0 = 1 + p->rise;
  lbr_jet q = {2 * x0 * sine * sine - p->rise, x0 * thin * sin(thin * x),
               x0 * thin * thin * cos(thin * x)};
  square_angle(p->n, q.v, g);
  wave(g[0], p->ratio, w);
  return lbr_jet_of(w[0], w[1], w[2], lbr_jet_of(g[0], g[1], g[2], q));
}

static void jet(const lbr_window *window, size_t n, double x, double out[3]) {
  plan p = plan_of(window, n);
  lbr_jet sum = chebyshev(&p, x);
  double c = p.edge * lbr_cos_pi(x), s = p.edge * lbr_sin_pi(x);
  lbr_jet_add(&sum, -1, (lbr_jet){c, -LBR_PI * s, -LBR_PI * LBR_PI * c});
  double scale = 1 / (1 - p.edge);
  out[0] = sum.v * scale;
  out[1] = sum.d * scale;
  out[2] = sum.dd * scale;
}

static double edge(const lbr_window *window, size_t n) {
  plan p = plan_of(window, n);
  return p.edge / (1 - p.edge);
}

/* Past the main lobe T_n is at most 1, and its derivative at most n x0 / pi
 * times pi / n steep in the angle: |d acos(x0 cos a) / da| falls to 1. */
static void beyond(const lbr_window *window, size_t n, double x, double *value,
                   double *slope) {
  plan p = plan_of(window, n);
  double sine = sin(LBR_PI * x / (2 * p.n));
  double q = 2 * (1 + p.rise) * sine * sine - p.rise;
  *value = *slope = INFINITY;
  if (!(q > 0)) return;
  double root = sqrt(q * (2 - q)), flat = (1 + p.rise) * sin(LBR_PI * x / p.n);
  /* |T - E exp(i pi x)| <= |T| + E, of which E sin is added at right angles */
  *value = sqrt(1 / p.ratio * (1 / p.ratio + 2 * p.edge)) / (1 - p.edge);
  *slope = LBR_PI * (flat / root / p.ratio + p.edge) / (1 - p.edge);
}

/* The sum of |W|^2 over all bins is N sum w^2. */
static double bandwidth(const lbr_window *window, size_t n) {
  double sum = 0, out[3], e = edge(window, n);
  for (size_t k = 0; k <= n / 2; k++) {
    jet(window, n, (double)k, out);
    double s = e * lbr_sin_pi((double)k), power = out[0] * out[0] + s * s;
    sum += k == 0 || 2 * k == n ? power : 2 * power;
  }
  return sum;
}

/* The transform on the n + 1 bins that make the symmetric samples: the first
 * n / 2 + 1 of them, and the samples' own count. */
typedef struct table {
  double *bins;
  size_t n;
  double middle;
} table;

/* The sample at u, over the middle one. */
static double sample(const void *context, double u) {
  const table *t = context;
  double n = (double)t->n, sum = t->bins[0];
  double turn = 2 * LBR_PI * u * n / (n + 1);
  /* an even count has a bin at half the rate, where T_n is 0 */
  for (size_t k = 1; k <= t->n / 2; k++)
    sum += 2 * t->bins[k] * cos(turn * (double)k);
  return sum / t->middle;
}

static lbr_status table_of(const plan *p, size_t n, table *out) {
  out->bins = lbr_alloc(n / 2 + 1, sizeof *out->bins);
  if (!out->bins) return LBR_NO_MEMORY;
  for (size_t k = 0; k <= n / 2; k++)
    out->bins[k] = chebyshev(p, (double)k * p->n / (p->n + 1)).v;
  out->n = n;
  out->middle = 1;
  out->middle = sample(out, n % 2 ? 0.5 / p->n : 0);
  return LBR_OK;
}

/* Inner samples of a long window from a fit through some of them. */
static lbr_status fill_fitted(const table *t, double *out) {
  lbr_series *s = lbr_alloc(1, sizeof *s);
  if (!s) return LBR_NO_MEMORY;
  lbr_status status = lbr_fit_series(sample, t, 20, t->n, s);
  for (size_t i = 1; status == LBR_OK && i <= t->n / 2; i++)
    out[i] = lbr_fit_value(s, 0.5 - (double)i / (double)t->n);
  free(s);
  return status;
}

static lbr_status fill(const lbr_window *window, double *out, size_t n) {
  plan p = plan_of(window, n);
  table t;
  lbr_status status = table_of(&p, n, &t);
  if (status != LBR_OK) return status;
  if (n > DIRECT)
    status = fill_fitted(&t, out);
  else
    for (size_t i = 1; i <= n / 2; i++)
      out[i] = sample(&t, 0.5 - (double)i / (double)n);
  for (size_t i = 1; i <= n / 2; i++) out[n - i] = out[i];
  out[0] = p.edge * (p.n + 1) / t.middle;
  free(t.bins);
  return status;
}

static const lbr_closed closed = {0, jet, edge, beyond, bandwidth};

const lbr_window_shape lbr_dolph_shape = {
    "dolph_chebyshev", "Dolph-Chebyshev", "Dolph 1946; Harris 1978",
    0, {0}, "side_lobe_db", 30, 150, 80, fill, NULL, &closed};
