/* Channels of packed samples somewhere in a file, as a description or another
 * file says: interleaved or one after the other, with any gaps between.
 */
#ifndef LBR_STORE_PACKED_H
#define LBR_STORE_PACKED_H

#include <stddef.h>
#include <stdint.h>

#include "base/status.h"
#include "samples/feed.h"
#include "store/plain.h"
#include "store/why.h"

#define LBR_PACKED_MOST_CHANNELS 65536

typedef struct lbr_packed lbr_packed; /* an open file */

typedef struct lbr_packed_channel {
  int64_t at;  /* byte offset of the first sample */
  size_t step; /* bytes from sample to sample, 1 .. 65536 */
  lbr_coding coding;
} lbr_packed_channel;

/* Opens a file with `samples` samples of every channel.  LBR_IO: cannot be
 * opened; LBR_FORMAT: some samples are not there; LBR_DOMAIN: a coding that
 * cannot be read; the reason is left in *why. */
LBR_CHECKED lbr_status lbr_packed_open(const char *path,
                                       const lbr_packed_channel *channel,
                                       size_t channels, int64_t samples,
                                       lbr_packed **out, lbr_why *why);

/* A feed of the stored codes; it ends with the file. */
lbr_feed lbr_packed_feed(lbr_packed *packed);

/* Closes and frees; NULL is allowed. */
void lbr_packed_close(lbr_packed *packed);

#endif
