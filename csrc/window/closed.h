/* The transform of a shape in closed form, for shapes without a short series.
 *
 * Everything is seen from the middle of the window and divided by R(0), as in
 * window/series.h; 0 <= x <= N / 2, N = 0 is the limit where there is one.
 */
#ifndef LBR_WINDOW_CLOSED_H
#define LBR_WINDOW_CLOSED_H

#include <stddef.h>

#include "window/window.h"

typedef struct lbr_closed {
  int limit; /* 1: N = 0 has a meaning */
  /* R, R', R'' at any x */
  void (*jet)(const lbr_window *window, size_t n, double x, double jet[3]);
  /* E, the size of the part that is E sin(pi x) */
  double (*edge)(const lbr_window *window, size_t n);
  /* bounds of |R| and |R'| at x and beyond, INFINITY where not had */
  void (*beyond)(const lbr_window *window, size_t n, double x, double *value,
                 double *slope);
  /* N sum w^2 / (sum w)^2 */
  double (*bandwidth)(const lbr_window *window, size_t n);
} lbr_closed;

#endif
