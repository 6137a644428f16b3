#include "plan/descent.h"

#include <math.h>
#include <stdatomic.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "base/checked.h"
#include "plan/heap.h"
#include "plan/limits.h"
#include "plan/relax.h"

#define FEW 64         /* so many candidates go onto the hardware at once */
#define SURVEY 16      /* expansions of a mode before all rates are surveyed */
#define EDGE 1e-12     /* relative: lengths on the edge of a range are in */
#define ASK_WORK 0.3   /* microseconds of a kernel enclosure */
#define LOOSE 1.005    /* lower bounds made of enclosures may be high by this */

typedef struct mode_state {
  lbr_kernel *endless; /* kernel of an endless record */
  lbr_kernel *kernel;  /* kernel at the candidate's length */
  double moment;       /* lbr_second_moment */
  double enbw;         /* noise bandwidth, bins; 0: depends on the length */
  size_t fewest;       /* samples */
  size_t stern;        /* the line that failed last, tried first */
} mode_state;

typedef struct band { /* rates within a factor of two */
  lbr_relax relax;
  size_t first, count; /* of the problem's rates */
  double sum;          /* S/s, of all its rates together */
  double longest;      /* duration of the longest record, s */
} band;

/* A mode on a band of rates. */
typedef struct field {
  const band *band;
  mode_state *mode;
  size_t mode_at;      /* index of the mode */
  double *kept;        /* lbr_relax_kept, thinned at the first visit */
  bool thinned;
  size_t stern;        /* the line the relaxation failed at last */
  double least;        /* shortest duration that could do */
  size_t expansions;
  uint32_t *active;    /* rates by ascending least duration, once surveyed */
  double *active_least;
  size_t n_active;
} field;

typedef struct search {
  const lbr_problem *p;
  lbr_care care;
  lbr_limits *limits;
  lbr_heap heap;
  mode_state *mode;    /* p->n_modes */
  band *bands;
  size_t n_bands;
  field *fields;       /* n_modes * n_bands */
  lbr_search_count *count;
  _Atomic uint64_t *best; /* shortest duration anybody found, as bits */
  double started;         /* processor time of this thread, s */
  size_t steps;           /* of the loop, to look at the clock now and then */
} search;

#define LOOK_EVERY 64 /* steps between looks at the clock */
#define PATIENCE 2.0  /* processor time allowed over the estimated work */

static double processor_time(void) {
  struct timespec t;
  if (clock_gettime(CLOCK_THREAD_CPUTIME_ID, &t) != 0) return 0;
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* Work is counted, so that results do not depend on the machine; the clock
 * only guards against work that was counted far too low. */
static bool too_long(search *s) {
  if (s->count->work > s->p->most_work) return true;
  if (++s->steps % LOOK_EVERY != 0) return false;
  double spent = processor_time() - s->started;
  return spent > PATIENCE * 1e-6 * s->p->most_work + 0.05;
}

static lbr_status open_mode(const search *s, size_t m) {
  mode_state *state = &s->mode[m];
  const lbr_mode *mode = &s->p->modes[m];
  lbr_status status = lbr_kernel_new(&mode->window, 0, &state->endless);
  if (status == LBR_OK)
    status = lbr_kernel_new(&mode->window, 1024, &state->kernel);
  if (status == LBR_OK)
    status = lbr_second_moment(&mode->window, &state->moment);
  if (status == LBR_OK && mode->window.shape->terms > 0)
    state->enbw = lbr_kernel_noise_bandwidth(state->endless);
  size_t fewest = lbr_mode_least_samples(mode);
  state->fewest = fewest > s->p->least_samples ? fewest : s->p->least_samples;
  return status;
}

static lbr_status open_bands(search *s) {
  const lbr_rates *rates = s->p->rates;
  double span = rates->item[rates->count - 1].value / rates->item[0].value;
  s->bands = lbr_alloc((size_t)log2(span) + 2, sizeof *s->bands);
  if (!s->bands) return LBR_NO_MEMORY;
  for (size_t r = 0; r < rates->count; s->n_bands++) {
    band *b = &s->bands[s->n_bands];
    double lowest = rates->item[r].value;
    b->first = r;
    for (; r < rates->count && rates->item[r].value < 2 * lowest; r++)
      b->sum += rates->item[r].value;
    b->count = r - b->first;
    b->longest = fmin(s->p->most_duration,
                      (double)s->p->most_samples / lowest);
    lbr_status status = lbr_relax_new(s->p, lowest, &b->relax);
    if (status != LBR_OK) return status;
  }
  return LBR_OK;
}

static lbr_status open_field(search *s, size_t m, size_t b) {
  size_t at = m * s->n_bands + b;
  field *f = &s->fields[at];
  f->band = &s->bands[b];
  f->mode = &s->mode[m];
  f->mode_at = m;
  size_t last = f->band->first + f->band->count - 1;
  const lbr_relax *relax = &f->band->relax;
  f->kept = lbr_alloc(relax->n_pairs, sizeof *f->kept);
  if (!f->kept) return LBR_NO_MEMORY;
  lbr_status status = lbr_relax_kept(relax, f->mode->endless, f->mode->kernel,
                                     f->kept);
  if (status != LBR_OK) return status;
  double fewest = (double)f->mode->fewest / s->p->rates->item[last].value;
  f->least = lbr_relax_least(relax, s->p->modes[m].reading, f->mode->endless,
                             f->kept);
  f->least = fmax(fmax(f->least, fewest), s->p->least_duration);
  if (f->least > f->band->longest) return LBR_OK;
  return lbr_heap_push(&s->heap,
                       (lbr_node){.t1 = f->least * (1 - EDGE),
                                  .t2 = f->band->longest * (1 + EDGE),
                                  .field = (uint32_t)at});
}

static lbr_status open_search(search *s) {
  lbr_status status = lbr_limits_new(s->p, &s->limits);
  if (status == LBR_OK) status = open_bands(s);
  if (status != LBR_OK) return status;
  s->mode = lbr_alloc(s->p->n_modes, sizeof *s->mode);
  s->fields = lbr_alloc(s->p->n_modes * s->n_bands, sizeof *s->fields);
  if (!s->mode || !s->fields) return LBR_NO_MEMORY;
  for (size_t m = 0; m < s->p->n_modes && status == LBR_OK; m++) {
    status = open_mode(s, m);
    for (size_t b = 0; b < s->n_bands && status == LBR_OK; b++)
      status = open_field(s, m, b);
  }
  return status;
}

static void close_search(search *s) {
  for (size_t m = 0; s->mode && m < s->p->n_modes; m++) {
    lbr_kernel_free(s->mode[m].endless);
    lbr_kernel_free(s->mode[m].kernel);
  }
  for (size_t f = 0; s->fields && f < s->p->n_modes * s->n_bands; f++) {
    free(s->fields[f].active);
    free(s->fields[f].kept);
    free(s->fields[f].active_least);
  }
  for (size_t b = 0; b < s->n_bands; b++) lbr_relax_free(&s->bands[b].relax);
  free(s->mode);
  free(s->fields);
  free(s->bands);
  lbr_heap_free(&s->heap);
  lbr_limits_free(s->limits);
}

static lbr_status make_case(search *s, const lbr_node *node, lbr_case *c) {
  const field *f = &s->fields[node->field];
  const mode_state *m = f->mode;
  *c = (lbr_case){.scene = s->p->scene,
                  .front = s->p->front,
                  .path = lbr_limits_path(s->limits, node->rate),
                  .kernel = m->kernel,
                  .reading = s->p->modes[f->mode_at].reading,
                  .n = node->n,
                  .averages = s->p->averages,
                  .coverage = s->p->coverage,
                  .second_moment = m->moment,
                  .noise_bandwidth = m->enbw};
  lbr_status status = lbr_kernel_resize(m->kernel, node->n);
  if (status == LBR_OK && m->enbw <= 0)
    c->noise_bandwidth = lbr_kernel_noise_bandwidth(m->kernel);
  return status;
}

/* Runs over the lines, the one that failed last first. */
static size_t line_at(const mode_state *m, size_t k) {
  if (k == 0) return m->stern;
  return k <= m->stern ? k - 1 : k;
}

static lbr_status glance(search *s, const lbr_node *node, bool *fits) {
  mode_state *m = s->fields[node->field].mode;
  lbr_case c;
  lbr_status status = make_case(s, node, &c);
  *fits = status == LBR_OK;
  for (size_t k = 0; *fits && k < c.scene->n_lines; k++) {
    size_t line = line_at(m, k);
    s->count->work += 0.05 * (double)c.scene->n_sources + 0.2;
    *fits = lbr_bound_glance(&c, line, s->p->share) <= s->p->share;
    if (!*fits) m->stern = line;
  }
  return status;
}

/* The tighter lower bound first: most of what a glance lets through fails
 * there, long before its full bound is known. */
static bool line_holds(search *s, const lbr_case *c, size_t line) {
  size_t asked = 0;
  double share = s->p->share;
  bool reached =
      lbr_bound_reached(c, line, s->care, share * LOOSE, &asked) <=
      share * LOOSE;
  s->count->work += ASK_WORK * (double)asked;
  if (!reached) return false;
  lbr_bound bound;
  lbr_bound_line(c, line, s->care, share, &bound);
  s->count->bounds++;
  s->count->work += ASK_WORK * (double)bound.asked;
  return bound.ratio <= share;
}

static lbr_status holds(search *s, const lbr_node *node, bool *fits) {
  mode_state *m = s->fields[node->field].mode;
  lbr_case c;
  lbr_status status = make_case(s, node, &c);
  *fits = status == LBR_OK;
  for (size_t k = 0; *fits && k < c.scene->n_lines; k++) {
    size_t line = line_at(m, k);
    *fits = line_holds(s, &c, line);
    if (!*fits) m->stern = line;
  }
  return status;
}

/* All lengths of one rate in the range, as candidates. */
static lbr_status expand_rate(search *s, const lbr_node *range, uint32_t r) {
  const lbr_problem *p = s->p;
  double rate = p->rates->item[r].value, block = (double)p->block;
  double n = ceil(range->t1 * rate / block * (1 - EDGE)) * block;
  double most = fmin((double)p->most_samples, p->most_duration * rate *
                                                  (1 + EDGE));
  double fewest = (double)s->fields[range->field].mode->fewest;
  n = fmax(n, ceil(fewest / block) * block);
  for (; n <= most && n < range->t2 * rate; n += block) {
    double t = n / rate;
    lbr_node leaf = {t, t, (size_t)n, range->field, r};
    bool fits;
    if (t < range->t1) continue;
    s->count->candidates++;
    lbr_status status = glance(s, &leaf, &fits);
    if (status == LBR_OK && fits) status = lbr_heap_push(&s->heap, leaf);
    if (status != LBR_OK) return status;
    if (s->count->work > p->most_work) return LBR_STOPPED;
  }
  return LBR_OK;
}

static lbr_status least_of(search *s, const field *f, size_t rate,
                           double *least) {
  s->count->work += 0.01;
  return lbr_limits_least(s->limits, rate, f->mode_at, f->mode->endless,
                          least);
}

static int by_least(const void *left, const void *right) {
  const double *a = left, *b = right;
  if (a[0] != b[0]) return a[0] < b[0] ? -1 : 1;
  return a[1] < b[1] ? -1 : a[1] > b[1];
}

/* Asks every rate of the band for its shortest duration and keeps those that
 * can do, shortest first. */
static lbr_status survey(search *s, field *f) {
  size_t kept = 0, rates = f->band->count;
  double(*row)[2] = lbr_alloc(rates, sizeof *row);
  f->active = lbr_alloc(rates, sizeof *f->active);
  f->active_least = lbr_alloc(rates, sizeof *f->active_least);
  lbr_status status = row && f->active && f->active_least ? LBR_OK
                                                          : LBR_NO_MEMORY;
  for (size_t r = f->band->first; r < f->band->first + rates; r++) {
    double least = 0;
    if (status == LBR_OK) status = least_of(s, f, r, &least);
    if (status != LBR_OK) break;
    s->count->work += 5;
    if (least > f->band->longest) continue;
    row[kept][0] = least;
    row[kept++][1] = (double)r;
  }
  if (status == LBR_OK && kept > 1) qsort(row, kept, sizeof *row, by_least);
  for (size_t k = 0; k < kept && status == LBR_OK; k++) {
    f->active_least[k] = row[k][0];
    f->active[k] = (uint32_t)row[k][1];
  }
  f->n_active = kept;
  f->least = kept && row ? fmax(f->least, row[0][0]) : INFINITY;
  free(row);
  return status;
}

/* Whether any length of the rate lies in the range. */
static bool meets(const search *s, const lbr_node *range, double rate) {
  double block = (double)s->p->block;
  double n = ceil(range->t1 * rate / block * (1 - EDGE)) * block;
  return n < range->t2 * rate;
}

static lbr_status expand(search *s, const lbr_node *range) {
  field *f = &s->fields[range->field];
  lbr_status status = LBR_OK;
  if (f->expansions++ == SURVEY) status = survey(s, f);
  for (size_t k = 0; f->active && k < f->n_active && status == LBR_OK; k++) {
    if (f->active_least[k] >= range->t2) break;
    status = expand_rate(s, range, f->active[k]);
  }
  if (f->active || status != LBR_OK) return status;
  size_t end = f->band->first + f->band->count;
  for (size_t r = f->band->first; r < end && status == LBR_OK; r++) {
    double least = 0;
    if (!meets(s, range, s->p->rates->item[r].value)) continue;
    status = least_of(s, f, r, &least);
    if (status == LBR_OK && least < range->t2)
      status = expand_rate(s, range, (uint32_t)r);
  }
  return status;
}

/* A range: leave it out, put it onto the hardware, or cut it in two. */
static lbr_status visit(search *s, lbr_node range) {
  field *f = &s->fields[range.field];
  double few = fmax(FEW, (double)f->band->count / 4);
  s->count->ranges++;
  s->count->work += 0.2;
  if (range.t2 <= f->least) return LBR_OK;
  if (range.t1 < f->least * (1 - EDGE)) {
    range.t1 = f->least * (1 - EDGE);
    return lbr_heap_push(&s->heap, range);
  }
  if (!f->thinned) {
    lbr_relax_thin(&f->band->relax, f->mode->endless, f->least, f->kept);
    f->thinned = true;
  }
  if (!lbr_relax_possible(&f->band->relax, &s->p->modes[f->mode_at], s->care,
                          f->mode->endless, f->kept, range.t1, range.t2,
                          &f->stern, &s->count->work))
    return LBR_OK;
  double width = range.t2 - range.t1;
  if (f->band->sum * width / (double)s->p->block <= few ||
      width < 1e-12 * range.t1)
    return expand(s, &range);
  double middle = range.t2 > 2 * range.t1 ? sqrt(range.t1 * range.t2)
                                          : (range.t1 + range.t2) / 2;
  lbr_node left = range, right = range;
  left.t2 = right.t1 = middle;
  lbr_status status = lbr_heap_push(&s->heap, left);
  return status == LBR_OK ? lbr_heap_push(&s->heap, right) : status;
}

/* Bits of a duration: positive doubles are in the order of their bits. */
static uint64_t bits_of(double t) {
  uint64_t bits;
  memcpy(&bits, &t, sizeof bits);
  return bits;
}

static void tell_best(search *s, double t) {
  uint64_t mine = bits_of(t), best = atomic_load(s->best);
  while (mine < best && !atomic_compare_exchange_weak(s->best, &best, mine))
    continue;
}

static lbr_status run(search *s, lbr_choice *choice) {
  lbr_node node;
  while (lbr_heap_pop(&s->heap, &node)) {
    lbr_status status;
    bool fits = false;
    s->count->open = node.t1;
    if (bits_of(node.t1 * (1 - EDGE)) > atomic_load(s->best)) break;
    if (node.n == 0)
      status = visit(s, node);
    else
      status = holds(s, &node, &fits);
    if (status != LBR_OK) return status;
    if (fits) {
      *choice = (lbr_choice){node.rate, s->fields[node.field].mode_at, node.n};
      tell_best(s, node.t1);
      return LBR_OK;
    }
    if (too_long(s)) return LBR_STOPPED;
  }
  return LBR_INFEASIBLE;
}

lbr_status lbr_descent_run(const lbr_problem *p, lbr_care care,
                           _Atomic uint64_t *best, lbr_choice *choice,
                           lbr_search_count *count) {
  search s = {.p = p, .care = care, .count = count, .best = best,
              .started = processor_time()};
  lbr_status status = open_search(&s);
  if (status == LBR_OK) status = run(&s, choice);
  if (status != LBR_STOPPED) count->open = INFINITY;
  close_search(&s);
  return status;
}
