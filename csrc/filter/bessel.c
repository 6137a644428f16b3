#include "filter/bessel.h"

#include <math.h>

#define MOST LBR_FILTER_MOST_ORDER
#define STEPS 200
#define SETTLED 1e-11L /* relative; moves are quadratic below it */

/* Coefficients of theta_n(s) (Storch 1954): c_k = (2n-k)! /
 * (2^(n-k) k! (n-k)!), by the ratio of neighbours from c_n = 1.  They are
 * integers below 2^64 for every order allowed, hence exact here. */
static void coefficients(int n, long double *c) {
  c[n] = 1.0L;
  for (int k = n - 1; k >= 0; k--)
    c[k] = c[k + 1] * (2 * n - k) * (k + 1) / (2.0L * (n - k));
}

/* p(s) / p'(s) by one nested evaluation. */
static long double complex newton_step(const long double *c, int n,
                                       long double complex s) {
  long double complex p = c[n], d = 0.0L;
  for (int k = n - 1; k >= 0; k--) {
    d = d * s + p;
    p = p * s + c[k];
  }
  return p / d;
}

/* One sweep of Aberth's iteration (1973): Newton's step with the pull of the
 * other roots removed.  Returns the largest relative move. */
static long double sweep(const long double *c, int n,
                         long double complex *root) {
  long double largest = 0.0L;
  for (int i = 0; i < n; i++) {
    long double complex pull = 0.0L;
    for (int j = 0; j < n; j++)
      if (j != i) pull += 1.0L / (root[i] - root[j]);
    long double complex move = newton_step(c, n, root[i]);
    move /= 1.0L - move * pull;
    root[i] -= move;
    largest = fmaxl(largest, cabsl(move) / cabsl(root[i]));
  }
  return largest;
}

/* All roots, from a circle away from the symmetry axis, until the moves are
 * as small as rounding lets them become. */
static lbr_status find_roots(const long double *c, int n,
                             long double complex *root) {
  long double radius = powl(c[0], 1.0L / n);
  for (int i = 0; i < n; i++)
    root[i] = radius * cexpl(CMPLXL(0.0L, 6.2831853L * i / n + 0.4L));
  long double before = 1.0L;
  for (int step = 0; step < STEPS; step++) {
    long double largest = sweep(c, n, root);
    if (largest < 1e-18L || (largest < SETTLED && largest >= before))
      return LBR_OK;
    before = largest;
  }
  return LBR_NO_CONVERGE;
}

/* prod |1 - jw/root|^2, growing with w. */
static long double loss(const long double complex *root, int n,
                        long double w) {
  long double product = 1.0L;
  for (int i = 0; i < n; i++) {
    long double ratio = cabsl(CMPLXL(0.0L, w) - root[i]) / cabsl(root[i]);
    product *= ratio * ratio;
  }
  return product;
}

/* Where the power is halved. */
static long double half_power(const long double complex *root, int n) {
  long double low = 0.0L, high = 1.0L;
  while (loss(root, n, high) < 2.0L) high *= 2.0L;
  for (int i = 0; i < 80; i++) {
    long double middle = 0.5L * (low + high);
    if (loss(root, n, middle) < 2.0L)
      low = middle;
    else
      high = middle;
  }
  return 0.5L * (low + high);
}

/* Pairs first, by falling distance from the real axis; a real root last. */
static void store(lbr_filter *f, long double complex *root, long double unit) {
  int n = f->order;
  size_t out = 0;
  for (int pair = 0; pair < n / 2; pair++) {
    int best = 0;
    for (int i = 1; i < n; i++)
      if (cimagl(root[i]) > cimagl(root[best])) best = i;
    double re = (double)(creall(root[best]) / unit);
    double im = (double)(cimagl(root[best]) / unit);
    f->pole[out++] = CMPLX(re, im);
    f->pole[out++] = CMPLX(re, -im);
    root[best] = conjl(root[best]);
  }
  if (n % 2) {
    int real = 0;
    for (int i = 1; i < n; i++)
      if (fabsl(cimagl(root[i])) < fabsl(cimagl(root[real]))) real = i;
    f->pole[out++] = (double)(creall(root[real]) / unit);
  }
  f->poles = out;
  f->zeros = 0;
}

lbr_status lbr_design_bessel(lbr_filter *f) {
  long double c[MOST + 1];
  long double complex root[MOST];
  coefficients(f->order, c);
  lbr_status status = find_roots(c, f->order, root);
  if (status != LBR_OK) return status;
  store(f, root, half_power(root, f->order));
  return LBR_OK;
}
