/* The shapes that are not cosine sums: one constant row per file. */
#ifndef LBR_WINDOW_FAMILIES_H
#define LBR_WINDOW_FAMILIES_H

#include "window/window.h"

extern const lbr_window_shape lbr_cosine_power_shape; /* cosine_power.c */
extern const lbr_window_shape lbr_gaussian_shape;     /* gaussian.c */
extern const lbr_window_shape lbr_kaiser_shape;       /* kaiser.c */
extern const lbr_window_shape lbr_prolate_shape;      /* prolate.c */
extern const lbr_window_shape lbr_tukey_shape;        /* tukey.c */
extern const lbr_window_shape lbr_dolph_shape;        /* dolph.c */

#define LBR_FAMILIES                                                  \
  &lbr_cosine_power_shape, &lbr_gaussian_shape, &lbr_kaiser_shape,    \
      &lbr_prolate_shape, &lbr_tukey_shape, &lbr_dolph_shape

#endif
