/* Samples that lie in a file one after the other, uncompressed: read without a
 * detour, several times faster than by a library.
 */
#ifndef LBR_STORE_PLAIN_H
#define LBR_STORE_PLAIN_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

typedef struct lbr_coding {
  int bits; /* integers 8, 16, 24 (little-endian), 32; floats 32, 64 */
  bool is_integer;
  bool is_unsigned; /* integers of 8, 16 and 32 bits, from 0 up */
  bool is_big;      /* the byte of most weight comes first */
  double zero;      /* is taken off unsigned codes: 128 in WAV of 8 bits */
} lbr_coding;

typedef struct lbr_plain {
  int fd;          /* an open file; its position is not used */
  int64_t data_at; /* byte offset of frame 0 */
  size_t channels; /* of a frame, one behind the other; 0: nothing plain */
  size_t step;     /* bytes from frame to frame, at least a frame's */
  lbr_coding coding;
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
