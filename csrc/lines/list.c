#include "lines/list.h"

#include <math.h>
#include <stdbool.h>
#include <string.h>

#include "base/checked.h"
#include "lines/chance.h"
#include "lines/project.h"
#include "spectrum/transform.h"

#define PI 3.14159265358979323846264338328
#define CHUNK 256
#define ROUNDS 6 /* of finding peaks and taking them out of the floor */

struct lbr_list {
  lbr_list_facts facts;
  size_t m, bins; /* segment; m / 2 + 1 */
  double *power, *level;
  bool *masked;    /* bins that belong to peaks */
  double *quiet;   /* powers of the others, in order */
  double *median;  /* of width neighbours, by the first of them */
  double *sorted;  /* width */
  size_t *peaks;
};

static lbr_status take_memory(lbr_list *l, size_t width) {
  l->power = lbr_alloc(l->bins, sizeof *l->power);
  l->level = lbr_alloc(l->bins, sizeof *l->level);
  l->masked = lbr_alloc(l->bins, sizeof *l->masked);
  l->quiet = lbr_alloc(l->bins, sizeof *l->quiet);
  l->median = lbr_alloc(l->bins, sizeof *l->median);
  l->sorted = lbr_alloc(width, sizeof *l->sorted);
  l->peaks = lbr_alloc(l->bins, sizeof *l->peaks);
  return l->power && l->level && l->masked && l->quiet && l->median &&
                 l->sorted && l->peaks
             ? LBR_OK
             : LBR_NO_MEMORY;
}

void lbr_list_free(lbr_list *l) {
  if (!l) return;
  free(l->power);
  free(l->level);
  free(l->masked);
  free(l->quiet);
  free(l->median);
  free(l->sorted);
  free(l->peaks);
  free(l);
}

static lbr_status average(lbr_list *l, const double *x, const double *w,
                          size_t step) {
  lbr_transform *transform = NULL;
  lbr_status status = lbr_transform_get(l->m, &transform);
  if (status != LBR_OK) return status;
  double *scratch = lbr_transform_buffer(l->m);
  double complex *out =
      (double complex *)lbr_transform_buffer(2 * l->bins);
  if (!scratch || !out) status = LBR_NO_MEMORY;
  double share = 1 / (double)l->facts.segments;
  for (size_t i = 0; status == LBR_OK && i < l->facts.segments; i++) {
    lbr_transform_windowed(transform, x + i * step, w, l->m, scratch, out);
    for (size_t k = 0; k < l->bins; k++)
      l->power[k] += share * (creal(out[k]) * creal(out[k]) +
                              cimag(out[k]) * cimag(out[k]));
  }
  lbr_transform_drop(scratch);
  lbr_transform_drop(out);
  lbr_transform_put(transform);
  return status;
}

/* Degrees of freedom of averaged overlapping segments: P. D. Welch 1967 (IEEE
 * Trans. Audio Electroacoust. 15(2), 70-73), var / P^2 = (1 + 2 sum (1 - j /
 * K) r_j^2) / K with r_j the correlation of window and shifted window. */
static double freedom_of(const double *w, size_t m, size_t step,
                         size_t segments) {
  double square = 0, count = (double)segments, sum = 0;
  for (size_t i = 0; i < m; i++) square += w[i] * w[i];
  for (size_t j = 1; j < segments && j * step < m; j++) {
    double r = 0;
    for (size_t i = j * step; i < m; i++) r += w[i] * w[i - j * step];
    r /= square;
    sum += (1 - (double)j / count) * r * r;
  }
  return 2 * count / (1 + 2 * sum);
}

/* sum w^2 exp(-2 pi i j t / m) */
static double complex square_at(const double *w, size_t m, size_t j) {
  double re[CHUNK], im[CHUNK];
  double complex sum = 0;
  for (size_t at = 0; at < m; at += CHUNK) {
    size_t count = m - at < CHUNK ? m - at : CHUNK;
    lbr_phases((double)j / (double)m, (double)at, 1, count, re, im);
    for (size_t i = 0; i < count; i++) {
      double square = w[at + i] * w[at + i];
      sum += CMPLX(square * re[i], square * im[i]);
    }
  }
  return sum;
}

/* Bins that count as one in a median because the window ties them together: 1
 * + 2 sum c_j.  Powers j bins apart are correlated by r = |transform of w^2|^2
 * (1 at j = 0); whether they lie above their median by c_j = 2 / pi asin r, as
 * normal variables do (W. F. Sheppard 1899, Phil. Trans. A 192, 101-167). */
static double tied_bins(const double *w, size_t m, size_t guard) {
  double whole = creal(square_at(w, m, 0)), sum = 1;
  for (size_t j = 1; j <= guard; j++) {
    double complex r = square_at(w, m, j) / whole;
    double both = creal(r) * creal(r) + cimag(r) * cimag(r);
    sum += 2 * (2 / PI) * asin(fmin(both, 1));
  }
  return sum;
}

/* The centre of the window is that of its own weight. */
static void sum_window(const double *w, size_t m, lbr_list_facts *f) {
  double sum = 0, first = 0, square = 0, bend = 0, tilt = 0;
  for (size_t i = 0; i < m; i++) {
    sum += w[i];
    first += w[i] * (double)i;
    square += w[i] * w[i];
  }
  for (size_t i = 0; i < m; i++) {
    double t = (double)i - first / sum, wt = w[i] * t;
    bend += wt * t;
    tilt += wt * wt;
  }
  f->sum = sum;
  f->square = square;
  f->bend = bend;
  f->tilt = tilt;
}

/* First place in a rising list where v can stand. */
static size_t place(const double *sorted, size_t n, double v) {
  size_t lo = 0, hi = n;
  while (lo < hi) {
    size_t middle = lo + (hi - lo) / 2;
    if (sorted[middle] < v)
      lo = middle + 1;
    else
      hi = middle;
  }
  return lo;
}

static void put_in(double *sorted, size_t n, double v) {
  size_t at = place(sorted, n, v);
  memmove(sorted + at + 1, sorted + at, (n - at) * sizeof *sorted);
  sorted[at] = v;
}

static void take_out(double *sorted, size_t n, double v) {
  size_t at = place(sorted, n, v);
  memmove(sorted + at, sorted + at + 1, (n - at - 1) * sizeof *sorted);
}

/* l->median[i] = median of quiet[i .. i + width - 1], as far as they go. */
static void slide_median(lbr_list *l, size_t count, size_t width) {
  for (size_t i = 0; i < width; i++) put_in(l->sorted, i, l->quiet[i]);
  l->median[0] = l->sorted[width / 2];
  for (size_t i = width; i < count; i++) {
    take_out(l->sorted, width, l->quiet[i - width]);
    put_in(l->sorted, width - 1, l->quiet[i]);
    l->median[i - width + 1] = l->sorted[width / 2];
  }
}

/* The floor of every tested bin from its width nearest quiet neighbours;
 * false when there are not so many. */
static bool lay_floor(lbr_list *l, size_t width, double median) {
  size_t count = 0, before = 0;
  for (size_t k = l->facts.first; k <= l->facts.last; k++)
    if (!l->masked[k]) l->quiet[count++] = l->power[k];
  if (count < width) return false;
  slide_median(l, count, width);
  for (size_t k = l->facts.first; k <= l->facts.last; k++) {
    size_t from = before > width / 2 ? before - width / 2 : 0;
    if (from > count - width) from = count - width;
    l->level[k] = l->median[from] / median;
    if (!l->masked[k]) before++;
  }
  return true;
}

/* Masks the surroundings of all bins above `factor` floors; true when that
 * changed something. */
static bool mask_peaks(lbr_list *l, size_t guard, double factor) {
  bool changed = false;
  for (size_t k = l->facts.first; k <= l->facts.last; k++) {
    if (!(l->power[k] > factor * l->level[k])) continue;
    for (size_t j = k - guard; j <= k + guard; j++) {
      changed = changed || !l->masked[j];
      l->masked[j] = true;
    }
  }
  return changed;
}

/* Bins above the threshold that neither neighbour exceeds.  A line's main lobe
 * falls from bin to bin; where noise breaks that, the caller sees two readings
 * of one line. */
static void collect(lbr_list *l) {
  for (size_t k = l->facts.first; k <= l->facts.last; k++) {
    double here = l->power[k];
    if (here > l->facts.factor * l->level[k] && here > l->power[k - 1] &&
        here >= l->power[k + 1])
      l->peaks[l->facts.peaks++] = k;
  }
}

static bool is_finite(const lbr_list *l) {
  double sum = 0;
  for (size_t k = 0; k < l->bins; k++) sum += l->power[k];
  return isfinite(sum);
}

static lbr_status search(lbr_list *l, const lbr_list_setup *s) {
  double tests = (double)(l->facts.last - l->facts.first + 1);
  double median = lbr_chi_square_level(l->facts.freedom, 0.5);
  l->facts.factor = lbr_floor_factor(l->facts.freedom, l->facts.cells,
                                     s->false_alarm / tests);
  /* What may become a peak must not raise its own floor: out it goes at four
   * times the chance. */
  double suspect = lbr_floor_factor(l->facts.freedom, l->facts.cells,
                                    fmin(4 * s->false_alarm / tests, 0.01));
  suspect = fmin(suspect, l->facts.factor);
  for (int i = 0; i < ROUNDS; i++) {
    if (!lay_floor(l, s->width, median)) return LBR_DOMAIN;
    if (!mask_peaks(l, s->guard, suspect)) break;
  }
  collect(l);
  return LBR_OK;
}

static bool is_possible(size_t n, size_t m, const lbr_list_setup *s) {
  return n >= m && m >= 16 && s->step >= 1 && s->width >= 5 &&
         s->width % 2 == 1 && s->guard >= 1 && s->guard < m / 8 &&
         m / 2 + 1 >= s->width + 4 * (s->guard + 1) && s->false_alarm > 0 &&
         s->false_alarm < 0.5;
}

lbr_status lbr_list_new(const double *x, size_t n, const double *w, size_t m,
                        const lbr_list_setup *s, lbr_list **out) {
  if (!is_possible(n, m, s)) return LBR_DOMAIN;
  lbr_list *l = lbr_alloc(1, sizeof *l);
  if (!l) return LBR_NO_MEMORY;
  l->m = m;
  l->bins = m / 2 + 1;
  l->facts.segments = 1 + (n - m) / s->step;
  l->facts.first = s->guard + 1;
  l->facts.last = l->bins - 2 - s->guard;
  l->facts.freedom = freedom_of(w, m, s->step, l->facts.segments);
  l->facts.cells =
      fmax((double)s->width / tied_bins(w, m, s->guard), 3);
  sum_window(w, m, &l->facts);
  lbr_status status = take_memory(l, s->width);
  if (status == LBR_OK) status = average(l, x, w, s->step);
  if (status == LBR_OK && !is_finite(l)) status = LBR_DOMAIN;
  if (status == LBR_OK) status = search(l, s);
  if (status == LBR_OK)
    *out = l;
  else
    lbr_list_free(l);
  return status;
}

const lbr_list_facts *lbr_list_about(const lbr_list *l) { return &l->facts; }
const double *lbr_list_power(const lbr_list *l) { return l->power; }
const double *lbr_list_floor(const lbr_list *l) { return l->level; }
const size_t *lbr_list_peaks(const lbr_list *l) { return l->peaks; }
