#include "plan/search.h"

#include <math.h>
#include <stdatomic.h>
#include <stdlib.h>

#include "base/checked.h"
#include "base/workers.h"
#include "plan/descent.h"

#define EDGE 1e-12 /* relative: durations closer than this are the same */
#define PARTS 2    /* threads that search side by side */

/* A share of the modes, searched by one thread. */
typedef struct part {
  lbr_problem problem; /* modes: its own list */
  lbr_mode *modes;
  lbr_choice choice;   /* mode: index into its own list */
  lbr_search_count count;
  lbr_status status;
} part;

typedef struct split {
  part *parts;
  size_t n_parts;
  lbr_care care;
  _Atomic uint64_t best;
} split;

/* Always LBR_OK: a part that finds nothing does not stop the others. */
static lbr_status search_part(void *context, size_t task, unsigned worker) {
  split *all = context;
  part *mine = &all->parts[task];
  (void)worker;
  mine->status = lbr_descent_run(&mine->problem, all->care, &all->best,
                                 &mine->choice, &mine->count);
  return LBR_OK;
}

/* Every n-th mode goes to one part; how many parts there are must not depend
 * on the machine, as each has its share of the work that may be done. */
static lbr_status open_parts(split *all, const lbr_problem *p) {
  size_t n = PARTS;
  if (n > p->n_modes) n = p->n_modes;
  all->parts = lbr_alloc(n, sizeof *all->parts);
  if (!all->parts) return LBR_NO_MEMORY;
  for (all->n_parts = 0; all->n_parts < n; all->n_parts++) {
    part *one = &all->parts[all->n_parts];
    one->problem = *p;
    one->problem.n_modes = (p->n_modes - all->n_parts + n - 1) / n;
    one->modes = lbr_alloc(one->problem.n_modes, sizeof *one->modes);
    if (!one->modes) return LBR_NO_MEMORY;
    for (size_t m = 0; m < one->problem.n_modes; m++)
      one->modes[m] = p->modes[all->n_parts + m * n];
    one->problem.modes = one->modes;
    one->problem.most_work = p->most_work / (double)n;
  }
  return LBR_OK;
}

static void add_count(lbr_search_count *sum, const lbr_search_count *more) {
  sum->ranges += more->ranges;
  sum->candidates += more->candidates;
  sum->bounds += more->bounds;
  sum->work += more->work;
  sum->open = fmin(sum->open, more->open);
}

static double duration(const lbr_problem *p, const lbr_choice *choice) {
  return (double)choice->n / p->rates->item[choice->rate].value;
}

/* Shorter, then fewer samples, then the earlier mode. */
static bool better(const lbr_problem *p, const lbr_choice *a,
                   const lbr_choice *b) {
  double ta = duration(p, a), tb = duration(p, b);
  if (fabs(ta - tb) > EDGE * tb) return ta < tb;
  if (a->n != b->n) return a->n < b->n;
  return a->mode < b->mode;
}

/* The best of the parts; what went wrong, or that somebody gave up, counts
 * only as far as it can have hidden something better. */
static lbr_status gather(const split *all, const lbr_problem *p,
                         lbr_choice *choice, lbr_search_count *count) {
  lbr_status worst = LBR_INFEASIBLE;
  bool found = false;
  for (size_t k = 0; k < all->n_parts; k++) {
    const part *one = &all->parts[k];
    add_count(count, &one->count);
    if (one->status == LBR_OK) {
      lbr_choice mine = one->choice;
      mine.mode = k + mine.mode * all->n_parts;
      if (!found || better(p, &mine, choice)) *choice = mine;
      found = true;
    } else if (one->status != LBR_INFEASIBLE && worst != LBR_NO_MEMORY) {
      worst = one->status;
    }
  }
  if (worst != LBR_INFEASIBLE && worst != LBR_STOPPED) return worst;
  if (found && count->open * (1 + EDGE) >= duration(p, choice))
    count->open = INFINITY;
  return found ? LBR_OK : worst;
}

static lbr_status search_once(const lbr_problem *p, lbr_care care,
                              lbr_choice *choice, lbr_search_count *count) {
  split all = {.care = care};
  atomic_init(&all.best, UINT64_MAX);
  lbr_status status = open_parts(&all, p);
  if (status == LBR_OK)
    status = lbr_workers_run(search_part, &all, all.n_parts, 0);
  if (status == LBR_OK) status = gather(&all, p, choice, count);
  for (size_t k = 0; all.parts && k < all.n_parts; k++)
    free(all.parts[k].modes);
  free(all.parts);
  return status;
}

#define FEW_IN_ALL 1e5 /* so many candidates can all be looked at with care */
#define NEAR 0.85      /* where there are more, only this close to the plain
                          plan are shorter ones looked for */

/* The problem of beating a choice. */
static lbr_problem beat(const lbr_problem *p, const lbr_choice *choice) {
  lbr_problem narrow = *p;
  double t = duration(p, choice), sum = 0;
  for (size_t r = 0; r < p->rates->count; r++) sum += p->rates->item[r].value;
  narrow.most_duration = t * (1 - 4 * EDGE);
  narrow.most_work = p->care_work;
  if (sum * t / (double)p->block > FEW_IN_ALL) {
    narrow.least_duration = fmax(NEAR * t, p->least_duration);
    narrow.most_work /= 4; /* a try: there is too much to see it through */
  }
  return narrow;
}

lbr_status lbr_search_run(const lbr_problem *p, lbr_choice *choice,
                          lbr_search_count *count) {
  *count = (lbr_search_count){.open = INFINITY};
  if (p->rates->count == 0 || p->scene->n_lines == 0) return LBR_INFEASIBLE;
  lbr_search_count more = {.open = INFINITY};
  lbr_choice shorter;
  lbr_status status = search_once(p, LBR_CARE_PLAIN, choice, count);
  if (status != LBR_OK && status != LBR_INFEASIBLE) return status;
  lbr_problem narrow = status == LBR_OK ? beat(p, choice) : *p;
  if (status == LBR_OK && p->care_work <= 0) return LBR_OK;
  lbr_status again = search_once(&narrow, LBR_CARE_JOINT, &shorter, &more);
  if (status == LBR_OK) more.open = INFINITY; /* it may end where it likes */
  add_count(count, &more);
  if (again == LBR_OK) {
    *choice = shorter;
    return LBR_OK;
  }
  if (status == LBR_OK && (again == LBR_INFEASIBLE || again == LBR_STOPPED))
    return LBR_OK;
  return again;
}
