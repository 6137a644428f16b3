#include "store/packed.h"

#include <stdbool.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/checked.h"
#include "store/file.h"

struct lbr_packed {
  int fd;
  size_t channels;
  int64_t samples;
  bool is_interleaved; /* plain[0] reads all channels at once */
  lbr_plain *plain;    /* one per channel */
};

static bool same_coding(const lbr_coding *a, const lbr_coding *b) {
  return a->bits == b->bits && a->is_integer == b->is_integer &&
         a->is_unsigned == b->is_unsigned && a->is_big == b->is_big &&
         a->zero == b->zero;
}

static bool interleaved(const lbr_packed_channel *c, size_t n) {
  int64_t bytes = c->coding.bits / 8;
  for (size_t k = 1; k < n; k++)
    if (c[k].step != c->step || !same_coding(&c[k].coding, &c->coding) ||
        c[k].at - c->at != (int64_t)k * bytes)
      return false;
  return n * (size_t)bytes <= c->step;
}

/* The last sample of a channel ends inside the file. */
static bool is_there(const lbr_packed_channel *c, int64_t samples,
                     int64_t bytes) {
  int64_t end, span;
  if (samples == 0) return true;
  return c->at >= 0 &&
         !__builtin_mul_overflow(samples - 1, (int64_t)c->step, &span) &&
         !__builtin_add_overflow(span, c->at + c->coding.bits / 8, &end) &&
         end <= bytes;
}

static lbr_status fill(lbr_packed *p, const lbr_packed_channel *c,
                       int64_t bytes, lbr_why *why) {
  for (size_t k = 0; k < p->channels; k++) {
    p->plain[k] = (lbr_plain){p->fd, c[k].at, 1, c[k].step, c[k].coding};
    if (!lbr_plain_can(&p->plain[k]))
      return lbr_because(why, LBR_DOMAIN, "has channel %zu in a coding that "
                         "cannot be read: %s%s of %d bits, every %zu bytes",
                         k + 1, c[k].coding.is_unsigned ? "unsigned " : "",
                         c[k].coding.is_integer ? "integers" : "floats",
                         c[k].coding.bits, c[k].step);
    if (!is_there(&c[k], p->samples, bytes))
      return lbr_because(why, LBR_FORMAT, "is shorter (%lld bytes) than %lld "
                         "samples of channel %zu from byte %lld on",
                         (long long)bytes, (long long)p->samples, k + 1,
                         (long long)c[k].at);
  }
  p->is_interleaved = interleaved(c, p->channels);
  if (p->is_interleaved) p->plain[0].channels = p->channels;
  return LBR_OK;
}

lbr_status lbr_packed_open(const char *path, const lbr_packed_channel *channel,
                           size_t channels, int64_t samples, lbr_packed **out,
                           lbr_why *why) {
  int fd = -1;
  int64_t bytes = 0;
  lbr_status status = lbr_file_open(path, &fd, &bytes, why);
  if (status != LBR_OK) return status;
  lbr_packed *p = lbr_alloc(1, sizeof *p);
  lbr_plain *plain = lbr_alloc(channels, sizeof *plain);
  if (!p || !plain) {
    free(p);
    free(plain);
    close(fd);
    return lbr_because(why, LBR_NO_MEMORY, "does not fit memory");
  }
  *p = (lbr_packed){fd, channels, samples, false, plain};
  status = fill(p, channel, bytes, why);
  if (status != LBR_OK) {
    lbr_packed_close(p);
    return status;
  }
  *out = p;
  return LBR_OK;
}

void lbr_packed_close(lbr_packed *p) {
  if (!p) return;
  close(p->fd);
  free(p->plain);
  free(p);
}

static lbr_status read_packed(void *context, int64_t first, size_t count,
                              size_t wanted, const int *channel,
                              double *const *out) {
  const lbr_packed *p = context;
  if (p->is_interleaved)
    return lbr_plain_read(p->plain, first, count, wanted, channel, out);
  int only = 0;
  for (size_t k = 0; k < wanted; k++) {
    lbr_status status = lbr_plain_read(&p->plain[channel[k]], first, count, 1,
                                       &only, out + k);
    if (status != LBR_OK) return status;
  }
  return LBR_OK;
}

lbr_feed lbr_packed_feed(lbr_packed *p) {
  return (lbr_feed){.context = p, .channels = p->channels,
                    .samples = p->samples, .is_parallel = true,
                    .is_integer = p->plain[0].coding.is_integer,
                    .bits = p->plain[0].coding.bits, .read = read_packed};
}
