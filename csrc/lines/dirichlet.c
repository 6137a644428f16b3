#include "lines/dirichlet.h"

#include <math.h>
#include <stdbool.h>

#define PI 3.14159265358979323846264338328
#define NEAR 1.0 /* pi n |g| up to which the logarithm is differentiated */
#define TERMS 12 /* of the Taylor series below: 1e-18 at NEAR */

/* g = whole + rest; `odd` when the sign turns: (n - 1) whole is odd. */
static double reduce(double g, size_t n, bool *odd) {
  double whole = nearbyint(g);
  *odd = (n - 1) % 2 == 1 && fmod(fabs(whole), 2) == 1;
  return g - whole;
}

/* sin and cos of pi n d, reduced exactly before it is rounded. */
static void sin_cos(double n, double d, double *s, double *c) {
  double product = n * d, rest = fma(n, d, -product);
  double turn = product - 2 * nearbyint(0.5 * product) + rest;
  *s = sin(PI * turn);
  *c = cos(PI * turn);
}

double lbr_dirichlet(double g, size_t n) {
  bool odd;
  double s, c, d = reduce(g, n, &odd);
  if (d == 0) return odd ? -(double)n : (double)n;
  sin_cos((double)n, d, &s, &c);
  double sum = s / sin(PI * d);
  return odd ? -sum : sum;
}

/* cot x - 1 / x = (x cos x - sin x) / (x sin x) and its derivative
 * (sin^2 x - x^2) / (x sin x)^2, numerators and denominators by their Taylor
 * series, |x| <= NEAR. */
static void cot_rest(double x, double *value, double *slope) {
  double z = x * x, power = 1; /* x^2k / (2k + 1)! with its sign */
  double top = 0, sine = 1, square = 0, twice = 1;
  for (int k = 1; k <= TERMS; k++) {
    power *= -z / ((2 * k) * (2 * k + 1));
    twice *= -4 * z / ((2 * k - 1) * (2 * k)); /* (2x)^2k / (2k)! */
    sine += power;
    top += 2 * k * power;
    if (k > 1) square -= 0.5 * twice;
  }
  if (z == 0) {
    *value = 0;
    *slope = -1.0 / 3;
    return;
  }
  *value = top / (x * sine);
  *slope = square / (z * z * sine * sine);
}

/* sum = n (sin x / x) / (sin y / y), x = n y: derivatives of its logarithm,
 * which cancel nothing where the sum is near its peak. */
static lbr_closed_sums near_peak(double d, double n) {
  double cx, cy, sx, sy, y = PI * d, x = n * y;
  double sum = y == 0 ? n : sin(x) / sin(y);
  cot_rest(x, &cx, &sx);
  cot_rest(y, &cy, &sy);
  double first = cx - cy / n, second = sx - sy / (n * n); /* per x */
  return (lbr_closed_sums){sum, -0.5 * sum * first,
                           -0.25 * sum * (first * first + second)};
}

static lbr_closed_sums far_off(double d, double n) {
  double s, c, t = sin(PI * d), u = cos(PI * d);
  sin_cos(n, d, &s, &c);
  double sum = s / t, cot = u / t / n;
  double first = c / t - sum * cot; /* per x = pi n d */
  double second = -sum - 2 * cot * first + sum / (n * n);
  return (lbr_closed_sums){sum, -0.5 * first, -0.25 * second};
}

lbr_closed_sums lbr_dirichlet_sums(double g, size_t n) {
  bool odd;
  double d = reduce(g, n, &odd), count = (double)n;
  lbr_closed_sums sums = fabs(PI * count * d) <= NEAR ? near_peak(d, count)
                                                      : far_off(d, count);
  if (odd)
    sums = (lbr_closed_sums){-sums.cosine, -sums.ramp, -sums.square};
  return sums;
}

double lbr_square_sum(size_t n) {
  double count = (double)n;
  return (count * count - 1) / (12 * count);
}
