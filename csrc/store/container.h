/* Does a sound file hold what its headers claim?  libsndfile repairs lengths
 * quietly; a record must not be shortened quietly, so we look ourselves.
 */
#ifndef LBR_STORE_CONTAINER_H
#define LBR_STORE_CONTAINER_H

#include <stdint.h>

#include "base/status.h"
#include "store/why.h"

/* Where uncompressed little-endian samples lie; zeros for other containers. */
typedef struct lbr_layout {
  int64_t data_at;     /* byte offset of the first sample */
  int64_t data_bytes;
  int64_t frame_bytes; /* of one sample of every channel */
} lbr_layout;

/* Checks an open regular file of `size` bytes: RIFF, RF64 and BW64 (EBU Tech
 * 3306, ITU-R BS.2088), Wave64 and Ogg (RFC 3533).  LBR_FORMAT with the reason
 * where the length claimed is not there, is unknown, or is no whole number of
 * frames; LBR_OK for other containers.  The file position is left alone. */
LBR_CHECKED lbr_status lbr_container_check(int fd, int64_t size,
                                           lbr_layout *layout, lbr_why *why);

#endif
