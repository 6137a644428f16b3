#include "plan/relax.h"

#include <math.h>
#include <stdlib.h>

#include "base/checked.h"

#define TRUST 0.998    /* what long records keep beyond lbr_relax_kept */
#define SHORT 2048     /* records shorter than this ... */
#define TRUST_SHORT 0.95 /* ... keep less */
#define TINY 64        /* and records shorter than this ... */
#define DOUBT 2e-5     /* ... less by this of what leaks, far off the line */
#define MODEL 4096     /* length at which finite kernels are looked at */
#define THIN 1e-3      /* of what is allowed: pairs below do not matter */
#define ENOUGH 1.25    /* bins of an interval's near end that hold its peak */
#define LOBES 16       /* no main lobe reaches further, bins */
#define FARTHEST 1e9   /* bins from which no window has anything left */
#define FLANK 32.5     /* bins from which envelopes can be compared */
#define MARGIN 1e-8    /* and enclosures looser by this */
#define STEADY 0.9999  /* noise bandwidths differ less with the length */

/* Least gain any rate of the band gives a source over its interval.  A corner
 * that follows the rate moves by less than the band's factor of two, which is
 * as if the source did. */
static double least_gain(const lbr_problem *p, double rate, size_t j) {
  double low, high, half = lbr_half_width(p->scene, j);
  double from = fmax(p->scene->sources[j].hz - half, 0);
  if (p->front->filter.corner_of_rate) from /= 2;
  lbr_filter_range(&p->front->filter, from, p->scene->sources[j].hz + half,
                   rate, &low, &high);
  return low;
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

static bool alone(const lbr_scene *s, size_t line, size_t j) {
  for (size_t k = 0; k < s->n_sources; k++)
    if (k != line && k != j && s->sources[k].driver == s->sources[j].driver)
      return false;
  return true;
}

/* Distances between line i and source j, difference and sum. */
static void add_source(lbr_relax *r, size_t i, size_t j, double weight) {
  const lbr_scene *s = r->problem->scene;
  const lbr_source *a = &s->sources[i], *b = &s->sources[j];
  double spread = s->spread[b->driver], own = b->lock_hz * spread;
  bool locked = a->driver == b->driver;
  for (double sign = 1; sign >= -1; sign -= 2) {
    double hz = b->hz - sign * a->hz;
    double half = locked ? fabs(b->lock_hz - sign * a->lock_hz) * spread
                         : own + a->lock_hz * s->spread[a->driver];
    add(r, (lbr_pair){i, hz - half, hz + half, b->hz, own,
                      alone(s, i, j), locked, sign, weight,
                      b->wander * b->hz / 2});
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
    add(r, (lbr_pair){i, 2 * hz, 2 * hz, hz, 0, true, true, -1,
                      p->scene->sources[i].least,
                      p->scene->sources[i].wander * hz / 2});
    add(r, (lbr_pair){i, hz, hz, 0, 0, true, false, -1,
                      2 * p->scene->offset / most, 0});
  }
  if (r->n_pairs > 1)
    qsort(r->pair, r->n_pairs, sizeof *r->pair, by_line_then_weight);
  size_t k = 0;
  for (size_t i = 0; i < p->scene->n_lines; i++) {
    r->first[i] = k;
    while (k < r->n_pairs && r->pair[k].line == i) k++;
  }
  r->first[p->scene->n_lines] = k;
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
  r.first = lbr_alloc(p->scene->n_lines + 1, sizeof *r.first);
  if (!r.pair || !r.allowed || !r.noise || !r.first) {
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
  free(r->first);
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
    kept[k] = x < FLANK ? 1 : fmin(share, 1);
    if (!(kept[k] >= 0)) kept[k] = 0;
  }
  return status;
}

void lbr_relax_thin(const lbr_relax *r, lbr_kernel *kernel, double least,
                    double *kept) {
  for (size_t k = 0; k < r->n_pairs; k++) {
    const lbr_pair *p = &r->pair[k];
    double x = p->low * least, low, high;
    lbr_kernel_range(kernel, x, x + 1, &low, &high);
    if (p->weight * kept[k] * high < THIN * r->allowed[p->line] && x > FLANK)
      kept[k] = 0;
  }
}

/* Least distance from where a bin reading would be without the bins' grid: at
 * the line's nominal place, however it moves. */
static double bin_near(const lbr_relax *r, const lbr_pair *p) {
  double hz = r->problem->scene->sources[p->line].hz;
  return fmax(fabs(p->hz - p->sign * hz) - p->half, 0);
}

double lbr_relax_least(const lbr_relax *r, lbr_reading reading,
                       lbr_kernel *kernel, const double *kept) {
  double least = 0, enbw = lbr_kernel_noise_bandwidth(kernel);
  double off = reading == LBR_READING_BIN ? 0.5 : 0;
  for (size_t i = 0; i < r->problem->scene->n_lines; i++)
    least = fmax(least, STEADY * r->noise[i] * enbw /
                            (r->allowed[i] * r->allowed[i]));
  for (size_t k = 0; k < r->n_pairs; k++) {
    const lbr_pair *p = &r->pair[k];
    double level = r->allowed[p->line] / (p->weight * kept[k]);
    if (level >= 1 || p->swing > 0) continue;
    double reach = fmax(lbr_kernel_reach(kernel, level) - off, 0);
    if (reach <= 0) continue;
    double near = reading == LBR_READING_BIN ? bin_near(r, p) : p->low;
    least = fmax(least, near > 0 ? TRUST_SHORT * reach / near : INFINITY);
  }
  return least;
}

typedef struct span {
  double from, to; /* bins */
} span;

/* What [low t - n, high t - n] holds for every t in [t1, t2] (from > to: no
 * point), and for any of them. */
static span always(double low, double high, double n, double t1, double t2) {
  return (span){fmax(low * t1, low * t2) - n, fmin(high * t1, high * t2) - n};
}

static span ever(double low, double high, double n, double t1, double t2) {
  return (span){fmin(low * t1, low * t2) - n, fmax(high * t1, high * t2) - n};
}

/* Lower bound of the kernel over an interval; beyond the main lobes every bin
 * has a zero. */
static double least_anywhere(lbr_kernel *kernel, span x) {
  double least, most;
  bool far = x.from > LOBES || x.to < -LOBES;
  if (far && x.to - x.from >= 1) return 0;
  lbr_kernel_range(kernel, x.from, x.to, &least, &most);
  return fmax(least - MARGIN, 0);
}

/* Lower bound of the supremum of the kernel over what the distance is always
 * able to be; without such points, of the kernel wherever it may be. */
static double least_most(lbr_kernel *kernel, span certain, span possible) {
  double least, most;
  if (certain.from <= certain.to) {
    if (certain.from > 0)
      certain.to = fmin(certain.to, certain.from + ENOUGH);
    else if (certain.to < 0)
      certain.from = fmax(certain.from, certain.to - ENOUGH);
    lbr_kernel_range(kernel, certain.from, certain.to, &least, &most);
    return fmax(most - MARGIN, 0);
  }
  return least_anywhere(kernel, possible);
}

/* Lower bound of the kernel's mean over the distance's interval: sources that
 * move together are worst together at least as much as on average.  A whole
 * bin of |sin| under a falling envelope has at least 2 / pi of the envelope
 * half way, which the outer half of the farthest bin does not exceed. */
static double least_mean(lbr_kernel *kernel, span certain, span possible) {
  double least, most, width = certain.to - certain.from;
  if (width < 1) return least_anywhere(kernel, possible);
  bool beyond = fabs(certain.to) > fabs(certain.from);
  double far = beyond ? certain.to : certain.from;
  double near = beyond ? far - 0.5 : far + 0.5;
  lbr_kernel_range(kernel, fmin(far, near), fmax(far, near), &least, &most);
  return fmax(0.6 * floor(width) / (possible.to - possible.from) * most -
                  MARGIN, 0);
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
  double near = fmin(off + s->lock_hz * spread * t1, FARTHEST);
  double far = fmax(fabs(low), fabs(high)) + s->lock_hz * spread * t2;
  far = fmin(fmax(near, far), near + FARTHEST);
  lbr_kernel_range(kernel, near, far, &least, &most);
  return fmax(TRUST_SHORT * (1 - most) - MARGIN, 0);
}

typedef struct view { /* one field of the search over [t1, t2] */
  const lbr_relax *relax;
  lbr_care care;
  bool tracked;
  lbr_kernel *kernel;
  const double *kept;
  double t1, t2;
} view;

/* The least a pair leaks, kernel part.  Joint bounds may have all sources of
 * a driver at one deviation, and those of the line's own at none. */
static double pair_least(const view *v, const lbr_pair *p, double bin) {
  double low = v->tracked ? p->low : p->hz - p->half;
  double high = v->tracked ? p->high : p->hz + p->half;
  double n = v->tracked ? 0 : p->sign * bin;
  bool joint = v->care == LBR_CARE_JOINT;
  if (joint && v->tracked) { /* the line itself at its nominal place */
    const lbr_scene *scene = v->relax->problem->scene;
    double middle = fabs(p->hz - p->sign * scene->sources[p->line].hz);
    double half = p->locked ? 0 : p->half;
    low = fmax(middle - half, 0);
    high = middle + half;
  }
  span certain = always(low, high, n, v->t1, v->t2);
  span possible = ever(low, high, n, v->t1, v->t2);
  return joint && !p->alone ? least_mean(v->kernel, certain, possible)
                            : least_most(v->kernel, certain, possible);
}

/* What one line must at least bear; stops above what it is allowed. */
static double line_least(const view *v, size_t i, double *work) {
  const lbr_relax *r = v->relax;
  const lbr_source *s = &r->problem->scene->sources[i];
  double enbw = lbr_kernel_noise_bandwidth(v->kernel), bin = 0;
  double sum = STEADY * sqrt(r->noise[i] * enbw / v->t2);
  double trust = v->t1 * r->rate < SHORT ? TRUST_SHORT : TRUST;
  double doubt = v->t1 * r->rate < TINY ? DOUBT : 0;
  bool known = v->tracked || one_bin(s->hz, v->t1, v->t2, &bin);
  if (!v->tracked)
    sum += s->least *
           least_scallop(s, r->problem->scene->spread[s->driver],
                         known ? s->hz * v->t1 - bin : 0,
                         known ? s->hz * v->t2 - bin : 0, v->kernel, v->t1,
                         v->t2);
  *work += 0.5;
  for (size_t k = r->first[i]; known && k < r->first[i + 1]; k++) {
    if (v->kept[k] <= 0) continue;
    if (sum > r->allowed[i]) break;
    double index = r->pair[k].swing * v->t2;
    double carrier = fmax(1 - index * index / 4, 0);
    if (carrier > 0)
      sum += r->pair[k].weight * carrier *
             fmax(v->kept[k] * trust * pair_least(v, &r->pair[k], bin) - doubt,
                  0);
    *work += 0.4;
  }
  return sum;
}

bool lbr_relax_possible(const lbr_relax *r, const lbr_mode *mode,
                        lbr_care care, lbr_kernel *kernel, const double *kept,
                        double t1, double t2, size_t *stern, double *work) {
  view v = {r, care, mode->reading == LBR_READING_TRACKED, kernel, kept, t1,
            t2};
  for (size_t k = 0; k < r->problem->scene->n_lines; k++) {
    size_t i = k == 0 ? *stern : k <= *stern ? k - 1 : k;
    if (line_least(&v, i, work) <= r->allowed[i]) continue;
    *stern = i;
    return false;
  }
  return true;
}
