#include "samples/feed.h"

#include <string.h>

static lbr_status check(const lbr_feed *feed, int64_t first, size_t count,
                        size_t wanted, const int *channel) {
  for (size_t k = 0; k < wanted; k++)
    if (channel[k] < 0 || (size_t)channel[k] >= feed->channels)
      return LBR_DOMAIN;
  if (first < 0 || first > feed->samples) return LBR_DOMAIN;
  return count <= (uint64_t)(feed->samples - first) ? LBR_OK : LBR_DOMAIN;
}

lbr_status lbr_feed_codes(const lbr_feed *feed, int64_t first, size_t count,
                          size_t wanted, const int *channel,
                          double *const *out) {
  lbr_status status = check(feed, first, count, wanted, channel);
  if (status != LBR_OK || count == 0) return status;
  if (!feed->read) return LBR_IO; /* closed under a part of it */
  return feed->read(feed->context, first, count, wanted, channel, out);
}

lbr_status lbr_feed_read(const lbr_feed *feed, int64_t first, size_t count,
                         size_t wanted, const int *channel,
                         double *const *out) {
  lbr_status status = lbr_feed_codes(feed, first, count, wanted, channel, out);
  if (status != LBR_OK || !feed->factor) return status;
  for (size_t k = 0; k < wanted; k++) {
    double factor = feed->factor[channel[k]];
    if (factor == 1.0) continue;
    for (size_t i = 0; i < count; i++) out[k][i] *= factor;
  }
  return LBR_OK;
}

static lbr_status read_doubles(void *context, int64_t first, size_t count,
                               size_t wanted, const int *channel,
                               double *const *out) {
  const double *const *from = context;
  for (size_t k = 0; k < wanted; k++)
    memcpy(out[k], from[channel[k]] + first, count * sizeof(double));
  return LBR_OK;
}

lbr_feed lbr_feed_doubles(const double *const *channel, size_t channels,
                          size_t samples) {
  union {
    const double *const *from;
    void *context;
  } lent = {channel}; /* only ever read through */
  return (lbr_feed){.context = lent.context, .channels = channels,
                    .samples = (int64_t)samples, .is_parallel = true,
                    .bits = 64, .memory = channel, .read = read_doubles};
}

static lbr_status read_raw(void *context, int64_t first, size_t count,
                           size_t wanted, const int *channel,
                           double *const *out) {
  const lbr_raw_run *runs = context;
  for (size_t k = 0; k < wanted; k++) {
    const lbr_raw_run *run = &runs[channel[k]];
    const unsigned char *bytes = run->data;
    lbr_raw_doubles(run->kind, bytes + (size_t)first * lbr_raw_size(run->kind),
                    count, 1.0, out[k]);
  }
  return LBR_OK;
}

lbr_feed lbr_feed_raw(const lbr_raw_run *run, size_t channels) {
  union {
    const lbr_raw_run *from;
    void *context;
  } lent = {run};
  return (lbr_feed){.context = lent.context, .channels = channels,
                    .samples = (int64_t)run->n, .is_parallel = true,
                    .is_integer = run->kind != LBR_RAW_FLOAT32,
                    .bits = 8 * (int)lbr_raw_size(run->kind),
                    .read = read_raw};
}

#define AT_ONCE 256 /* channels asked of the whole together */

static lbr_status read_part(void *context, int64_t first, size_t count,
                            size_t wanted, const int *channel,
                            double *const *out) {
  const lbr_part *part = context;
  int map[AT_ONCE];
  for (size_t from = 0; from < wanted; from += AT_ONCE) {
    size_t n = wanted - from < AT_ONCE ? wanted - from : AT_ONCE;
    for (size_t k = 0; k < n; k++) map[k] = part->channel[channel[from + k]];
    lbr_status status = lbr_feed_codes(part->whole, part->first + first, count,
                                       n, map, out + from);
    if (status != LBR_OK) return status;
  }
  return LBR_OK;
}

static const char *why_part(void *context) {
  const lbr_feed *whole = ((const lbr_part *)context)->whole;
  return whole->why ? whole->why(whole->context) : NULL;
}

lbr_feed lbr_feed_part(lbr_part *part, size_t channels, int64_t samples) {
  const lbr_feed *whole = part->whole;
  return (lbr_feed){.context = part, .channels = channels, .samples = samples,
                    .is_parallel = whole->is_parallel,
                    .is_integer = whole->is_integer, .bits = whole->bits,
                    .read = read_part, .why = why_part};
}
