/* The transform of a window written as a short sum of cosines.
 *
 *   w(u) = sum_k p_k cos(2 pi k u) + sum_j q_j cos(2 pi (j + 1/2) u),
 *   u = n / N - 1/2,
 *
 * seen from the middle of the window is W(x) = R(x) - i E sin(pi x), E being
 * the sample at the edge u = -1/2.  With a = pi x / N, M = N / pi and
 * S = (M sin a)^2 every pair of shifts +s and -s has one pole at S = S(s):
 *
 *   pi R / N = sin(pi x) y sum_k alpha_k / (S - S(k))
 *            + cos(pi x)   sum_j beta_j / (S - S(j + 1/2)),   y = M sin a cos a
 *
 * N = 0 stands for the limit, S = x^2 and y = x.  All values are divided by
 * R(0).  Points are folded into 0 <= x <= N / 2 by the caller.
 */
#ifndef LBR_WINDOW_SERIES_H
#define LBR_WINDOW_SERIES_H

#include <stddef.h>

#include "base/status.h"
#include "window/window.h"

#define LBR_PI 3.14159265358979323846
#define LBR_GRID 16        /* grid points per bin on which jets are exact */
#define LBR_SERIES_MOST 40 /* most terms of either kind */
#define LBR_SERIES_EXACT 64 /* shapes without a series have one up to here */

typedef struct lbr_poles { /* one kind of term, whole or half shifts */
  size_t terms;                     /* terms of the shape */
  size_t count;                     /* of them left after folding at N */
  double shape[LBR_SERIES_MOST];    /* p_k or q_j of the shape, any length */
  double term[LBR_SERIES_MOST];     /* the same folded at N, divided by R(0) */
  double residue[LBR_SERIES_MOST];  /* alpha_k or beta_j, divided by R(0) */
  double at[LBR_SERIES_MOST];       /* S at the pole */
  double rest[LBR_SERIES_MOST];     /* M^2 - S at the pole, without rounding */
} lbr_poles;

typedef struct lbr_series {
  size_t n;          /* length, 0: limit */
  double m;          /* N / pi, 0 in the limit */
  double sum;        /* R(0) / N before the division */
  double misfit;     /* most that the sum is off the shape, over its mean */
  double edge;       /* E / R(0): size of the imaginary part */
  lbr_poles whole;   /* shifts 0, 1, 2, ... */
  lbr_poles half;    /* shifts 1/2, 3/2, ... */
} lbr_series;

/* Terms of the shape are in .shape and .terms; makes the rest for length n.
 * LBR_DOMAIN: half shifts that do not fit the length, or R(0) not positive. */
LBR_CHECKED lbr_status lbr_series_resize(lbr_series *s, size_t n);

/* Whole-shift terms of any even sample sequence of length n up to
 * LBR_SERIES_EXACT, w[i] = w[n - i], into .shape (for this n only). */
void lbr_series_from_samples(lbr_series *s, const double *w, size_t n);

/* R(x). */
double lbr_series_real(const lbr_series *s, double x);

/* R, R', R'' at x = point / LBR_GRID. */
void lbr_series_jet(const lbr_series *s, size_t point, double jet[3]);

/* Bounds of |R| and |R'| at x and everywhere beyond it up to N / 2, INFINITY
 * where x is too near the poles for that. */
void lbr_series_beyond(const lbr_series *s, double x, double *value,
                       double *slope);

/* N sum w^2 / (sum w)^2. */
double lbr_series_noise_bandwidth(const lbr_series *s);

/* sin(pi x) and cos(pi x), exact zeros included. */
double lbr_sin_pi(double x);
double lbr_cos_pi(double x);

/* sin(pi j / LBR_GRID) */
double lbr_grid_sin(size_t j);

#endif
