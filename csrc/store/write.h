/* Writing a WAV or FLAC file whole or not at all: a temporary file beside it,
 * filled, flushed to the disk, and renamed over the name.
 */
#ifndef LBR_STORE_WRITE_H
#define LBR_STORE_WRITE_H

#include <stdbool.h>
#include <stddef.h>

#include "base/status.h"
#include "store/why.h"

typedef struct lbr_write_spec {
  int rate;        /* samples per second and channel, > 0 */
  size_t channels; /* 1 .. LBR_SOUND_MOST_CHANNELS */
  int bits;        /* integers: 8, 16, 24, 32; floats: 32, 64 */
  bool is_integer; /* store integer codes */
  double scale;    /* code (or float) stored = sample * scale, rounded */
  bool is_flac;    /* FLAC: integers of 8, 16, 24 bits, at most 8 channels and
                      655350 samples per second (RFC 9639) */
} lbr_write_spec;

/* Writes `frames` samples of each channel.  LBR_DOMAIN, and no file, when a
 * sample is not finite or would not fit the codes (nothing is ever clipped),
 * or the spec is out of range; LBR_IO when the system refuses.  More than
 * 4 GiB are written as RF64. */
LBR_CHECKED lbr_status lbr_sound_write(const char *path,
                                       const lbr_write_spec *spec,
                                       size_t frames,
                                       const double *const *channel,
                                       lbr_why *why);

#endif
