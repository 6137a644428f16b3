#include "lines/chance.h"

#include <math.h>

#define GRID 600      /* points of the integral over the floor's law */
#define STEPS 200
#define DEEPEST 9.2 /* log of the least floor over its median looked at */
#define TINY 1e-300

/* P(a, x) by its series, x < a + 1 (Abramowitz and Stegun 1964, 6.5.29). */
static double lower_series(double a, double x) {
  double term = 1 / a, sum = term;
  for (int k = 1; k < 100000 && term > 1e-17 * sum; k++) {
    term *= x / (a + k);
    sum += term;
  }
  return sum * exp(a * log(x) - x - lgamma(a));
}

/* Q(a, x) by its continued fraction, x >= a + 1 (the same, 6.5.31), evaluated
 * forwards by Lentz's method. */
static double upper_fraction(double a, double x) {
  double b = x + 1 - a, c = 1 / TINY, d = 1 / b, h = d;
  for (int k = 1; k < 100000; k++) {
    double an = -k * (k - a);
    b += 2;
    d = an * d + b;
    c = b + an / c;
    d = 1 / (fabs(d) < TINY ? TINY : d);
    if (fabs(c) < TINY) c = TINY;
    h *= d * c;
    if (fabs(d * c - 1) < 1e-16) break;
  }
  return h * exp(a * log(x) - x - lgamma(a));
}

double lbr_gamma_upper(double a, double x) {
  if (!(x > 0)) return 1;
  return x < a + 1 ? 1 - lower_series(a, x) : upper_fraction(a, x);
}

double lbr_chi_square_above(double nu, double y) {
  return lbr_gamma_upper(0.5 * nu, 0.5 * nu * y);
}

/* The root of a falling function between 0 and infinity, by halving what is
 * first bracketed by doubling. */
typedef double (*falling)(const void *context, double y);

static double root_of(falling f, const void *context, double target) {
  double lo = 0, hi = 1;
  for (int i = 0; i < STEPS && f(context, hi) > target; i++) {
    lo = hi;
    hi *= 2;
  }
  for (int i = 0; i < STEPS; i++) {
    double y = 0.5 * (lo + hi);
    if (y <= lo || y >= hi) break;
    if (f(context, y) > target)
      lo = y;
    else
      hi = y;
    if (hi - lo < 1e-14 * hi) break;
  }
  return 0.5 * (lo + hi);
}

static double above(const void *context, double y) {
  return lbr_chi_square_above(*(const double *)context, y);
}

double lbr_chi_square_level(double nu, double p) {
  return root_of(above, &nu, p);
}

/* The law of the sample median m of the cells: with F the law of a cell,
 * F(m) is Beta(r, r), r = (cells + 1) / 2 (H. A. David 1981, Order Statistics,
 * section 2.1).  Weights of the values y in the integral over it. */
typedef struct floor_law {
  double nu, median;
  double y[GRID], weight[GRID];
} floor_law;

static void fill_law(floor_law *law, double nu, double cells) {
  double r = 0.5 * (cells + 1), total = 0;
  law->nu = nu;
  law->median = lbr_chi_square_level(nu, 0.5);
  double a = 0.5 * nu, slope = (lbr_chi_square_above(nu, 0.99 * law->median) -
                                lbr_chi_square_above(nu, 1.01 * law->median)) /
                               0.02; /* of F by log y */
  double reach = 40 * 0.5 / (sqrt(cells) * slope); /* 40 deviations */
  double below = fmin(reach, DEEPEST), above_it = fmin(
      reach, log(lbr_chi_square_level(nu, 1e-12) / law->median));
  for (int i = 0; i < GRID; i++) {
    double step = (below + above_it) / GRID; /* of log y */
    double y = law->median * exp(step * (i + 0.5) - below);
    double q = lbr_chi_square_above(nu, y), p = 1 - q;
    double density = a * log(a * y) - a * y; /* y f(y), but for a constant */
    law->y[i] = y;
    law->weight[i] =
        p > 0 && q > 0
            ? exp((r - 1) * (log(4 * p) + log(q)) + density - a * log(a) + a)
            : 0;
    total += law->weight[i];
  }
  for (int i = 0; i < GRID; i++) law->weight[i] /= total;
}

static double alarm(const void *context, double factor) {
  const floor_law *law = context;
  double sum = 0;
  for (int i = 0; i < GRID; i++)
    if (law->weight[i] > 1e-30)
      sum += law->weight[i] *
             lbr_chi_square_above(law->nu, factor * law->y[i] / law->median);
  return sum;
}

/* The root on a grid that doubles, then by secants of the logarithm. */
double lbr_floor_factor(double nu, double cells, double p) {
  floor_law law;
  fill_law(&law, nu, cells);
  double lo = 0, hi = lbr_chi_square_level(nu, p), at_lo = 0;
  double at_hi = log(alarm(&law, hi) / p);
  for (int i = 0; i < STEPS && at_hi > 0; i++) {
    lo = hi;
    at_lo = at_hi;
    hi *= 1.25;
    at_hi = log(alarm(&law, hi) / p);
  }
  for (int i = 0; i < STEPS && hi - lo > 1e-10 * hi && lo > 0; i++) {
    double y = lo + (hi - lo) * at_lo / (at_lo - at_hi);
    if (!(y > lo && y < hi) || i % 3 == 2) y = 0.5 * (lo + hi);
    double at = log(alarm(&law, y) / p);
    if (at > 0) {
      lo = y;
      at_lo = at;
    } else {
      hi = y;
      at_hi = at;
    }
  }
  return hi;
}
