/* Closed sums of cosines over a record, time counted from its centre:
 * t = -(n - 1) / 2 .. (n - 1) / 2.  With them the normal equations of fits at
 * known frequencies need no pass over the samples.
 */
#ifndef LBR_LINES_DIRICHLET_H
#define LBR_LINES_DIRICHLET_H

#include <stddef.h>

typedef struct lbr_closed_sums {
  double cosine;  /* sum cos(2 pi g t) */
  double ramp;    /* sum (t / n) sin(2 pi g t) */
  double square;  /* sum (t / n)^2 cos(2 pi g t) */
} lbr_closed_sums;

/* sum cos(2 pi g t) = sin(pi g n) / sin(pi g), any finite g, n >= 1. */
double lbr_dirichlet(double g, size_t n);

/* The same with its first and second derivative, as the sums above. */
lbr_closed_sums lbr_dirichlet_sums(double g, size_t n);

/* sum (t / n)^2 = (n^2 - 1) / (12 n) */
double lbr_square_sum(size_t n);

#endif
