#include "store/sound.h"

#include <errno.h>
#include <fcntl.h>
#include <math.h>
#include <sndfile.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/checked.h"
#include "store/container.h"
#include "store/plain.h"

#define BLOCK_SAMPLES 16384 /* of all channels, read at once */
#define MOST_EXPANSION 65536 /* frames that one stored byte can stand for */

struct lbr_sound {
  SNDFILE *file;
  lbr_sound_facts facts;
  int64_t at;      /* next frame */
  lbr_plain plain; /* how to read without the library, where that can be */
  int shift;       /* from the 32-bit codes of the library to those stored */
  size_t block_frames;
  union {
    int *codes;
    double *floats;
  } block; /* block_frames * channels */
};

static const struct {
  int format;
  const char *name;
} containers[] = {
    {SF_FORMAT_WAV, "wav"},   {SF_FORMAT_WAVEX, "wav"},
    {SF_FORMAT_RF64, "rf64"}, {SF_FORMAT_W64, "w64"},
    {SF_FORMAT_FLAC, "flac"}, {SF_FORMAT_OGG, "ogg"},
};

static const struct {
  int format, bits;
  bool is_integer, is_lossy;
} codings[] = {
    {SF_FORMAT_PCM_U8, 8, true, false},  {SF_FORMAT_PCM_S8, 8, true, false},
    {SF_FORMAT_PCM_16, 16, true, false}, {SF_FORMAT_PCM_24, 24, true, false},
    {SF_FORMAT_PCM_32, 32, true, false}, {SF_FORMAT_FLOAT, 32, false, false},
    {SF_FORMAT_DOUBLE, 64, false, false}, {SF_FORMAT_VORBIS, 0, false, true},
};

static lbr_status read_kind(const SF_INFO *info, lbr_sound_facts *f,
                            lbr_why *why) {
  f->container = NULL;
  for (size_t i = 0; i < sizeof containers / sizeof *containers; i++)
    if ((info->format & SF_FORMAT_TYPEMASK) == containers[i].format)
      f->container = containers[i].name;
  if (!f->container)
    return lbr_because(why, LBR_FORMAT,
                       "is none of WAV, RF64, Wave64, FLAC and Ogg Vorbis");
  for (size_t i = 0; i < sizeof codings / sizeof *codings; i++)
    if ((info->format & SF_FORMAT_SUBMASK) == codings[i].format) {
      f->bits = codings[i].bits;
      f->is_integer = codings[i].is_integer;
      f->is_lossy = codings[i].is_lossy;
      f->full_scale = f->is_integer ? ldexp(1.0, f->bits - 1) : 1.0;
      return LBR_OK;
    }
  return lbr_because(why, LBR_FORMAT,
                     "holds samples that are neither plain integers or floats "
                     "nor Vorbis");
}

static lbr_status read_facts(const SF_INFO *info, int64_t bytes,
                             lbr_sound_facts *f, lbr_why *why) {
  lbr_status status = read_kind(info, f, why);
  if (status != LBR_OK) return status;
  if (info->samplerate < 1)
    return lbr_because(why, LBR_FORMAT, "claims a rate of %d samples a second",
                       info->samplerate);
  if (info->channels < 1 || info->channels > LBR_SOUND_MOST_CHANNELS)
    return lbr_because(why, LBR_FORMAT, "claims %d channels; 1 to %d can be",
                       info->channels, LBR_SOUND_MOST_CHANNELS);
  if (info->frames < 0 || info->frames / MOST_EXPANSION > bytes)
    return lbr_because(why, LBR_FORMAT,
                       "does not state its length, or one it cannot have");
  f->rate = info->samplerate;
  f->channels = info->channels;
  f->frames = info->frames;
  return LBR_OK;
}

static lbr_status make_block(lbr_sound *s) {
  size_t channels = (size_t)s->facts.channels;
  s->block_frames = BLOCK_SAMPLES / channels;
  s->shift = s->facts.is_integer ? 32 - s->facts.bits : 0;
  size_t samples = s->block_frames * channels;
  if (s->facts.is_integer)
    s->block.codes = lbr_alloc(samples, sizeof *s->block.codes);
  else
    s->block.floats = lbr_alloc(samples, sizeof *s->block.floats);
  return s->block.codes ? LBR_OK : LBR_NO_MEMORY;
}

/* Opened without waiting, so that a FIFO cannot hold us up. */
static lbr_status open_regular(const char *path, int *fd, int64_t *bytes,
                               lbr_layout *layout, lbr_why *why) {
  struct stat facts;
  *fd = open(path, O_RDONLY | O_NONBLOCK | O_CLOEXEC | O_NOCTTY);
  if (*fd < 0) return lbr_because_errno(why, errno);
  if (fstat(*fd, &facts) != 0) return lbr_because_errno(why, errno);
  *bytes = facts.st_size;
  lbr_status status = lbr_regular(&facts, why);
  if (status != LBR_OK) return status;
  return lbr_container_check(*fd, *bytes, layout, why);
}

/* Compressed files can only be believed after their last frame was read. */
static lbr_status try_last_frame(lbr_sound *s, lbr_why *why) {
  const char *container = s->facts.container;
  if (s->facts.frames == 0) return LBR_OK;
  if (strcmp(container, "flac") != 0 && strcmp(container, "ogg") != 0)
    return LBR_OK;
  double frame[LBR_SOUND_MOST_CHANNELS];
  bool there = sf_seek(s->file, s->facts.frames - 1, SEEK_SET) >= 0 &&
               sf_readf_double(s->file, frame, 1) == 1;
  if (!there)
    return lbr_because(why, LBR_FORMAT,
                       "claims %lld frames, but the last cannot be read",
                       (long long)s->facts.frames);
  s->at = s->facts.frames;
  return lbr_sound_seek(s, 0, why);
}

/* Samples are read in place only where both readings of the headers agree. */
static void find_plain(lbr_sound *s, int fd, const lbr_layout *layout) {
  const lbr_sound_facts *f = &s->facts;
  bool excess = f->is_integer && f->bits == 8;
  lbr_plain plain = {fd, layout->data_at, (size_t)f->channels,
                     (size_t)layout->frame_bytes,
                     {f->bits, f->is_integer, excess, false,
                      excess ? 128.0 : 0.0}};
  bool agree = layout->frame_bytes == (int64_t)f->channels * f->bits / 8 &&
               layout->frame_bytes > 0 &&
               layout->data_bytes / layout->frame_bytes == f->frames;
  if (agree && lbr_plain_can(&plain)) s->plain = plain;
}

/* The library takes the descriptor over, and closes it also on failure. */
static lbr_status start(lbr_sound *s, int fd, int64_t bytes,
                        const lbr_layout *layout, lbr_why *why) {
  SF_INFO info = {0};
  if (lseek(fd, 0, SEEK_SET) != 0) {
    int number = errno;
    close(fd);
    return lbr_because_errno(why, number);
  }
  s->file = sf_open_fd(fd, SFM_READ, &info, SF_TRUE);
  if (!s->file)
    return lbr_because(why, LBR_FORMAT, "cannot be read as a sound file (%s)",
                       sf_strerror(NULL));
  lbr_status status = read_facts(&info, bytes, &s->facts, why);
  if (status != LBR_OK) return status;
  status = make_block(s);
  if (status != LBR_OK) return lbr_because(why, status, "does not fit memory");
  find_plain(s, fd, layout);
  return try_last_frame(s, why);
}

lbr_status lbr_sound_open(const char *path, lbr_sound **out,
                          lbr_sound_facts *facts, lbr_why *why) {
  int fd = -1;
  int64_t bytes = 0;
  lbr_layout layout;
  lbr_status status = open_regular(path, &fd, &bytes, &layout, why);
  if (status != LBR_OK) {
    if (fd >= 0) close(fd);
    return status;
  }
  lbr_sound *s = lbr_alloc(1, sizeof *s);
  if (!s) {
    close(fd);
    return lbr_because(why, LBR_NO_MEMORY, "does not fit memory");
  }
  status = start(s, fd, bytes, &layout, why);
  if (status != LBR_OK) {
    lbr_sound_close(s);
    return status;
  }
  *facts = s->facts;
  *out = s;
  return LBR_OK;
}

static void spread(const lbr_sound *s, size_t frames, size_t done,
                   size_t wanted, const int *channel, double *const *out) {
  size_t stride = (size_t)s->facts.channels;
  for (size_t k = 0; k < wanted; k++) {
    double *to = out[k] + done;
    if (s->facts.is_integer) {
      const int *from = s->block.codes + channel[k];
      for (size_t i = 0; i < frames; i++) to[i] = from[i * stride] >> s->shift;
    } else {
      const double *from = s->block.floats + channel[k];
      for (size_t i = 0; i < frames; i++) to[i] = from[i * stride];
    }
  }
}

static bool fill(lbr_sound *s, size_t frames) {
  sf_count_t got = s->facts.is_integer
      ? sf_readf_int(s->file, s->block.codes, (sf_count_t)frames)
      : sf_readf_double(s->file, s->block.floats, (sf_count_t)frames);
  return got == (sf_count_t)frames && sf_error(s->file) == SF_ERR_NO_ERROR;
}

static lbr_status damaged(const lbr_sound *s, size_t frames, lbr_why *why) {
  return lbr_because(why, LBR_FORMAT, "is damaged in the %zu frames from %lld "
                     "on", frames, (long long)s->at);
}

static lbr_status read_decoded(lbr_sound *s, size_t count, size_t wanted,
                               const int *channel, double *const *out,
                               lbr_why *why) {
  for (size_t done = 0; done < count;) {
    size_t left = count - done;
    size_t frames = left < s->block_frames ? left : s->block_frames;
    if (!fill(s, frames)) return damaged(s, frames, why);
    spread(s, frames, done, wanted, channel, out);
    s->at += (int64_t)frames;
    done += frames;
  }
  return LBR_OK;
}

lbr_status lbr_sound_read(lbr_sound *s, size_t count, size_t wanted,
                          const int *channel, double *const *out,
                          lbr_why *why) {
  for (size_t k = 0; k < wanted; k++)
    if (channel[k] < 0 || channel[k] >= s->facts.channels)
      return lbr_because(why, LBR_DOMAIN, "has channels 1 to %d, not %d",
                         s->facts.channels, channel[k] + 1);
  if (count > (uint64_t)(s->facts.frames - s->at))
    return lbr_because(why, LBR_DOMAIN, "has %lld frames from here, not %zu",
                       (long long)(s->facts.frames - s->at), count);
  if (s->plain.channels == 0)
    return read_decoded(s, count, wanted, channel, out, why);
  if (lbr_plain_read(&s->plain, s->at, count, wanted, channel, out) != LBR_OK)
    return damaged(s, count, why);
  s->at += (int64_t)count;
  return LBR_OK;
}

lbr_status lbr_sound_seek(lbr_sound *s, int64_t frame, lbr_why *why) {
  if (frame < 0 || frame > s->facts.frames)
    return lbr_because(why, LBR_DOMAIN, "has frames 0 to %lld, not %lld",
                       (long long)s->facts.frames, (long long)frame);
  if (s->plain.channels == 0 && frame != s->at &&
      sf_seek(s->file, frame, SEEK_SET) != frame)
    return lbr_because(why, LBR_FORMAT, "cannot be wound to frame %lld",
                       (long long)frame);
  s->at = frame;
  return LBR_OK;
}

static lbr_status feed_plain(void *context, int64_t first, size_t count,
                             size_t wanted, const int *channel,
                             double *const *out) {
  const lbr_sound *s = context;
  return lbr_plain_read(&s->plain, first, count, wanted, channel, out);
}

static lbr_status feed_decoded(void *context, int64_t first, size_t count,
                               size_t wanted, const int *channel,
                               double *const *out) {
  lbr_sound *s = context;
  lbr_why why;
  lbr_status status = lbr_sound_seek(s, first, &why);
  if (status != LBR_OK) return status;
  return lbr_sound_read(s, count, wanted, channel, out, &why);
}

lbr_feed lbr_sound_feed(lbr_sound *s) {
  bool plain = s->plain.channels != 0;
  return (lbr_feed){.context = s, .channels = (size_t)s->facts.channels,
                    .samples = s->facts.frames, .is_parallel = plain,
                    .is_integer = s->facts.is_integer, .bits = s->facts.bits,
                    .read = plain ? feed_plain : feed_decoded};
}

int64_t lbr_sound_at(const lbr_sound *s) { return s->at; }

void lbr_sound_close(lbr_sound *s) {
  if (!s) return;
  if (s->file) sf_close(s->file);
  free(s->block.codes);
  free(s);
}
