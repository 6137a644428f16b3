#include "samples/raw.h"

#include <stdint.h>
#include <string.h>

static const struct {
  const char *name;
  size_t size;
} kinds[LBR_RAW_KINDS] = {
    [LBR_RAW_INT16] = {"int16", 2},
    [LBR_RAW_INT24] = {"int24", 3},
    [LBR_RAW_INT32] = {"int32", 4},
    [LBR_RAW_FLOAT32] = {"float32", 4},
};

const char *lbr_raw_name(lbr_raw_kind kind) {
  return (unsigned)kind < LBR_RAW_KINDS ? kinds[kind].name : NULL;
}

size_t lbr_raw_size(lbr_raw_kind kind) {
  return (unsigned)kind < LBR_RAW_KINDS ? kinds[kind].size : 0;
}

lbr_status lbr_raw_kind_of(const char *name, lbr_raw_kind *kind) {
  for (int k = 0; k < LBR_RAW_KINDS; k++)
    if (strcmp(name, kinds[k].name) == 0) {
      *kind = (lbr_raw_kind)k;
      return LBR_OK;
    }
  return LBR_UNKNOWN;
}

#define CLONES __attribute__((target_clones("avx512f", "avx2", "default")))

CLONES static void from_int16(const unsigned char *restrict p, size_t n,
                              double scale, double *restrict out) {
  for (size_t i = 0; i < n; i++) {
    int16_t code;
    memcpy(&code, p + 2 * i, sizeof code);
    out[i] = scale * code;
  }
}

CLONES static void from_int24(const unsigned char *restrict p, size_t n,
                              double scale, double *restrict out) {
  for (size_t i = 0; i < n; i++) {
    uint32_t bits = (uint32_t)p[3 * i] << 8 | (uint32_t)p[3 * i + 1] << 16 |
                    (uint32_t)p[3 * i + 2] << 24;
    out[i] = scale * ((int32_t)bits / 256);
  }
}

CLONES static void from_int32(const unsigned char *restrict p, size_t n,
                              double scale, double *restrict out) {
  for (size_t i = 0; i < n; i++) {
    int32_t code;
    memcpy(&code, p + 4 * i, sizeof code);
    out[i] = scale * code;
  }
}

CLONES static void from_float32(const unsigned char *restrict p, size_t n,
                                double scale, double *restrict out) {
  for (size_t i = 0; i < n; i++) {
    float value;
    memcpy(&value, p + 4 * i, sizeof value);
    out[i] = scale * (double)value;
  }
}

void lbr_raw_doubles(lbr_raw_kind kind, const void *data, size_t n,
                     double scale, double *out) {
  switch (kind) {
    case LBR_RAW_INT16: from_int16(data, n, scale, out); break;
    case LBR_RAW_INT24: from_int24(data, n, scale, out); break;
    case LBR_RAW_INT32: from_int32(data, n, scale, out); break;
    case LBR_RAW_FLOAT32: from_float32(data, n, scale, out); break;
    case LBR_RAW_KINDS: break;
  }
}
