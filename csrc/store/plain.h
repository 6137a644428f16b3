/* Samples that lie in a file one after the other, uncompressed and little-
 * endian: read without a detour, several times faster than by the library.
 */
#ifndef LBR_STORE_PLAIN_H
#define LBR_STORE_PLAIN_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

typedef struct lbr_plain {
  int fd;          /* an open file; its position is not used */
  int64_t data_at; /* byte offset of frame 0; 0: samples are not plain */
  size_t channels;
  int bits;        /* integers 8 (from 0 to 255), 16, 24, 32; floats 32, 64 */
  bool is_integer;
} lbr_plain;

/* Whether this machine can read these samples in place. */
bool lbr_plain_can(const lbr_plain *p);

/* Frames first .. first + count - 1 of `wanted` channels (numbers from 0) into
 * out[k][0 .. count - 1], in the codes stored; several threads take part when
 * there is much to read.  LBR_FORMAT when the file has become shorter. */
LBR_CHECKED lbr_status lbr_plain_read(const lbr_plain *p, int64_t first,
                                      size_t count, size_t wanted,
                                      const int *channel, double *const *out);

#endif
