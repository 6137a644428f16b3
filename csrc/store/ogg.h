/* The pages of an Ogg file (RFC 3533): whole, in order, one stream.
 *
 * The decoding library skips a damaged page without a word, which would
 * shift every later sample; so the pages are checked before it sees them.
 */
#ifndef LBR_STORE_OGG_H
#define LBR_STORE_OGG_H

#include <stdint.h>

#include "base/status.h"
#include "store/why.h"

/* Walks the pages of an open file of `size` bytes: LBR_FORMAT with the reason
 * where a checksum is wrong, a page is missing or cut off, the last page is
 * not marked as the end, or there is more than one stream. */
LBR_CHECKED lbr_status lbr_ogg_check(int fd, int64_t size, lbr_why *why);

#endif
