/* The shapes that are not cosine sums: one constant row per file. */
#ifndef LBR_WINDOW_FAMILIES_H
#define LBR_WINDOW_FAMILIES_H

#include "window/window.h"

extern const lbr_window_shape lbr_cosine_power_shape; /* cosine_power.c */

#define LBR_FAMILIES &lbr_cosine_power_shape

#endif
