/* Reading sound files, in the codes that were stored.
 *
 * Integer formats give integer codes (16 bit: -32768 .. 32767), float formats
 * and Ogg Vorbis give floats whose full scale is 1.  Nothing is scaled.
 */
#ifndef LBR_STORE_SOUND_H
#define LBR_STORE_SOUND_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/status.h"
#include "samples/feed.h"
#include "store/why.h"

#define LBR_SOUND_MOST_CHANNELS 256

typedef struct lbr_sound lbr_sound; /* an open file */

typedef struct lbr_sound_facts {
  const char *container; /* "wav", "rf64", "w64", "flac", "ogg" */
  int rate;              /* samples per second and channel */
  int channels;          /* 1 .. LBR_SOUND_MOST_CHANNELS */
  int bits;              /* of an integer code or a float, 0 for Vorbis */
  bool is_integer;       /* codes are integers */
  bool is_lossy;         /* what was recorded is not what is stored */
  double full_scale;     /* code of the positive rail + 1: 2^(bits-1), or 1 */
  int64_t frames;        /* samples per channel */
} lbr_sound_facts;

/* Opens a file for reading.  LBR_IO: cannot be opened, or is no regular file;
 * LBR_FORMAT: no sound file of the kinds above, or it lies about its length;
 * the reason is left in *why. */
LBR_CHECKED lbr_status lbr_sound_open(const char *path, lbr_sound **out,
                                      lbr_sound_facts *facts, lbr_why *why);

/* The next `count` frames of `wanted` channels (numbers from 0) into out[k][0
 * .. count - 1].  LBR_FORMAT when fewer can be read, LBR_DOMAIN when count is
 * beyond the end or a channel does not exist. */
LBR_CHECKED lbr_status lbr_sound_read(lbr_sound *sound, size_t count,
                                      size_t wanted, const int *channel,
                                      double *const *out, lbr_why *why);

/* Goes to a frame, 0 .. frames. */
LBR_CHECKED lbr_status lbr_sound_seek(lbr_sound *sound, int64_t frame,
                                      lbr_why *why);

/* The next frame to be read. */
int64_t lbr_sound_at(const lbr_sound *sound);

/* A feed of the codes, which moves the file; it ends with the file.  Several
 * threads may pull where the samples lie in the file uncompressed. */
lbr_feed lbr_sound_feed(lbr_sound *sound);

/* Closes and frees; NULL is allowed. */
void lbr_sound_close(lbr_sound *sound);

#endif
