#include "store/plain.h"

#include <errno.h>
#include <string.h>
#include <unistd.h>

#include "base/workers.h"

#define BUFFER 65536          /* bytes read at once; stays in the cache */
#define PART ((size_t)131072) /* frames that a thread takes at once */

#define HOT __attribute__((target_clones("avx512f", "avx2", "default")))

/* Every step-th sample from `from` on, n of them. The first loop of each is
 * there because only a constant step becomes vector instructions. */
#define SPREAD(name, type, load)                                              \
  HOT static void name(double *restrict to, const unsigned char *from,        \
                       size_t step, size_t n) {                               \
    if (step == sizeof(type))                                                 \
      for (size_t i = 0; i < n; i++) {                                        \
        type x;                                                               \
        memcpy(&x, from + i * sizeof x, sizeof x);                            \
        to[i] = load;                                                         \
      }                                                                       \
    else                                                                      \
      for (size_t i = 0; i < n; i++) {                                        \
        type x;                                                               \
        memcpy(&x, from + i * step, sizeof x);                                \
        to[i] = load;                                                         \
      }                                                                       \
  }

SPREAD(spread_u8, uint8_t, (double)x - 128.0)
SPREAD(spread_i16, int16_t, (double)x)
SPREAD(spread_i32, int32_t, (double)x)
SPREAD(spread_f32, float, (double)x)
SPREAD(spread_f64, double, x)

HOT static void spread_i24(double *restrict to, const unsigned char *from,
                           size_t step, size_t n) {
  for (size_t i = 0; i < n; i++) {
    const unsigned char *b = from + i * step;
    uint32_t code = (uint32_t)b[0] | (uint32_t)b[1] << 8 | (uint32_t)b[2] << 16;
    to[i] = (double)((int32_t)(code ^ 0x800000u) - 0x800000);
  }
}

typedef void (*spreader)(double *restrict, const unsigned char *, size_t,
                         size_t);

static spreader spreader_of(const lbr_plain *p) {
  switch (p->bits) {
    case 8: return p->is_integer ? spread_u8 : NULL;
    case 16: return p->is_integer ? spread_i16 : NULL;
    case 24: return p->is_integer ? spread_i24 : NULL;
    case 32: return p->is_integer ? spread_i32 : spread_f32;
    case 64: return p->is_integer ? NULL : spread_f64;
    default: return NULL;
  }
}

static size_t frame_bytes(const lbr_plain *p) {
  return p->channels * (size_t)p->bits / 8;
}

bool lbr_plain_can(const lbr_plain *p) {
#if __BYTE_ORDER__ == __ORDER_LITTLE_ENDIAN__
  return p->data_at > 0 && spreader_of(p) && frame_bytes(p) <= BUFFER;
#else
  (void)p;
  return false;
#endif
}

static bool read_all(int fd, int64_t at, unsigned char *to, size_t n) {
  while (n > 0) {
    ssize_t got = pread(fd, to, n, (off_t)at);
    if (got < 0 && errno == EINTR) continue;
    if (got <= 0) return false;
    to += got;
    at += got;
    n -= (size_t)got;
  }
  return true;
}

/* One call's work, handed out in parts. */
typedef struct job {
  const lbr_plain *plain;
  int64_t first;
  size_t count, wanted;
  const int *channel;
  double *const *out;
} job;

static lbr_status read_part(void *context, size_t task, unsigned worker) {
  const job *j = context;
  unsigned char buffer[BUFFER];
  spreader spread = spreader_of(j->plain);
  size_t step = frame_bytes(j->plain), block = BUFFER / step;
  size_t end = j->count - task * PART < PART ? j->count : (task + 1) * PART;
  (void)worker;
  for (size_t at = task * PART; at < end; at += block) {
    size_t n = end - at < block ? end - at : block;
    int64_t frame = j->first + (int64_t)at;
    if (!read_all(j->plain->fd, j->plain->data_at + frame * (int64_t)step,
                  buffer, n * step))
      return LBR_FORMAT;
    for (size_t k = 0; k < j->wanted; k++) {
      size_t offset = (size_t)j->channel[k] * (size_t)j->plain->bits / 8;
      spread(j->out[k] + at, buffer + offset, step, n);
    }
  }
  return LBR_OK;
}

lbr_status lbr_plain_read(const lbr_plain *p, int64_t first, size_t count,
                          size_t wanted, const int *channel,
                          double *const *out) {
  job j = {p, first, count, wanted, channel, out};
  size_t parts = (count + PART - 1) / PART;
  return lbr_workers_run(read_part, &j, parts, parts < 8 ? 1 : 0);
}
