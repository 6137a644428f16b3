#include "store/plain.h"

#include <string.h>

#include "base/workers.h"
#include "store/file.h"

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

static float float_of(uint32_t bits) {
  float x;
  memcpy(&x, &bits, sizeof x);
  return x;
}

static double double_of(uint64_t bits) {
  double x;
  memcpy(&x, &bits, sizeof x);
  return x;
}

SPREAD(spread_i8, int8_t, (double)x)
SPREAD(spread_u8, uint8_t, (double)x)
SPREAD(spread_i16, int16_t, (double)x)
SPREAD(spread_u16, uint16_t, (double)x)
SPREAD(spread_i32, int32_t, (double)x)
SPREAD(spread_u32, uint32_t, (double)x)
SPREAD(spread_f32, float, (double)x)
SPREAD(spread_f64, double, x)
SPREAD(spread_i16_big, uint16_t, (double)(int16_t)__builtin_bswap16(x))
SPREAD(spread_u16_big, uint16_t, (double)__builtin_bswap16(x))
SPREAD(spread_i32_big, uint32_t, (double)(int32_t)__builtin_bswap32(x))
SPREAD(spread_u32_big, uint32_t, (double)__builtin_bswap32(x))
SPREAD(spread_f32_big, uint32_t, (double)float_of(__builtin_bswap32(x)))
SPREAD(spread_f64_big, uint64_t, double_of(__builtin_bswap64(x)))

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

static const struct {
  int bits;
  bool is_integer, is_unsigned;
  spreader little, big;
} codings[] = {
    {8, true, false, spread_i8, spread_i8},
    {8, true, true, spread_u8, spread_u8},
    {16, true, false, spread_i16, spread_i16_big},
    {16, true, true, spread_u16, spread_u16_big},
    {24, true, false, spread_i24, NULL},
    {32, true, false, spread_i32, spread_i32_big},
    {32, true, true, spread_u32, spread_u32_big},
    {32, false, false, spread_f32, spread_f32_big},
    {64, false, false, spread_f64, spread_f64_big},
};

static spreader spreader_of(const lbr_coding *c) {
  for (size_t i = 0; i < sizeof codings / sizeof *codings; i++)
    if (codings[i].bits == c->bits && codings[i].is_integer == c->is_integer &&
        codings[i].is_unsigned == c->is_unsigned)
      return c->is_big ? codings[i].big : codings[i].little;
  return NULL;
}

static size_t sample_bytes(const lbr_plain *p) {
  return (size_t)p->coding.bits / 8;
}

bool lbr_plain_can(const lbr_plain *p) {
#if __BYTE_ORDER__ == __ORDER_LITTLE_ENDIAN__
  return p->channels > 0 && spreader_of(&p->coding) && p->step <= BUFFER &&
         p->channels <= p->step / sample_bytes(p);
#else
  (void)p;
  return false;
#endif
}

/* One call's work, handed out in parts. */
typedef struct job {
  const lbr_plain *plain;
  int64_t first;
  size_t count, wanted;
  const int *channel;
  double *const *out;
} job;

static void spread_block(const job *j, size_t at, size_t n,
                         const unsigned char *buffer) {
  spreader spread = spreader_of(&j->plain->coding);
  double zero = j->plain->coding.zero;
  for (size_t k = 0; k < j->wanted; k++) {
    double *to = j->out[k] + at;
    size_t offset = (size_t)j->channel[k] * sample_bytes(j->plain);
    spread(to, buffer + offset, j->plain->step, n);
    if (zero != 0.0)
      for (size_t i = 0; i < n; i++) to[i] -= zero;
  }
}

static lbr_status read_part(void *context, size_t task, unsigned worker) {
  const job *j = context;
  unsigned char buffer[BUFFER];
  size_t step = j->plain->step, block = BUFFER / step;
  size_t frame = j->plain->channels * sample_bytes(j->plain);
  size_t end = j->count - task * PART < PART ? j->count : (task + 1) * PART;
  (void)worker;
  for (size_t at = task * PART; at < end; at += block) {
    size_t n = end - at < block ? end - at : block;
    int64_t from = j->plain->data_at + (j->first + (int64_t)at) * (int64_t)step;
    lbr_status status = lbr_file_read(j->plain->fd, from, buffer,
                                      (n - 1) * step + frame);
    if (status != LBR_OK) return status;
    spread_block(j, at, n, buffer);
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
