/* One grid cell of a kernel as two polynomials in Bernstein form: the real
 * part R and the edge part E sin(pi x) of the transform.
 *
 * Between grid points at which value and two derivatives are exact the quintic
 * that takes them differs from the function by at most f6 h^6 / 46080, f6 a
 * bound of the sixth derivative; its derivative by 2.88e-4 f6 h^5 and its
 * second derivative by f6 h^4 / 96 (the difference and its derivatives keep
 * 2 x 3, 2 x 2 + 1 and 2 + 2 zeros in the cell).
 */
#ifndef LBR_WINDOW_CELL_H
#define LBR_WINDOW_CELL_H

#include <stddef.h>

typedef struct lbr_node { /* jets at one grid point */
  double real[3]; /* R, R', R'' */
  double edge[3]; /* E sin(pi x) and derivatives */
} lbr_node;

typedef struct lbr_curve {
  int degree; /* 3 .. 5 */
  int real_only; /* the edge part is zero, and its coefficients not kept */
  double real[6], edge[6]; /* Bernstein coefficients over the part in use */
} lbr_curve;

/* The quintics of the cell between two nodes, h = 1 / LBR_GRID. */
void lbr_curve_between(const lbr_node *left, const lbr_node *right,
                       lbr_curve *out);

/* The derivative by x of a curve over one whole cell. */
void lbr_curve_derive(const lbr_curve *curve, lbr_curve *out);

/* The part t1 <= t <= t2 of the cell, 0 <= t1 <= t2 <= 1. */
void lbr_curve_part(lbr_curve *curve, double t1, double t2);

/* Bounds of hypot(real, edge) over the curve. */
void lbr_curve_size(const lbr_curve *curve, double *low, double *high);

#endif
