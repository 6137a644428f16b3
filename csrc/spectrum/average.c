#include "spectrum/average.h"

#include <math.h>
#include <pthread.h>
#include <stdlib.h>
#include <string.h>

#include "base/checked.h"
#include "base/workers.h"
#include "samples/arith.h"
#include "spectrum/median.h"
#include "spectrum/transform.h"

#define GROUP_SAMPLES 131072 /* in the segments of a group, about */
#define GROUP_MOST 64        /* segments in a group at most */
#define SPARE_SLOTS 1 /* sums of groups that wait for an earlier one */
#define MOST_WORKERS 64

/* What belongs to one worker. */
typedef struct seat {
  double *scratch;       /* points values: the windowed segment */
  double complex *bins;  /* of all channels where crossed, else of one */
  double *gathered;      /* span values a channel; NULL: not needed yet */
  double **into;         /* pointers into it, one per channel */
  const double **from;   /* where the group's samples are, per channel */
} seat;

struct lbr_average {
  lbr_average_setting set;
  size_t bins;     /* of a transform */
  size_t stride;   /* from one channel's bins to the next, aligned */
  size_t group;    /* segments in a group */
  size_t span;     /* samples that a group looks at */
  size_t sums;     /* doubles in one set of sums: powers, then crosses */
  double *window;
  lbr_transform *transform;
  double *total;   /* sums of whole groups */
  double *settled; /* and with the last, partial group */
  bool is_settled;
  double *slots;   /* sums of groups on their way; nslots sets */
  bool *ready;     /* which of them wait to be added */
  size_t nslots;
  size_t done;     /* groups added to the total */
  bool adding;     /* somebody adds at the moment */
  bool broken;     /* a task failed */
  double *carry;   /* samples from the first group that is not done, span
                    * values a channel */
  size_t carried;  /* how many a channel */
  int64_t seen;    /* samples fed since the last break */
  size_t earlier;  /* segments before it */
  double *kept;    /* powers of all segments, for medians */
  size_t kept_most; /* segments that fit */
  seat *seats;
  pthread_mutex_t lock, reading;
  pthread_cond_t turn;
};

/* A call of lbr_average_feed as the workers see it. */
typedef struct job {
  lbr_average *a;
  const lbr_feed *feed;
  const int *channel;
  int64_t first;      /* number in the feed of the first new sample */
  size_t first_group; /* group of task 0 */
} job;

static void free_seat(seat *s) {
  lbr_transform_drop(s->scratch);
  lbr_transform_drop(s->bins);
  free(s->gathered);
  free(s->into);
  free(s->from);
}

void lbr_average_free(lbr_average *a) {
  if (!a) return;
  for (unsigned i = 0; a->seats && i < a->set.workers; i++)
    free_seat(&a->seats[i]);
  free(a->seats);
  free(a->window);
  free(a->total);
  free(a->settled);
  free(a->slots);
  free(a->ready);
  free(a->carry);
  free(a->kept);
  lbr_transform_put(a->transform);
  pthread_cond_destroy(&a->turn);
  pthread_mutex_destroy(&a->reading);
  pthread_mutex_destroy(&a->lock);
  free(a);
}

static bool is_valid(const lbr_average_setting *s) {
  return s->length >= 1 && s->step >= 1 && s->step <= s->length &&
         s->points >= s->length && s->points <= LBR_TRANSFORM_MOST &&
         s->channels >= 1 && s->channels <= LBR_AVERAGE_MOST_CHANNELS &&
         s->detrend < LBR_DETREND_KINDS && s->kind < LBR_AVERAGE_KINDS &&
         !(s->cross && s->kind != LBR_AVERAGE_MEAN) && s->window;
}

static lbr_status make_seat(const lbr_average *a, seat *s) {
  size_t sets = a->set.cross ? a->set.channels : 1, values;
  if (lbr_size(sets, 2 * a->stride, &values) != LBR_OK) return LBR_NO_MEMORY;
  s->scratch = lbr_transform_buffer(a->set.points);
  s->bins = (double complex *)lbr_transform_buffer(values);
  s->into = lbr_alloc(a->set.channels, sizeof *s->into);
  s->from = lbr_alloc(a->set.channels, sizeof *s->from);
  return s->scratch && s->bins && s->into && s->from ? LBR_OK : LBR_NO_MEMORY;
}

static void plan_sizes(lbr_average *a) {
  size_t n = a->set.length, c = a->set.channels;
  a->bins = a->set.points / 2 + 1;
  a->stride = (a->bins + 7) / 8 * 8;
  a->group = GROUP_SAMPLES / n;
  if (a->group < 1) a->group = 1;
  if (a->group > GROUP_MOST) a->group = GROUP_MOST;
  a->span = (a->group - 1) * a->set.step + n;
  a->sums = a->bins * (c + (a->set.cross ? c * (c - 1) : 0));
  if (a->set.workers == 0) a->set.workers = lbr_cores();
  if (a->set.workers > MOST_WORKERS) a->set.workers = MOST_WORKERS;
  a->nslots = a->set.workers + (a->set.workers > 1 ? SPARE_SLOTS : 0);
}

static lbr_status allocate(lbr_average *a, const double *window) {
  size_t carried, slots;
  if (lbr_size(a->span, a->set.channels, &carried) != LBR_OK ||
      lbr_size(a->sums, a->nslots, &slots) != LBR_OK)
    return LBR_NO_MEMORY;
  a->window = lbr_alloc(a->set.length, sizeof(double));
  a->total = lbr_alloc(a->sums, sizeof(double));
  a->settled = lbr_alloc(a->sums, sizeof(double));
  a->slots = lbr_alloc(slots, sizeof(double));
  a->ready = lbr_alloc(a->nslots, sizeof *a->ready);
  a->carry = lbr_alloc(carried, sizeof(double));
  a->seats = lbr_alloc(a->set.workers, sizeof *a->seats);
  if (!a->window || !a->total || !a->settled || !a->slots || !a->ready ||
      !a->carry || !a->seats)
    return LBR_NO_MEMORY;
  memcpy(a->window, window, a->set.length * sizeof(double));
  for (unsigned i = 0; i < a->set.workers; i++)
    if (make_seat(a, &a->seats[i]) != LBR_OK) return LBR_NO_MEMORY;
  return lbr_transform_get(a->set.points, &a->transform);
}

lbr_status lbr_average_new(const lbr_average_setting *setting,
                           lbr_average **out) {
  if (!is_valid(setting)) return LBR_DOMAIN;
  lbr_average *a = lbr_alloc(1, sizeof *a);
  if (!a) return LBR_NO_MEMORY;
  pthread_mutex_init(&a->lock, NULL);
  pthread_mutex_init(&a->reading, NULL);
  pthread_cond_init(&a->turn, NULL);
  a->set = *setting;
  plan_sizes(a);
  lbr_status status = allocate(a, setting->window);
  if (status == LBR_OK)
    *out = a;
  else
    lbr_average_free(a);
  return status;
}

static void add_power(const lbr_average *a, const double complex *bins,
                      bool is_first, double *power) {
  if (is_first)
    lbr_segment_set_power(bins, a->bins, power);
  else if (a->set.kind == LBR_AVERAGE_PEAK)
    lbr_segment_most_power(bins, a->bins, power);
  else
    lbr_segment_add_power(bins, a->bins, power);
}

/* Real parts of a pair, then its imaginary parts; then the next pair's. */
static void add_crosses(const lbr_average *a, const seat *s, double *pair) {
  for (size_t i = 0; i < a->set.channels; i++)
    for (size_t j = i + 1; j < a->set.channels; j++, pair += 2 * a->bins)
      lbr_segment_add_cross(s->bins + i * a->stride,
                            s->bins + j * a->stride, a->bins, pair,
                            pair + a->bins);
}

/* Into the sums of a group, or the powers that a median keeps. */
static void add_segment(const lbr_average *a, const seat *s, size_t offset,
                        bool is_first, double *sums) {
  bool crossed = a->set.cross;
  for (size_t c = 0; c < a->set.channels; c++) {
    double complex *bins = s->bins + (crossed ? c * a->stride : 0);
    lbr_segment_window(s->from[c] + offset, a->window, a->set.length,
                       a->set.detrend, s->scratch);
    lbr_transform_forward(a->transform, s->scratch, bins);
    add_power(a, bins, is_first, sums + c * a->bins);
  }
  if (crossed) add_crosses(a, s, sums + a->set.channels * a->bins);
}

/* `count` segments of a group whose samples s->from points to. */
static void run_segments(lbr_average *a, const seat *s, size_t group,
                         size_t count, double *slot) {
  bool keeps = a->set.kind == LBR_AVERAGE_MEDIAN;
  size_t powers = a->set.channels * a->bins;
  if (a->set.cross)
    memset(slot + powers, 0, (a->sums - powers) * sizeof *slot);
  for (size_t i = 0; i < count; i++) {
    double *sums =
        keeps ? a->kept + (a->earlier + group * a->group + i) * a->sums
              : slot;
    add_segment(a, s, i * a->set.step, keeps || i == 0, sums);
  }
}

static void merge(const lbr_average *a, const double *slot, double *into) {
  if (a->set.kind == LBR_AVERAGE_PEAK) {
    for (size_t k = 0; k < a->sums; k++)
      if (slot[k] > into[k] || isnan(slot[k])) into[k] = slot[k];
  } else {
    lbr_add_scaled(into, slot, 1.0, a->sums);
  }
}

/* Waits until the slot of the group is free; false: give up. */
static bool take_slot(lbr_average *a, size_t group) {
  pthread_mutex_lock(&a->lock);
  while (!a->broken && group >= a->done + a->nslots)
    pthread_cond_wait(&a->turn, &a->lock);
  bool broken = a->broken;
  pthread_mutex_unlock(&a->lock);
  return !broken;
}

/* Hands over the sums of a group; whoever has the next in order adds. */
static void hand_over(lbr_average *a, size_t group) {
  pthread_mutex_lock(&a->lock);
  a->ready[group % a->nslots] = true;
  while (!a->adding && a->ready[a->done % a->nslots]) {
    size_t at = a->done % a->nslots;
    a->adding = true;
    pthread_mutex_unlock(&a->lock);
    if (a->set.kind != LBR_AVERAGE_MEDIAN)
      merge(a, a->slots + at * a->sums, a->total);
    pthread_mutex_lock(&a->lock);
    a->adding = false;
    a->ready[at] = false;
    a->done++;
    pthread_cond_broadcast(&a->turn);
  }
  pthread_mutex_unlock(&a->lock);
}

/* Samples of the stream from `start` on, all channels: from the carry what is
 * there, the rest from the feed. */
static lbr_status gather(const job *j, seat *s, int64_t start, size_t count) {
  lbr_average *a = j->a;
  size_t channels = a->set.channels, old = 0;
  if (!s->gathered) {
    s->gathered = lbr_alloc(a->span * channels, sizeof(double));
    if (!s->gathered) return LBR_NO_MEMORY;
  }
  int64_t carry_start = a->seen - (int64_t)a->carried;
  if (start < a->seen) {
    old = (size_t)(a->seen - start);
    if (old > count) old = count;
  }
  for (size_t c = 0; c < channels; c++) {
    double *out = s->gathered + c * a->span;
    if (old > 0)
      memcpy(out, a->carry + c * a->span + (start - carry_start),
             old * sizeof *out);
    s->into[c] = out + old;
    s->from[c] = out;
  }
  if (old == count) return LBR_OK;
  int64_t from = j->first + (start + (int64_t)old - a->seen);
  if (!j->feed->is_parallel) pthread_mutex_lock(&a->reading);
  lbr_status status = lbr_feed_read(j->feed, from, count - old, channels,
                                    j->channel, s->into);
  if (!j->feed->is_parallel) pthread_mutex_unlock(&a->reading);
  return status;
}

static lbr_status find_samples(const job *j, seat *s, size_t group) {
  lbr_average *a = j->a;
  int64_t start = (int64_t)(group * a->group * a->set.step);
  if (!j->feed->memory || start < a->seen) return gather(j, s, start, a->span);
  for (size_t c = 0; c < a->set.channels; c++)
    s->from[c] = j->feed->memory[j->channel[c]] + j->first + (start - a->seen);
  return LBR_OK;
}

static lbr_status run_group(void *context, size_t task, unsigned worker) {
  const job *j = context;
  lbr_average *a = j->a;
  size_t group = j->first_group + task;
  seat *s = &a->seats[worker];
  if (!take_slot(a, group)) return LBR_STOPPED;
  lbr_status status = find_samples(j, s, group);
  if (status == LBR_OK) {
    run_segments(a, s, group, a->group,
                 a->slots + (group % a->nslots) * a->sums);
    hand_over(a, group);
    return LBR_OK;
  }
  pthread_mutex_lock(&a->lock);
  a->broken = true;
  pthread_cond_broadcast(&a->turn);
  pthread_mutex_unlock(&a->lock);
  return status;
}

/* Whole groups in that many samples. */
static size_t groups_in(const lbr_average *a, int64_t samples) {
  if (samples < (int64_t)a->span) return 0;
  return (size_t)(samples - (int64_t)a->span) / (a->group * a->set.step) + 1;
}

static size_t segments_in(const lbr_average *a, int64_t samples) {
  if (samples < (int64_t)a->set.length) return 0;
  return (size_t)(samples - (int64_t)a->set.length) / a->set.step + 1;
}

/* Room for the powers of so many segments, for medians. */
static lbr_status keep_room(lbr_average *a, size_t segments) {
  if (a->set.kind != LBR_AVERAGE_MEDIAN || segments <= a->kept_most)
    return LBR_OK;
  size_t most = a->kept_most + a->kept_most / 2, bytes;
  if (most < segments) most = segments;
  if (most > LBR_MEDIAN_MOST / a->sums) most = LBR_MEDIAN_MOST / a->sums;
  if (most < segments || lbr_size(most * a->sums, sizeof(double), &bytes))
    return LBR_NO_MEMORY;
  double *kept = realloc(a->kept, bytes);
  if (!kept) return LBR_NO_MEMORY;
  a->kept = kept;
  a->kept_most = most;
  return LBR_OK;
}

/* Carries what the next groups need of the samples seen by then. */
static lbr_status carry_on(const job *j, int64_t count) {
  lbr_average *a = j->a;
  int64_t start = (int64_t)(a->done * a->group * a->set.step);
  size_t left = (size_t)(a->seen + count - start);
  lbr_status status = gather(j, &a->seats[0], start, left);
  if (status != LBR_OK) return status;
  for (size_t c = 0; c < a->set.channels; c++)
    memcpy(a->carry + c * a->span, a->seats[0].from[c],
           left * sizeof(double));
  a->carried = left;
  a->seen += count;
  return LBR_OK;
}

lbr_status lbr_average_feed(lbr_average *a, const lbr_feed *feed,
                            const int *channel, int64_t first,
                            int64_t count) {
  if (a->broken) return LBR_STOPPED;
  if (first < 0 || count < 0 || first > feed->samples ||
      count > feed->samples - first)
    return LBR_DOMAIN;
  int64_t reached;
  if (__builtin_add_overflow(a->seen, count, &reached)) return LBR_OVERFLOW;
  job j = {a, feed, channel, first, a->done};
  lbr_status status = keep_room(a, a->earlier + segments_in(a, reached));
  if (status == LBR_OK)
    status = lbr_workers_run(run_group, &j, groups_in(a, reached) - a->done,
                             a->set.workers);
  if (status == LBR_OK) status = carry_on(&j, count);
  a->is_settled = false;
  if (status != LBR_OK) a->broken = true;
  return status;
}

int64_t lbr_average_samples(const lbr_average *a) { return a->seen; }

size_t lbr_average_segments(const lbr_average *a) {
  return a->earlier + segments_in(a, a->seen);
}

size_t lbr_average_bins(const lbr_average *a) { return a->bins; }

/* Adds the last, partial group; its samples are all carried. */
static void settle_group(lbr_average *a, double *into) {
  size_t rest = segments_in(a, a->seen) - a->done * a->group;
  seat *s = &a->seats[0];
  if (rest == 0) return;
  for (size_t c = 0; c < a->set.channels; c++)
    s->from[c] = a->carry + c * a->span;
  run_segments(a, s, a->done, rest, a->slots);
  if (a->set.kind != LBR_AVERAGE_MEDIAN) merge(a, a->slots, into);
}

static lbr_status settle(lbr_average *a) {
  if (a->broken) return LBR_STOPPED;
  if (lbr_average_segments(a) == 0) return LBR_INFEASIBLE;
  if (a->is_settled) return LBR_OK;
  memcpy(a->settled, a->total, a->sums * sizeof(double));
  settle_group(a, a->settled);
  a->is_settled = true;
  return LBR_OK;
}

lbr_status lbr_average_break(lbr_average *a) {
  if (a->broken) return LBR_STOPPED;
  settle_group(a, a->total);
  a->earlier = lbr_average_segments(a);
  a->seen = 0;
  a->carried = 0;
  a->done = 0;
  a->is_settled = false;
  return LBR_OK;
}

/* Column by column of the kept powers. */
static lbr_status medians(const lbr_average *a, size_t channel, double *out) {
  size_t segments = lbr_average_segments(a);
  double *column = lbr_alloc(segments, sizeof *column);
  if (!column) return LBR_NO_MEMORY;
  for (size_t k = 0; k < a->bins; k++) {
    const double *at = a->kept + channel * a->bins + k;
    for (size_t i = 0; i < segments; i++) column[i] = at[i * a->sums];
    out[k] = lbr_median(column, segments);
  }
  free(column);
  return LBR_OK;
}

lbr_status lbr_average_power(lbr_average *a, size_t channel, double *out) {
  if (channel >= a->set.channels) return LBR_DOMAIN;
  lbr_status status = settle(a);
  if (status != LBR_OK) return status;
  if (a->set.kind == LBR_AVERAGE_MEDIAN) return medians(a, channel, out);
  const double *sums = a->settled + channel * a->bins;
  double count = a->set.kind == LBR_AVERAGE_PEAK
                     ? 1 : (double)lbr_average_segments(a);
  for (size_t k = 0; k < a->bins; k++) out[k] = sums[k] / count;
  return LBR_OK;
}

lbr_status lbr_average_cross(lbr_average *a, size_t from, size_t to,
                             double complex *out) {
  size_t c = a->set.channels;
  if (!a->set.cross || from >= c || to >= c || from == to) return LBR_DOMAIN;
  lbr_status status = settle(a);
  if (status != LBR_OK) return status;
  size_t i = from < to ? from : to, j = from < to ? to : from;
  size_t pair = i * c - i * (i + 1) / 2 + (j - i - 1);
  const double *sums = a->settled + c * a->bins + 2 * pair * a->bins;
  double count = (double)lbr_average_segments(a), sign = from < to ? 1 : -1;
  for (size_t k = 0; k < a->bins; k++)
    out[k] = CMPLX(sums[k] / count, sign * sums[a->bins + k] / count);
  return LBR_OK;
}
