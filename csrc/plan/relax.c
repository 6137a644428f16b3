#include "plan/relax.h"

#include <math.h>
#include <stdlib.h>

#include "base/checked.h"

#define TRUST 0.97     /* kernels of finite length may be lower by this */
#define MODEL 512      /* length at which finite kernels are looked at */
#define MARGIN 1e-8    /* and enclosures looser by this */
#define STEADY 0.9999  /* noise bandwidths differ less with the length */

/* Least gain any rate of the band gives a source over its interval: low-pass
 * filters whose corner follows the rate are lowest at the lowest. */
static double least_gain(const lbr_problem *p, double rate, size_t j) {
  double low, high, half = lbr_half_width(p->scene, j);
  double hz = p->scene->sources[j].hz;
  lbr_filter_range(&p->front->filter, fmax(hz - half, 0), hz + half,
                   rate, &low, &high);
  return low * pow(10, -p->front->filter.ripple_db / 20);
}

static double most_gain(const lbr_problem *p) {
  double most = 1;
  for (size_t i = 0; i < p->front->filter.points; i++)
    most = fmax(most, pow(10, p->front->filter.point_db[i] / 20));
  return most;
}

static double allowed(const lbr_problem *p, size_t i) {
  const lbr_line *line = &p->scene->lines[i];
  double error = line->tolerance * p->scene->sources[i].least;
  return p->share * fmin(error, line->tolerance_abs);
}

static void add(lbr_relax *r, lbr_pair pair) {
  double near = r->rate / 2;
  if (pair.low < 0) {
    double other = pair.high < 0 ? -pair.high : 0;
    pair.high = fmax(-pair.low, pair.high);
    pair.low = other;
  }
  if (pair.high <= near && pair.weight > 0) r->pair[r->n_pairs++] = pair;
}

/* Distances between line i and source j, difference and sum. */
static void add_source(lbr_relax *r, size_t i, size_t j, double weight) {
  const lbr_scene *s = r->problem->scene;
  const lbr_source *a = &s->sources[i], *b = &s->sources[j];
  double own = b->lock_hz * s->spread[b->driver];
  if (b->wander > 0) return; /* spread over sidebands: left to the bound */
  for (double sign = 1; sign >= -1; sign -= 2) {
    double hz = b->hz - sign * a->hz, half = own;
    if (a->driver == b->driver)
      half = fabs(b->lock_hz - sign * a->lock_hz) * s->spread[a->driver];
    add(r, (lbr_pair){i, hz - half, hz + half, b->hz, own, sign, weight});
  }
}

static int by_line_then_weight(const void *left, const void *right) {
  const lbr_pair *a = left, *b = right;
  if (a->line != b->line) return a->line < b->line ? -1 : 1;
  if (a->weight != b->weight) return a->weight > b->weight ? -1 : 1;
  return a->low < b->low ? -1 : a->low > b->low;
}

static void fill(lbr_relax *r) {
  const lbr_problem *p = r->problem;
  double most = most_gain(p);
  for (size_t i = 0; i < p->scene->n_lines; i++) {
    double k = p->coverage * p->scene->noise * least_gain(p, r->rate, i) / most;
    r->allowed[i] = allowed(p, i);
    r->noise[i] = k * k / p->averages;
    for (size_t j = 0; j < p->scene->n_sources; j++)
      if (i != j)
        add_source(r, i, j, p->scene->sources[j].most *
                                least_gain(p, r->rate, j) / most);
    double hz = p->scene->sources[i].hz;
    if (p->scene->sources[i].wander <= 0)
      add(r, (lbr_pair){i, 2 * hz, 2 * hz, hz, 0, -1,
                        p->scene->sources[i].least});
    add(r, (lbr_pair){i, hz, hz, 0, 0, -1, 2 * p->scene->offset / most});
  }
  if (r->n_pairs > 1)
    qsort(r->pair, r->n_pairs, sizeof *r->pair, by_line_then_weight);
}

lbr_status lbr_relax_new(const lbr_problem *p, double rate, lbr_relax *out) {
  size_t pairs;
  lbr_relax r = {.problem = p, .rate = rate};
  lbr_status status = lbr_size(p->scene->n_lines,
                               2 * p->scene->n_sources + 2, &pairs);
  if (status != LBR_OK) return status;
  r.pair = lbr_alloc(pairs, sizeof *r.pair);
  r.allowed = lbr_alloc(p->scene->n_lines, sizeof *r.allowed);
  r.noise = lbr_alloc(p->scene->n_lines, sizeof *r.noise);
  if (!r.pair || !r.allowed || !r.noise) {
    lbr_relax_free(&r);
    return LBR_NO_MEMORY;
  }
  fill(&r);
  *out = r;
  return LBR_OK;
}

void lbr_relax_free(lbr_relax *r) {
  free(r->pair);
  free(r->allowed);
  free(r->noise);
  *r = (lbr_relax){.problem = NULL};
}

/* The two kernels are compared half way between the zeros, where the share is
 * that of their envelopes. */
lbr_status lbr_relax_kept(const lbr_relax *r, lbr_kernel *endless,
                          lbr_kernel *finite, double *kept) {
  lbr_status status = lbr_kernel_resize(finite, MODEL);
  for (size_t k = 0; k < r->n_pairs && status == LBR_OK; k++) {
    double x = floor(r->pair[k].high / r->rate * MODEL) + 0.5;
    double share = lbr_kernel_gain(finite, x) / lbr_kernel_gain(endless, x);
    kept[k] = x < MODEL / 8 ? TRUST : TRUST * fmin(share, 1);
    if (!(kept[k] >= 0)) kept[k] = 0;
  }
  return status;
}

double lbr_relax_least(const lbr_relax *r, lbr_kernel *kernel,
                       const double *kept) {
  double least = 0, enbw = lbr_kernel_noise_bandwidth(kernel);
  for (size_t i = 0; i < r->problem->scene->n_lines; i++)
    least = fmax(least, STEADY * r->noise[i] * enbw /
                            (r->allowed[i] * r->allowed[i]));
  for (size_t k = 0; k < r->n_pairs; k++) {
    const lbr_pair *p = &r->pair[k];
    double level = r->allowed[p->line] / (p->weight * kept[k]);
    if (level >= 1) continue;
    double reach = lbr_kernel_reach(kernel, level);
    least = fmax(least, p->low > 0 ? TRUST * reach / p->low : INFINITY);
  }
  return least;
}

/* Lower bound of the supremum of the kernel over [low t - n, high t - n] for
 * every duration t in [t1, t2]. */
static double least_most(lbr_kernel *kernel, double low, double high, double n,
                         double t1, double t2) {
  double from = fmax(low * t1, low * t2) - n;
  double to = fmin(high * t1, high * t2) - n, least, most;
  if (from <= to) {
    lbr_kernel_range(kernel, from, to, &least, &most);
    return fmax(most - MARGIN, 0);
  }
  from = fmin(low * t1, low * t2) - n;
  to = fmax(high * t1, high * t2) - n;
  lbr_kernel_range(kernel, from, to, &least, &most);
  return fmax(least - MARGIN, 0);
}

/* The bin of a line over the durations, when it is one and the same. */
static bool one_bin(double hz, double t1, double t2, double *bin) {
  *bin = rint(hz * t1);
  return *bin == rint(hz * t2);
}

/* Least scalloping of a bin reading over the durations, when the bin is the
 * same throughout (off the bin by [low, high] bins) or not (low = high = 0):
 * the line's own movement cannot be taken away. */
static double least_scallop(const lbr_source *s, double spread, double low,
                            double high, lbr_kernel *kernel, double t1,
                            double t2) {
  double off = low > 0 ? low : high < 0 ? -high : 0, least, most;
  double near = off + s->lock_hz * spread * t1;
  double far = fmax(fabs(low), fabs(high)) + s->lock_hz * spread * t2;
  lbr_kernel_range(kernel, near, fmax(near, far), &least, &most);
  return fmax(TRUST * (1 - most) - MARGIN, 0);
}

/* What one line must at least bear; stops above what it is allowed. */
static double line_least(const lbr_relax *r, const lbr_mode *mode, size_t i,
                         size_t first, size_t last, lbr_kernel *kernel,
                         const double *kept, double t1, double t2) {
  const lbr_source *s = &r->problem->scene->sources[i];
  double enbw = lbr_kernel_noise_bandwidth(kernel), bin = 0;
  double sum = STEADY * sqrt(r->noise[i] * enbw / t2);
  bool tracked = mode->reading == LBR_READING_TRACKED;
  bool known = tracked || one_bin(s->hz, t1, t2, &bin);
  if (!tracked)
    sum += s->least *
           least_scallop(s, r->problem->scene->spread[s->driver],
                         known ? s->hz * t1 - bin : 0,
                         known ? s->hz * t2 - bin : 0, kernel, t1, t2);
  if (!known) return sum;
  for (size_t k = first; k < last && sum <= r->allowed[i]; k++) {
    const lbr_pair *p = &r->pair[k];
    double leak = tracked ? least_most(kernel, p->low, p->high, 0, t1, t2)
                          : least_most(kernel, p->hz - p->half,
                                       p->hz + p->half, p->sign * bin, t1, t2);
    sum += p->weight * kept[k] * leak;
  }
  return sum;
}

bool lbr_relax_possible(const lbr_relax *r, const lbr_mode *mode,
                        lbr_kernel *kernel, const double *kept, double t1,
                        double t2, double *work) {
  size_t first = 0, last;
  for (size_t i = 0; i < r->problem->scene->n_lines; i++, first = last) {
    for (last = first; last < r->n_pairs && r->pair[last].line == i;) last++;
    *work += 0.3 * (double)(last - first) + 0.3;
    if (line_least(r, mode, i, first, last, kernel, kept, t1, t2) > r->allowed[i])
      return false;
  }
  return true;
}
