/* Size arithmetic that is checked before it is used. */
#ifndef LBR_BASE_CHECKED_H
#define LBR_BASE_CHECKED_H

#include <stddef.h>
#include <stdlib.h>

#include "base/status.h"

/* *bytes = count * size, or LBR_OVERFLOW. */
LBR_CHECKED static inline lbr_status lbr_size(size_t count, size_t size,
                                              size_t *bytes) {
  return __builtin_mul_overflow(count, size, bytes) ? LBR_OVERFLOW : LBR_OK;
}

/* Zeroed memory for count items of size bytes; NULL when it cannot be had
 * (overflow included).  count == 0 gives a pointer that free() takes. */
static inline void *lbr_alloc(size_t count, size_t size) {
  return calloc(count ? count : 1, size ? size : 1);
}

#endif
