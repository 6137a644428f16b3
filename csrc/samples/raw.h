/* Samples as a converter or a file stores them, and their way to doubles.
 */
#ifndef LBR_SAMPLES_RAW_H
#define LBR_SAMPLES_RAW_H

#include <stddef.h>

#include "base/status.h"

typedef enum lbr_raw_kind { /* all little-endian, tightly packed */
  LBR_RAW_INT16,            /* 2 bytes, two's complement */
  LBR_RAW_INT24,            /* 3 bytes, two's complement */
  LBR_RAW_INT32,            /* 4 bytes, two's complement */
  LBR_RAW_FLOAT32,          /* 4 bytes, IEEE 754 */
  LBR_RAW_KINDS
} lbr_raw_kind;

/* "int16", "int24", "int32", "float32"; NULL for no kind. */
const char *lbr_raw_name(lbr_raw_kind kind);

/* The kind of that name, or LBR_UNKNOWN. */
LBR_CHECKED lbr_status lbr_raw_kind_of(const char *name, lbr_raw_kind *kind);

/* Bytes of one sample; 0 for no kind. */
size_t lbr_raw_size(lbr_raw_kind kind);

/* out[i] = scale * sample i of data (any alignment).  Every code is a double
 * exactly, so scale = 1 keeps the codes. */
void lbr_raw_doubles(lbr_raw_kind kind, const void *data, size_t n,
                     double scale, double *out);

#endif
