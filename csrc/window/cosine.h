/* The published cosine sums, one row each (window/window.h has the meaning). */
#ifndef LBR_WINDOW_COSINE_H
#define LBR_WINDOW_COSINE_H

#include <stddef.h>

#include "window/window.h"

size_t lbr_cosine_rows(void);
const lbr_window_shape *lbr_cosine_row(size_t i); /* i below the count */

#endif
