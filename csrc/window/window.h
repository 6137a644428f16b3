/* Window shapes: one table row each.
 *
 * A window is a shape with its parameter and no length; samples are always
 * periodic (period n: the sample that a symmetric window of n + 1 points would
 * repeat at its end is left out).
 */
#ifndef LBR_WINDOW_WINDOW_H
#define LBR_WINDOW_WINDOW_H

#include <stddef.h>

#include "base/status.h"

#define LBR_WINDOW_TERMS 16 /* most cosine terms a published window has */

typedef struct lbr_window lbr_window;

struct lbr_series; /* window/series.h */
struct lbr_closed; /* window/closed.h */

typedef struct lbr_window_shape {
  const char *name;    /* "hann" */
  const char *title;   /* "Hann" */
  const char *source;  /* publication of the coefficients or the formula */
  size_t terms;        /* cosine terms a0 .. ; 0: not a cosine sum */
  double terms_of[LBR_WINDOW_TERMS]; /* w = a0 - a1 cos + a2 cos 2 - ... */
  const char *parameter_name; /* NULL: none; else e.g. "beta" */
  double parameter_least, parameter_most, parameter_default;
  /* fills n periodic samples; NULL for cosine sums (common code) */
  lbr_status (*fill)(const lbr_window *window, double *out, size_t n);
  /* one of these two for shapes with a fill: the cosine series of the shape,
   * the same for every length; or the transform in closed form */
  lbr_status (*expand)(const lbr_window *window, struct lbr_series *out);
  const struct lbr_closed *closed;
} lbr_window_shape;

struct lbr_window {
  const lbr_window_shape *shape; /* points into the constant table */
  double parameter;              /* 0 when the shape has none */
};

/* Number of rows, and row i (0-based). */
size_t lbr_window_shapes(void);
const lbr_window_shape *lbr_window_shape_at(size_t i);

/* Finds a shape by name.  NAN for the parameter: its default.
 * LBR_UNKNOWN: no such name; LBR_DOMAIN: parameter out of its range. */
LBR_CHECKED lbr_status lbr_window_find(const char *name, double parameter,
                                       lbr_window *out);

/* n periodic samples, peak near 1 (never rescaled).  n >= 1. */
LBR_CHECKED lbr_status lbr_window_fill(const lbr_window *window, double *out,
                                       size_t n);

#endif
