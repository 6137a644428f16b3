#include "plan/search.h"

#include <math.h>
#include <stdlib.h>

#include "base/checked.h"
#include "plan/heap.h"
#include "plan/limits.h"
#include "plan/relax.h"

#define FEW 64         /* so many candidates go onto the hardware at once */
#define SURVEY 16      /* expansions of a mode before all rates are surveyed */
#define EDGE 1e-12     /* relative: lengths on the edge of a range are in */
#define BOUND_WORK 0.5 /* microseconds of a full bound, per line and source */

typedef struct mode_state {
  lbr_kernel *endless; /* kernel of an endless record */
  lbr_kernel *kernel;  /* kernel at the candidate's length */
  double moment;       /* lbr_second_moment */
  double least;        /* shortest duration that could do */
  size_t fewest;       /* samples */
  size_t expansions;
  uint32_t *active;    /* rates by ascending least duration, once surveyed */
  double *active_least;
  size_t n_active;
  size_t stern;        /* the line that failed last, tried first */
} mode_state;

typedef struct search {
  const lbr_problem *p;
  lbr_relax relax;
  lbr_limits *limits;
  lbr_heap heap;
  mode_state *mode;
  double sum_rates; /* S/s, of all rates together */
  double longest;   /* duration of the longest record any rate allows, s */
  lbr_search_count *count;
} search;

static lbr_status open_mode(search *s, size_t m) {
  mode_state *state = &s->mode[m];
  const lbr_mode *mode = &s->p->modes[m];
  lbr_status status = lbr_kernel_new(&mode->window, 0, &state->endless);
  if (status == LBR_OK)
    status = lbr_kernel_new(&mode->window, 1024, &state->kernel);
  if (status == LBR_OK) status = lbr_second_moment(&mode->window, &state->moment);
  if (status != LBR_OK) return status;
  size_t fewest = lbr_mode_least_samples(mode);
  state->fewest = fewest > s->p->least_samples ? fewest : s->p->least_samples;
  state->least = lbr_relax_least(&s->relax, state->endless);
  double fastest = s->p->rates->item[s->p->rates->count - 1].value;
  state->least = fmax(state->least, (double)state->fewest / fastest);
  if (state->least > s->longest) return LBR_OK;
  return lbr_heap_push(&s->heap,
                       (lbr_node){.t1 = state->least * (1 - EDGE),
                                  .t2 = s->longest * (1 + EDGE),
                                  .mode = (uint32_t)m});
}

static lbr_status open_search(search *s, const lbr_problem *p) {
  lbr_status status = lbr_relax_new(p, &s->relax);
  if (status == LBR_OK) status = lbr_limits_new(p, &s->limits);
  if (status != LBR_OK) return status;
  s->mode = lbr_alloc(p->n_modes, sizeof *s->mode);
  if (!s->mode) return LBR_NO_MEMORY;
  for (size_t r = 0; r < p->rates->count; r++)
    s->sum_rates += p->rates->item[r].value;
  s->longest = fmin(p->most_duration,
                    (double)p->most_samples / p->rates->item[0].value);
  for (size_t m = 0; m < p->n_modes && status == LBR_OK; m++)
    status = open_mode(s, m);
  return status;
}

static void close_search(search *s) {
  for (size_t m = 0; s->mode && m < s->p->n_modes; m++) {
    lbr_kernel_free(s->mode[m].endless);
    lbr_kernel_free(s->mode[m].kernel);
    free(s->mode[m].active);
    free(s->mode[m].active_least);
  }
  free(s->mode);
  lbr_heap_free(&s->heap);
  lbr_limits_free(s->limits);
  lbr_relax_free(&s->relax);
}

static lbr_status make_case(search *s, const lbr_node *node, lbr_case *c) {
  mode_state *m = &s->mode[node->mode];
  *c = (lbr_case){.scene = s->p->scene,
                  .front = s->p->front,
                  .path = lbr_limits_path(s->limits, node->rate),
                  .kernel = m->kernel,
                  .reading = s->p->modes[node->mode].reading,
                  .n = node->n,
                  .averages = s->p->averages,
                  .coverage = s->p->coverage,
                  .second_moment = m->moment};
  return lbr_kernel_resize(m->kernel, node->n);
}

/* Runs over the lines, the one that failed last first. */
static size_t line_at(const mode_state *m, size_t k) {
  if (k == 0) return m->stern;
  return k <= m->stern ? k - 1 : k;
}

static lbr_status glance(search *s, const lbr_node *node, bool *fits) {
  mode_state *m = &s->mode[node->mode];
  lbr_case c;
  lbr_status status = make_case(s, node, &c);
  *fits = status == LBR_OK;
  for (size_t k = 0; *fits && k < c.scene->n_lines; k++) {
    size_t line = line_at(m, k);
    s->count->work += 0.05 * (double)c.scene->n_sources + 0.2;
    *fits = lbr_bound_glance(&c, line) <= s->p->share;
    if (!*fits) m->stern = line;
  }
  return status;
}

static lbr_status holds(search *s, const lbr_node *node, bool *fits) {
  mode_state *m = &s->mode[node->mode];
  lbr_case c;
  lbr_bound bound;
  lbr_status status = make_case(s, node, &c);
  *fits = status == LBR_OK;
  s->count->bounds++;
  for (size_t k = 0; *fits && k < c.scene->n_lines; k++) {
    size_t line = line_at(m, k);
    s->count->work += BOUND_WORK * (double)c.scene->n_sources;
    lbr_bound_line(&c, line, s->p->share, &bound);
    *fits = bound.ratio <= s->p->share;
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
  n = fmax(n, ceil((double)s->mode[range->mode].fewest / block) * block);
  for (; n <= most && n < range->t2 * rate; n += block) {
    double t = n / rate;
    lbr_node leaf = {t, t, (size_t)n, range->mode, r};
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

static lbr_status least_of(search *s, size_t rate, size_t mode,
                           double *least) {
  lbr_status status = lbr_limits_least(s->limits, rate, mode,
                                       s->mode[mode].endless, least);
  s->count->work += 0.01;
  return status;
}

static int by_least(const void *left, const void *right) {
  const double *a = left, *b = right;
  if (a[0] != b[0]) return a[0] < b[0] ? -1 : 1;
  return a[1] < b[1] ? -1 : a[1] > b[1];
}

/* Asks every rate for its shortest duration and keeps those that can do. */
static lbr_status survey(search *s, size_t mode) {
  mode_state *m = &s->mode[mode];
  size_t rates = s->p->rates->count, kept = 0;
  double(*row)[2] = lbr_alloc(rates, sizeof *row);
  m->active = lbr_alloc(rates, sizeof *m->active);
  m->active_least = lbr_alloc(rates, sizeof *m->active_least);
  lbr_status status = row && m->active && m->active_least ? LBR_OK
                                                          : LBR_NO_MEMORY;
  for (size_t r = 0; r < rates && status == LBR_OK; r++) {
    double least = 0;
    status = least_of(s, r, mode, &least);
    s->count->work += 5;
    if (least > s->longest) continue;
    row[kept][0] = least;
    row[kept++][1] = (double)r;
  }
  if (status == LBR_OK && kept > 1) qsort(row, kept, sizeof *row, by_least);
  for (size_t k = 0; k < kept && status == LBR_OK; k++) {
    m->active_least[k] = row[k][0];
    m->active[k] = (uint32_t)row[k][1];
  }
  m->n_active = kept;
  m->least = kept && row ? fmax(m->least, row[0][0]) : INFINITY;
  free(row);
  return status;
}

static lbr_status expand(search *s, const lbr_node *range) {
  mode_state *m = &s->mode[range->mode];
  lbr_status status = LBR_OK;
  if (m->expansions++ == SURVEY) status = survey(s, range->mode);
  if (status != LBR_OK) return status;
  if (m->active) {
    for (size_t k = 0; k < m->n_active && status == LBR_OK; k++) {
      if (m->active_least[k] >= range->t2) break;
      status = expand_rate(s, range, m->active[k]);
    }
    return status;
  }
  for (uint32_t r = 0; r < s->p->rates->count && status == LBR_OK; r++) {
    double rate = s->p->rates->item[r].value, least, block;
    block = (double)s->p->block;
    if (ceil(range->t1 * rate / block * (1 - EDGE)) * block >=
        range->t2 * rate)
      continue;
    status = least_of(s, r, range->mode, &least);
    if (status == LBR_OK && least < range->t2)
      status = expand_rate(s, range, r);
  }
  return status;
}

static double candidates_in(const search *s, const lbr_node *range) {
  return s->sum_rates * (range->t2 - range->t1) / (double)s->p->block;
}

/* A range: leave it out, put it onto the hardware, or cut it in two. */
static lbr_status visit(search *s, lbr_node range) {
  mode_state *m = &s->mode[range.mode];
  double few = fmax(FEW, (double)s->p->rates->count / 4);
  s->count->ranges++;
  s->count->work += 0.2;
  if (range.t2 <= m->least) return LBR_OK;
  if (range.t1 < m->least * (1 - EDGE)) {
    range.t1 = m->least * (1 - EDGE);
    return lbr_heap_push(&s->heap, range);
  }
  if (!lbr_relax_possible(&s->relax, &s->p->modes[range.mode], m->endless,
                          range.t1, range.t2, &s->count->work))
    return LBR_OK;
  if (candidates_in(s, &range) <= few || range.t2 - range.t1 < 1e-12 * range.t1)
    return expand(s, &range);
  double middle = range.t2 > 2 * range.t1 ? sqrt(range.t1 * range.t2)
                                          : (range.t1 + range.t2) / 2;
  lbr_node left = range, right = range;
  left.t2 = right.t1 = middle;
  lbr_status status = lbr_heap_push(&s->heap, left);
  return status == LBR_OK ? lbr_heap_push(&s->heap, right) : status;
}

static lbr_status run(search *s, lbr_choice *choice) {
  lbr_node node;
  while (lbr_heap_pop(&s->heap, &node)) {
    lbr_status status;
    bool fits = false;
    if (node.n == 0)
      status = visit(s, node);
    else
      status = holds(s, &node, &fits);
    if (status != LBR_OK) return status;
    if (fits) {
      *choice = (lbr_choice){node.rate, node.mode, node.n};
      return LBR_OK;
    }
    if (s->count->work > s->p->most_work) return LBR_STOPPED;
  }
  return LBR_INFEASIBLE;
}

lbr_status lbr_search_run(const lbr_problem *p, lbr_choice *choice,
                          lbr_search_count *count) {
  *count = (lbr_search_count){0, 0, 0, 0};
  if (p->rates->count == 0 || p->scene->n_lines == 0) return LBR_INFEASIBLE;
  search s = {.p = p, .count = count};
  lbr_status status = open_search(&s, p);
  if (status == LBR_OK) status = run(&s, choice);
  close_search(&s);
  return status;
}
