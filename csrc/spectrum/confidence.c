#include "spectrum/confidence.h"

#include <float.h>
#include <math.h>
#include <stdbool.h>

#include "samples/measure.h"

#define HALF_LOG_TWO_PI 0.91893853320467274178
#define MOST_TERMS 100000
#define MOST_STEPS 200

double lbr_effective_averages(const double *w, size_t n, size_t step,
                              size_t segments) {
  double power = lbr_dot(w, w, n), k = (double)segments, sum = 0;
  for (size_t j = 1; j < segments && j <= (n - 1) / step; j++) {
    double rho = lbr_dot(w, w + j * step, n - j * step) / power;
    sum += (1 - (double)j / k) * rho * rho;
  }
  return k / (1 + 2 * sum);
}

/* u - ln(1 + u), exact near 0 as well. */
static double less_log(double u) {
  if (fabs(u) > 0.1) return u - log1p(u);
  double term = u * u, sum = 0;
  for (int k = 2; k < 40 && fabs(term) > 1e-18 * fabs(sum); k++) {
    sum += (k % 2 ? -1 : 1) * term / k;
    term *= u;
  }
  return sum;
}

/* ln Gamma(a + 1) - (a + 1/2) ln a + a - ln(2 pi) / 2 for a >= 16: Stirling's
 * series (Abramowitz and Stegun 1964, 6.1.41). */
static double stirling_rest(double a) {
  double b = 1 / (a * a);
  return (1.0 / 12 - b * (1.0 / 360 - b * (1.0 / 1260 - b * (1.0 / 1680 -
          b / 1188)))) / a;
}

/* x^a exp(-x) / Gamma(a + 1), without overflow and without cancellation. */
static double front(double a, double x) {
  if (x <= 0) return 0;
  if (a < 16) return exp(a * log(x) - x) / tgamma(a + 1);
  double exponent = a * less_log((x - a) / a) + stirling_rest(a);
  return exp(-exponent - HALF_LOG_TWO_PI) / sqrt(a);
}

/* P by its series, x < a + 1 (Abramowitz and Stegun 1964, 6.5.29). */
static double share_series(double a, double x) {
  double term = 1, sum = 1;
  for (int k = 1; k < MOST_TERMS && term > DBL_EPSILON / 4 * sum; k++) {
    term *= x / (a + k);
    sum += term;
  }
  return sum * front(a, x);
}

/* 1 - P by its continued fraction, x >= a + 1 (6.5.31, even part), evaluated
 * forward in the manner of Lentz. */
static double rest_fraction(double a, double x) {
  double b = x + 1 - a, c = 1e300, d = 1 / b, product = d;
  for (int k = 1; k < MOST_TERMS; k++) {
    double an = -k * (k - a);
    b += 2;
    d = 1 / (an * d + b);
    c = b + an / c;
    product *= d * c;
    if (fabs(d * c - 1) < DBL_EPSILON) break;
  }
  return product * a * front(a, x);
}

double lbr_gamma_share(double a, double x, double *upper) {
  if (x < a + 1) {
    double lower = share_series(a, x);
    *upper = 1 - lower;
    return lower;
  }
  *upper = rest_fraction(a, x);
  return 1 - *upper;
}

/* Standard normal quantile to some 1e-3, a start for the search (Abramowitz
 * and Stegun 1964, 26.2.23). */
static double normal_near(double p) {
  double t = sqrt(-2 * log(p < 0.5 ? p : 1 - p));
  double z = t - (2.515517 + t * (0.802853 + t * 0.010328)) /
                     (1 + t * (1.432788 + t * (0.189269 + t * 0.001308)));
  return p < 0.5 ? -z : z;
}

/* Start: Wilson and Hilferty 1931; near 0 the first term of the series. */
static double start_of(double a, double p) {
  double z = normal_near(p), b = 1 / (9 * a);
  double root = 1 - b + z * sqrt(b);
  double x = a * root * root * root;
  if (root > 0.1) return x;
  double small = exp((log(p) + log(tgamma(a + 1))) / a);
  return small > 0 ? small : DBL_MIN;
}

lbr_status lbr_chi_square_quantile(double dof, double p, double *out) {
  if (!(dof > 0 && isfinite(dof) && p > 0 && p < 1)) return LBR_DOMAIN;
  double a = dof / 2, x = start_of(a, p), low = 0, high = INFINITY;
  for (int i = 0; i < MOST_STEPS; i++) {
    double upper, lower = lbr_gamma_share(a, x, &upper);
    double miss = p < 0.5 ? lower - p : (1 - p) - upper;
    if (miss > 0) high = x; else low = x;
    double slope = a * front(a, x) / x;
    double next = slope > 0 ? x - miss / slope : NAN;
    if (!(next > low && next < high))
      next = isinf(high) ? 2 * x : (low + high) / 2;
    bool settled = fabs(next - x) <= 4 * DBL_EPSILON * x;
    x = next;
    if (settled) {
      *out = 2 * x;
      return LBR_OK;
    }
  }
  return LBR_NO_CONVERGE;
}

/* psi(x) (Abramowitz and Stegun 1964, 6.3.5 and 6.3.18). */
static double digamma(double x) {
  double sum = 0;
  for (; x < 16; x++) sum -= 1 / x;
  double b = 1 / (x * x);
  return sum + log(x) - 0.5 / x -
         b * (1.0 / 12 - b * (1.0 / 120 - b * (1.0 / 252 - b * (1.0 / 240 -
              b / 132))));
}

double lbr_median_bias(double n) {
  return 0.69314718055994530942 +
         (digamma(n / 2 + 1) - digamma((n + 1) / 2)) / 2;
}
