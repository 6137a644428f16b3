#include "store/write.h"

#include <float.h>
#include <math.h>
#include <sndfile.h>
#include <stdlib.h>

#include "base/checked.h"
#include "store/draft.h"
#include "store/sound.h"

#define BLOCK_SAMPLES 16384
#define WAV_BYTES 4294900000u /* most sample bytes of a plain WAV */

/* A file being written; released in reverse order. */
typedef struct draft {
  lbr_draft *draft;
  SNDFILE *file;
  void *block;
} draft;

static int coding(const lbr_write_spec *spec) {
  if (spec->is_flac && (!spec->is_integer || spec->bits == 32)) return 0;
  if (!spec->is_integer)
    return spec->bits == 32 ? SF_FORMAT_FLOAT
                            : spec->bits == 64 ? SF_FORMAT_DOUBLE : 0;
  switch (spec->bits) {
    case 8: return spec->is_flac ? SF_FORMAT_PCM_S8 : SF_FORMAT_PCM_U8;
    case 16: return SF_FORMAT_PCM_16;
    case 24: return SF_FORMAT_PCM_24;
    case 32: return SF_FORMAT_PCM_32;
    default: return 0;
  }
}

static lbr_status check_spec(const lbr_write_spec *spec, lbr_why *why) {
  if (coding(spec) == 0)
    return lbr_because(why, LBR_DOMAIN, "cannot hold %s of %d bits",
                       spec->is_integer ? "integers" : "floats", spec->bits);
  if (spec->rate < 1)
    return lbr_because(why, LBR_DOMAIN, "cannot have a rate of %d", spec->rate);
  if (spec->is_flac && (spec->channels > 8 || spec->rate > 655350))
    return lbr_because(why, LBR_DOMAIN, "is FLAC, which holds 8 channels of "
                       "655350 S/s, not %zu of %d", spec->channels, spec->rate);
  if (spec->channels < 1 || spec->channels > LBR_SOUND_MOST_CHANNELS)
    return lbr_because(why, LBR_DOMAIN, "cannot have %zu channels",
                       spec->channels);
  return LBR_OK;
}

/* The limits a scaled sample must keep. */
static void limits(const lbr_write_spec *spec, double *low, double *high) {
  double top = ldexp(1.0, spec->bits - 1);
  double largest = spec->bits == 32 ? (double)FLT_MAX : DBL_MAX;
  *low = spec->is_integer ? -top : -largest;
  *high = spec->is_integer ? top - 1.0 : largest;
}

static lbr_status check_samples(const lbr_write_spec *spec, size_t frames,
                                const double *const *channel, lbr_why *why) {
  double low, high;
  limits(spec, &low, &high);
  for (size_t k = 0; k < spec->channels; k++) {
    size_t outside = 0;
    for (size_t i = 0; i < frames; i++) {
      double x = channel[k][i] * spec->scale;
      if (spec->is_integer) x = rint(x);
      outside += !(x >= low && x <= high && isfinite(x));
    }
    if (outside)
      return lbr_because(why, LBR_DOMAIN,
                         "would be clipped: %zu samples of channel %zu are "
                         "beyond full scale or not finite", outside, k + 1);
  }
  return LBR_OK;
}

static lbr_status open_sound(draft *d, const lbr_write_spec *spec,
                             size_t frames, lbr_why *why) {
  double bytes = (double)frames * (double)spec->channels * spec->bits / 8.0;
  SF_INFO info = {.samplerate = spec->rate, .channels = (int)spec->channels};
  int plain = spec->is_integer ? SF_FORMAT_WAV : SF_FORMAT_WAVEX;
  int container = bytes > WAV_BYTES ? SF_FORMAT_RF64 : plain;
  info.format = (spec->is_flac ? SF_FORMAT_FLAC : container) | coding(spec);
  d->block = lbr_alloc(BLOCK_SAMPLES, sizeof(double));
  if (!d->block) return lbr_because(why, LBR_NO_MEMORY, "does not fit memory");
  d->file = sf_open_fd(lbr_draft_fd(d->draft), SFM_WRITE, &info, SF_FALSE);
  if (!d->file)
    return lbr_because(why, LBR_IO, "cannot be written (%s)",
                       sf_strerror(NULL));
  /* its chunk carries the time of day: equal records give equal files */
  sf_command(d->file, SFC_SET_ADD_PEAK_CHUNK, NULL, SF_FALSE);
  return LBR_OK;
}

static void gather_codes(int *to, const lbr_write_spec *spec,
                         const double *const *channel, size_t from,
                         size_t frames) {
  double shift = ldexp(1.0, 32 - spec->bits);
  for (size_t k = 0; k < spec->channels; k++)
    for (size_t i = 0; i < frames; i++)
      to[i * spec->channels + k] =
          (int)(rint(channel[k][from + i] * spec->scale) * shift);
}

static void gather_floats(double *to, const lbr_write_spec *spec,
                          const double *const *channel, size_t from,
                          size_t frames) {
  for (size_t k = 0; k < spec->channels; k++)
    for (size_t i = 0; i < frames; i++)
      to[i * spec->channels + k] = channel[k][from + i] * spec->scale;
}

static lbr_status fill(draft *d, const lbr_write_spec *spec, size_t frames,
                       const double *const *channel, lbr_why *why) {
  size_t step = BLOCK_SAMPLES / spec->channels;
  for (size_t from = 0; from < frames; from += step) {
    size_t n = frames - from < step ? frames - from : step;
    sf_count_t written;
    if (spec->is_integer) {
      gather_codes(d->block, spec, channel, from, n);
      written = sf_writef_int(d->file, d->block, (sf_count_t)n);
    } else {
      gather_floats(d->block, spec, channel, from, n);
      written = sf_writef_double(d->file, d->block, (sf_count_t)n);
    }
    if (written != (sf_count_t)n)
      return lbr_because(why, LBR_IO, "cannot be written (%s)",
                         sf_strerror(d->file));
  }
  return LBR_OK;
}

/* The library buffers; what it could not write shows when it closes. */
static lbr_status finish(draft *d, lbr_why *why) {
  int failed = sf_close(d->file);
  d->file = NULL;
  if (failed) return lbr_because(why, LBR_IO, "cannot be finished");
  return lbr_draft_finish(d->draft, why);
}

static void discard(draft *d) {
  if (d->file) sf_close(d->file);
  lbr_draft_drop(d->draft);
  free(d->block);
}

lbr_status lbr_sound_write(const char *path, const lbr_write_spec *spec,
                           size_t frames, const double *const *channel,
                           lbr_why *why) {
  draft d = {0};
  lbr_status status = check_spec(spec, why);
  if (status == LBR_OK) status = check_samples(spec, frames, channel, why);
  if (status == LBR_OK) status = lbr_draft_open(path, &d.draft, why);
  if (status == LBR_OK) status = open_sound(&d, spec, frames, why);
  if (status == LBR_OK) status = fill(&d, spec, frames, channel, why);
  if (status == LBR_OK) status = finish(&d, why);
  discard(&d);
  return status;
}
