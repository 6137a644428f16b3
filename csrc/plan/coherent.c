#include "plan/coherent.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/checked.h"
#include "base/workers.h"

#define MOST_SPANS ((size_t)1 << 22)
#define MOST_SETTINGS ((size_t)1 << 26)
#define CHUNK 512  /* dividers a task takes */
#define EXACT 1e-6 /* whole quotients of whole numbers below 2^53 stay whole */

void lbr_spans_free(lbr_spans *s) {
  free(s->item);
  *s = (lbr_spans){NULL, 0, 0};
}

lbr_status lbr_coherent_period(const lbr_fraction *hz, size_t n,
                               lbr_fraction *seconds) {
  if (n == 0) return LBR_DOMAIN;
  lbr_fraction common = hz[0], one = {1, 1};
  for (size_t i = 1; i < n; i++) {
    lbr_status status = lbr_fraction_gcd(common, hz[i], &common);
    if (status != LBR_OK) return status;
  }
  return lbr_fraction_div(one, common, seconds);
}

static lbr_status push(lbr_spans *s, lbr_span span) {
  if (s->count == s->room) {
    size_t room = s->room ? 2 * s->room : 256;
    if (room > MOST_SPANS) return LBR_OVERFLOW;
    lbr_span *item = realloc(s->item, room * sizeof *item);
    if (!item) return LBR_NO_MEMORY;
    s->item = item;
    s->room = room;
  }
  s->item[s->count++] = span;
  return LBR_OK;
}

/* The parts of a span in which hz makes nearly whole cycles. */
static lbr_status cut(lbr_spans *out, lbr_span span, double hz, double off) {
  double last = floor(hz * span.to + off);
  for (double k = fmax(ceil(hz * span.from - off), 1); k <= last; k++) {
    lbr_span part = {fmax(span.from, (k - off) / hz),
                     fmin(span.to, (k + off) / hz)};
    if (part.from > part.to) continue;
    lbr_status status = push(out, part);
    if (status != LBR_OK) return status;
  }
  return LBR_OK;
}

/* Line by line over [from, to]. */
static lbr_status search(const double *hz, size_t n, double off, double from,
                         double to, lbr_spans *spans) {
  lbr_spans now = {NULL, 0, 0}, next = {NULL, 0, 0};
  lbr_status status = push(&now, (lbr_span){from, to});
  for (size_t i = 0; i < n && status == LBR_OK; i++) {
    next.count = 0;
    for (size_t k = 0; k < now.count && status == LBR_OK; k++)
      status = cut(&next, now.item[k], hz[i], off);
    lbr_spans swap = now;
    now = next;
    next = swap;
  }
  lbr_spans_free(&next);
  if (status == LBR_OK)
    *spans = now;
  else
    lbr_spans_free(&now);
  return status;
}

/* The pattern of one period, over and over within [from, to]. */
static lbr_status repeat(const lbr_spans *one, double period, double from,
                         double to, lbr_spans *spans) {
  lbr_spans all = {NULL, 0, 0};
  lbr_status status = LBR_OK;
  double last = ceil(to / period);
  double first = fmax(floor(from / period) - 1, 0);
  for (double m = first; m <= last && status == LBR_OK; m++)
    for (size_t k = 0; k < one->count && status == LBR_OK; k++) {
      lbr_span span = {fmax(one->item[k].from + (m - 1) * period, from),
                       fmin(one->item[k].to + (m - 1) * period, to)};
      if (span.from <= span.to) status = push(&all, span);
    }
  if (status == LBR_OK)
    *spans = all;
  else
    lbr_spans_free(&all);
  return status;
}

lbr_status lbr_coherent_spans(const double *hz, size_t n, double off,
                              double period, double from, double to,
                              lbr_spans *spans) {
  if (!(period > 0) || to - from < 3 * period)
    return search(hz, n, off, from, to, spans);
  lbr_spans one = {NULL, 0, 0};
  lbr_status status =
      search(hz, n, off, period / 2, nextafter(period * 1.5, 0), &one);
  if (status == LBR_OK) status = repeat(&one, period, from, to, spans);
  lbr_spans_free(&one);
  return status;
}

/* Spans of durations as runs of whole numbers of clock periods. */
typedef struct runs {
  double *before; /* first - 1 */
  double *last;
  size_t count;
} runs;

typedef struct lbr_settings_piece chunk;

typedef struct job {
  const lbr_grid *grid;
  const lbr_pair_demand *demand;
  runs run;
  uint32_t first; /* divider of chunk 0 */
  uint32_t most;
  chunk *chunks;
} job;

static lbr_status keep(chunk *c, lbr_setting setting) {
  if (c->count == c->room) {
    size_t room = c->room ? 2 * c->room : 4096;
    if (room > MOST_SETTINGS) return LBR_OVERFLOW;
    lbr_setting *item = realloc(c->item, room * sizeof *item);
    if (!item) return LBR_NO_MEMORY;
    c->item = item;
    c->room = room;
  }
  c->item[c->count++] = setting;
  return LBR_OK;
}

#define CLONES __attribute__((target_clones("avx512f", "avx2", "default")))

#define LANES 16 /* dividers whose folds are worked out together */

/* Least distance, Hz, of a folded interferer from any line, for LANES rates
 * at once. */
CLONES static void clearance(const lbr_pair_demand *d, const double *rate,
                             double *least) {
  double shown[LANES], inverse[LANES];
  for (int k = 0; k < LANES; k++) {
    least[k] = INFINITY;
    inverse[k] = 1 / rate[k];
  }
  for (size_t j = 0; j < d->n_away; j++) {
    double hz = d->away[j];
    for (int k = 0; k < LANES; k++)
      shown[k] = fabs(hz - rate[k] * rint(hz * inverse[k]));
    for (size_t i = 0; i < d->n_lines; i++) {
      double line = d->line[i];
      for (int k = 0; k < LANES; k++) {
        double off = fabs(shown[k] - line);
        least[k] = off < least[k] ? off : least[k];
      }
    }
  }
}

/* Marks the runs that hold a multiple of the divider. */
CLONES static void mark(const double *before, const double *last, size_t n,
                        double inverse, unsigned char *hit) {
  for (size_t k = 0; k < n; k++)
    hit[k] = floor(last[k] * inverse + EXACT) >
             floor(before[k] * inverse + EXACT);
}

static size_t first_run(const runs *r, double periods) {
  size_t low = 0, high = r->count;
  while (low < high) {
    size_t middle = (low + high) / 2;
    if (r->last[middle] < periods)
      low = middle + 1;
    else
      high = middle;
  }
  return low;
}

static lbr_status take(const job *j, chunk *c, uint32_t divider, size_t k,
                       double inverse, double least_periods) {
  double d = divider, n = floor(j->run.before[k] * inverse + EXACT) + 1;
  double end = floor(j->run.last[k] * inverse + EXACT);
  double least = (double)j->grid->samples_least;
  double most = (double)j->grid->samples_most;
  if (n < least) n = least;
  if (end > most) end = most;
  for (; n <= end; n++) {
    if (n * d <= least_periods) continue;
    lbr_status status = keep(c, (lbr_setting){divider, (uint32_t)n});
    if (status != LBR_OK) return status;
  }
  return LBR_OK;
}

#define MARKS 1024
#define EIGHT sizeof(uint64_t)

/* Whether none of eight marks is set. */
static int none(const unsigned char *hit) {
  uint64_t eight;
  memcpy(&eight, hit, sizeof eight);
  return eight == 0;
}

static lbr_status one_divider(const job *j, chunk *c, uint32_t divider,
                              double clear) {
  unsigned char hit[MARKS + EIGHT] = {0};
  double inverse = 1.0 / divider;
  double periods = j->demand->bins / clear * j->grid->clock;
  double most = (double)j->grid->samples_most * divider;
  size_t k = first_run(&j->run, fmax(periods, (double)divider));
  size_t end = first_run(&j->run, most);
  if (end < j->run.count) end++;
  for (; k < end; k += MARKS) {
    size_t count = end - k < MARKS ? end - k : MARKS;
    mark(j->run.before + k, j->run.last + k, count, inverse, hit);
    memset(hit + count, 0, EIGHT);
    for (size_t i = 0; i < count; i++) {
      if (i % EIGHT == 0 && none(hit + i)) {
        i += EIGHT - 1;
        continue;
      }
      if (!hit[i]) continue;
      lbr_status status = take(j, c, divider, k + i, inverse, periods);
      if (status != LBR_OK) return status;
    }
  }
  return LBR_OK;
}

CLONES static lbr_status one_chunk(void *context, size_t task,
                                   unsigned worker) {
  job *j = context;
  double rate[LANES], clear[LANES];
  (void)worker;
  uint64_t from = j->first + (uint64_t)task * CHUNK, to = from + CHUNK - 1;
  lbr_status status = LBR_OK;
  if (to > j->most) to = j->most;
  for (uint64_t d = from; d <= to && status == LBR_OK; d++) {
    size_t lane = (size_t)(d - from) % LANES;
    if (lane == 0) {
      for (int k = 0; k < LANES; k++)
        rate[k] = j->grid->clock / (double)(d + (unsigned)k);
      clearance(j->demand, rate, clear);
    }
    status = one_divider(j, &j->chunks[task], (uint32_t)d, clear[lane]);
  }
  return status;
}

static lbr_status make_runs(const lbr_spans *spans, double clock, runs *r) {
  r->before = lbr_alloc(spans->count, sizeof *r->before);
  r->last = lbr_alloc(spans->count, sizeof *r->last);
  if (!r->before || !r->last) return LBR_NO_MEMORY;
  for (size_t k = 0; k < spans->count; k++) {
    double first = ceil(spans->item[k].from * clock - EXACT);
    double last = floor(spans->item[k].to * clock + EXACT);
    if (last < first) continue;
    r->before[r->count] = first - 1;
    r->last[r->count++] = last;
  }
  return LBR_OK;
}

void lbr_settings_free(lbr_settings *s) {
  for (size_t k = 0; s->piece && k < s->pieces; k++) free(s->piece[k].item);
  free(s->piece);
  *s = (lbr_settings){NULL, 0, 0};
}

void lbr_settings_join(const lbr_settings *s, lbr_setting *out) {
  for (size_t k = 0; k < s->pieces; k++) {
    const chunk *c = &s->piece[k];
    if (c->count > 0) memcpy(out, c->item, c->count * sizeof *out);
    out += c->count;
  }
}

static lbr_status run_job(job *j, unsigned workers, lbr_settings *out) {
  size_t tasks = (j->most - j->first) / CHUNK + 1;
  lbr_settings found = {lbr_alloc(tasks, sizeof *found.piece), tasks, 0};
  if (!found.piece) return LBR_NO_MEMORY;
  j->chunks = found.piece;
  lbr_status status = lbr_workers_run(one_chunk, j, tasks, workers);
  for (size_t t = 0; t < tasks; t++) found.count += found.piece[t].count;
  if (status == LBR_OK)
    *out = found;
  else
    lbr_settings_free(&found);
  return status;
}

lbr_status lbr_coherent_settings(const lbr_grid *grid,
                                 const lbr_pair_demand *demand,
                                 unsigned workers, lbr_settings *out) {
  if (demand->n_lines == 0 || grid->samples_most > UINT32_MAX)
    return LBR_DOMAIN;
  double top = demand->line[demand->n_lines - 1];
  double most = fmin(grid->divider_most, ceil(grid->clock / (2 * top)) - 1);
  *out = (lbr_settings){NULL, 0, 0};
  if (most < grid->divider_least) return LBR_OK;
  double longest = fmin(grid->most_duration,
                        most * (double)grid->samples_most / grid->clock);
  double shortest = (double)grid->samples_least * grid->divider_least /
                    grid->clock;
  lbr_spans spans = {NULL, 0, 0};
  job j = {.grid = grid, .demand = demand, .first = grid->divider_least,
           .most = (uint32_t)most};
  lbr_status status = lbr_coherent_spans(
      demand->line, demand->n_lines, demand->off, demand->period, shortest,
      longest, &spans);
  if (status == LBR_OK) status = make_runs(&spans, grid->clock, &j.run);
  if (status == LBR_OK) status = run_job(&j, workers, out);
  lbr_spans_free(&spans);
  free(j.run.before);
  free(j.run.last);
  return status;
}
