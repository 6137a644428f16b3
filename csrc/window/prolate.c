/* The prolate spheroidal (Slepian) window of order zero: of all shapes of its
 * length the one with the largest share of its energy within +-p bins, p the
 * time-bandwidth product.  Sampled from the continuous function, so that the
 * shape is the same for every length; the sequence that is optimal for one
 * length differs from it by a few parts in the length.
 *
 * Slepian and Pollak, Bell Syst. Tech. J. 40 (1961) 43-63; expansion in
 * Legendre polynomials: Bouwkamp, J. Math. Phys. 26 (1947) 79-92. */
#include <math.h>

#include "window/families.h"
#include "window/fit.h"

#define DEGREES 64 /* even degrees 0, 2, ... of the expansion */

typedef struct slepian {
  double part[DEGREES]; /* factors of P_0, P_2, ...; 1 in the middle */
} slepian;

/* The symmetric tridiagonal problem of the even degrees. */
static void matrix(double c, double *diagonal, double *beside) {
  for (int i = 0; i < DEGREES; i++) {
    double k = 2 * i;
    diagonal[i] = k * (k + 1) + c * c * (2 * k * (k + 1) - 1) /
                                    ((2 * k + 3) * (2 * k - 1));
    beside[i] = c * c * (k + 2) * (k + 1) /
                ((2 * k + 3) * sqrt((2 * k + 1) * (2 * k + 5)));
  }
}

/* x := T^-1 x for the factored T (positive definite), then to length 1. */
static void step(const double *pivot, const double *low, double *x) {
  double sum = 0;
  for (int i = 1; i < DEGREES; i++) x[i] -= low[i - 1] * x[i - 1];
  for (int i = 0; i < DEGREES; i++) x[i] /= pivot[i];
  for (int i = DEGREES - 1; i-- > 0;) x[i] -= low[i] * x[i + 1];
  for (int i = 0; i < DEGREES; i++) sum += x[i] * x[i];
  for (int i = 0; i < DEGREES; i++) x[i] /= sqrt(sum);
}

/* sum of part times the even Legendre polynomials at t */
static double legendre(const slepian *s, double t) {
  double before = 1, now = t, sum = s->part[0];
  for (int k = 1; k < 2 * DEGREES - 2; k++) {
    double next = ((2 * k + 1) * t * now - k * before) / (k + 1);
    before = now;
    now = next;
    if (k % 2) sum += s->part[(k + 1) / 2] * now;
  }
  return sum;
}

/* The ground state by inverse iteration: the next even one is at least three
 * times as far from zero, so forty steps reach rounding. */
static slepian solve(double product) {
  double diagonal[DEGREES], beside[DEGREES], low[DEGREES], x[DEGREES];
  slepian s;
  matrix(LBR_PI * product, diagonal, beside);
  for (int i = 0; i < DEGREES; i++) {
    if (i > 0) diagonal[i] -= low[i - 1] * beside[i - 1];
    low[i] = beside[i] / diagonal[i];
    x[i] = i ? 0 : 1;
  }
  for (int i = 0; i < 40; i++) step(diagonal, low, x);
  for (int i = 0; i < DEGREES; i++) s.part[i] = x[i] * sqrt(2 * i + 0.5);
  double middle = legendre(&s, 0);
  for (int i = 0; i < DEGREES; i++) s.part[i] /= middle;
  return s;
}

static double shape(const void *context, double u) {
  return legendre(context, 2 * u);
}

static lbr_status fill(const lbr_window *window, double *out, size_t n) {
  slepian s = solve(window->parameter);
  for (size_t i = 0; i <= n / 2; i++) {
    double u = 0.5 - (double)i / (double)n;
    out[i] = shape(&s, u);
    if (i > 0) out[n - i] = out[i];
  }
  return LBR_OK;
}

static lbr_status expand(const lbr_window *window, lbr_series *out) {
  slepian s = solve(window->parameter);
  return lbr_fit_series(shape, &s, 24, 0, out);
}

const lbr_window_shape lbr_prolate_shape = {
    "prolate", "Prolate spheroidal (Slepian)", "Slepian and Pollak 1961",
    0, {0}, "product", 0.5, 10, 3, fill, expand, NULL};
