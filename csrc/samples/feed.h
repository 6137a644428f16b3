/* A feed: where a consumer pulls samples from, block by block, without knowing
 * whether they lie in memory or in a file, or how they are coded.
 *
 * Random access: any range may be asked for, in any order, though forward is
 * fastest.  Blocks of about 1 MiB are a good size.  Samples become values of
 * the channel's unit (code * factor) on their way into the consumer.
 */
#ifndef LBR_SAMPLES_FEED_H
#define LBR_SAMPLES_FEED_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/status.h"
#include "samples/raw.h"

typedef struct lbr_feed {
  void *context;         /* of `read`; owned by whoever made the feed */
  size_t channels;       /* 1 or more */
  int64_t samples;       /* per channel */
  bool is_parallel;      /* several threads may read at the same time */
  bool is_integer;       /* what is stored are integers */
  int bits;              /* of a stored sample; 0: not known */
  const double *factor;  /* per channel: value = stored * factor; NULL: 1 */
  const double *const *memory; /* per channel, all samples as values, where
                                  they lie in memory like that; else NULL */
  /* Samples first .. first + count - 1 of `wanted` channels (from 0) as
   * stored, into out[k][0 .. count - 1]; the range is inside the feed. */
  lbr_status (*read)(void *context, int64_t first, size_t count,
                     size_t wanted, const int *channel, double *const *out);
  /* What failed last, in words that follow a path, or NULL; NULL: no words. */
  const char *(*why)(void *context);
} lbr_feed;

/* Values of samples first .. first + count - 1 (from 0) of `wanted` channels
 * (numbers from 0) into out[k][0 .. count - 1].  LBR_DOMAIN when a sample or a
 * channel does not exist, LBR_FORMAT or LBR_IO when a file fails. */
LBR_CHECKED lbr_status lbr_feed_read(const lbr_feed *feed, int64_t first,
                                     size_t count, size_t wanted,
                                     const int *channel, double *const *out);

/* The same without the factor: what is stored. */
LBR_CHECKED lbr_status lbr_feed_codes(const lbr_feed *feed, int64_t first,
                                      size_t count, size_t wanted,
                                      const int *channel, double *const *out);

/* A feed over doubles in memory: `channel` and the arrays it lists must
 * outlive the feed. */
lbr_feed lbr_feed_doubles(const double *const *channel, size_t channels,
                          size_t samples);

/* Packed samples of one channel in memory. */
typedef struct lbr_raw_run {
  lbr_raw_kind kind;
  const void *data; /* any alignment */
  size_t n;
} lbr_raw_run;

/* A feed over packed samples in memory, all of one length and kind: `run` and
 * the data must outlive the feed. */
lbr_feed lbr_feed_raw(const lbr_raw_run *run, size_t channels);

/* A stretch of some channels of another feed. */
typedef struct lbr_part {
  const lbr_feed *whole;
  int64_t first;      /* its sample that is sample 0 here */
  const int *channel; /* its channel that is channel k here */
} lbr_part;

/* A feed of the stored codes of a part: *part and what it points to must
 * outlive the feed.  The range and the channels must exist. */
lbr_feed lbr_feed_part(lbr_part *part, size_t channels, int64_t samples);

#endif
