/* What a kernel is made of: how its transform is had at grid points.
 * Private to this room. */
#ifndef LBR_WINDOW_MODEL_H
#define LBR_WINDOW_MODEL_H

#include "window/cell.h"
#include "window/closed.h"
#include "window/kernel.h"
#include "window/series.h"

/* Moments of |w| over |sum w|: of order 0, 1 and 6 in |u|. */
typedef struct lbr_spread {
  double none, first, sixth;
} lbr_spread;

struct lbr_kernel {
  lbr_window window;
  size_t n;           /* length, 0: limit */
  lbr_series series;  /* the transform, where the shape has a series */
  double edge;        /* E / R(0) */
  double sixth;       /* bound of the sixth derivative of R / R(0) */
  double value_slack; /* remainder of a cell's quintics, and rounding */
  double slope_slack, bend_slack; /* the same for first, second derivative */
  lbr_spread spread;  /* of the samples, or of the limit for long records */
  int probed;         /* the spread is the limit's, good for long records */
  double slope_most;  /* bound of |W'| / |W(0)| anywhere */
  double peak;        /* bound of |W| / |W(0)|, 0: not known yet */
  int expanded;       /* the series is the shape's, good for any length */
  double *work;       /* samples, for shapes that need them */
  size_t work_size;   /* samples that fit */
};

/* The jets at x = point / LBR_GRID, 0 <= x <= N / 2. */
void lbr_model_node(const lbr_kernel *kernel, size_t point, lbr_node *out);

/* R at 0 <= x <= N / 2. */
double lbr_model_real(const lbr_kernel *kernel, double x);

/* Bounds of |W| and |W'| at x and beyond it, INFINITY where not had. */
void lbr_model_beyond(const lbr_kernel *kernel, double x, double *value,
                      double *slope);

#endif
