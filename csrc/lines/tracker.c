#include "lines/tracker.h"

#include <math.h>
#include <stdbool.h>
#include <string.h>

#include "base/checked.h"
#include "lines/phasor.h"
#include "spectrum/transform.h"

#define FINE 8        /* direct evaluation: points a bin */
#define PADDED 4      /* padded transform: points a bin, at least */
#define TRUSTED 0.0625 /* bins from the centre of an expansion, 2e-14 off */
#define COARSE 0.004   /* cycles a block up to which block sums find maxima:
                          3e-5 of sum |y| off, far below what FINE_SHARE
                          allows for */
#define STRIDE 0.25    /* bins that one expansion may be climbed */
#define ROUNDS 24     /* recentrings of an expansion */
#define STEPS 80      /* safeguarded Newton steps in one expansion */

/* A maximum can stand this far above the grid point next to it: |X| falls by
 * at most cos(pi v) at v bins, v <= 1/16 or 1/8; rounded down for skirts. */
#define FINE_SHARE 0.9
#define PADDED_SHARE 0.8

struct lbr_tracker {
  size_t n, count, most_points;
  double scale; /* 2 / sum w */
  double *w, *y; /* n: the window; the windowed record */
  lbr_search *searches;
  double *at, *power;        /* the grid of one search, most_points */
  double complex *blocks;    /* block sums of one search */
  lbr_transform *transform;  /* NULL: grids are evaluated directly */
  double *padded;            /* its record */
  double complex *bins;      /* its transform */
};

static double width_bins(const lbr_tracker *t, const lbr_search *s) {
  return (s->hi - s->lo) * (double)t->n;
}

static size_t direct_points(const lbr_tracker *t, const lbr_search *s) {
  if (s->hi == s->lo) return 0;
  return (size_t)ceil(width_bins(t, s) * FINE) + 2;
}

static bool is_coarse(const lbr_search *s) {
  return 0.5 * (s->hi - s->lo) * LBR_PHASOR_BLOCK <= COARSE;
}

/* One padded transform costs about as much as 3 log2(points) direct sums;
 * a whole coarse search costs about as much as two. */
static bool wants_transform(const lbr_tracker *t, size_t points) {
  double total = 0;
  for (size_t i = 0; i < t->count; i++)
    total += is_coarse(&t->searches[i])
                 ? 2 : (double)direct_points(t, &t->searches[i]);
  return total > 3 * log2((double)points);
}

static lbr_status make_transform(lbr_tracker *t) {
  if (t->n > LBR_TRANSFORM_MOST / (2 * PADDED)) return LBR_OK;
  size_t points = lbr_transform_fast_length(PADDED * t->n);
  if (!wants_transform(t, points)) return LBR_OK;
  lbr_status status = lbr_transform_get(points, &t->transform);
  if (status != LBR_OK) return status;
  t->padded = lbr_transform_buffer(points);
  t->bins = (double complex *)lbr_transform_buffer(2 * (points / 2 + 1));
  return t->padded && t->bins ? LBR_OK : LBR_NO_MEMORY;
}

static lbr_status check(const double *w, size_t n, const lbr_search *searches,
                        size_t count, double *sum) {
  double total = 0, size = 0;
  if (n < 4) return LBR_DOMAIN;
  for (size_t i = 0; i < n; i++) {
    total += w[i];
    size += fabs(w[i]);
  }
  if (!(fabs(total) > 1e-12 * size)) return LBR_DOMAIN;
  for (size_t i = 0; i < count; i++) {
    double lo = searches[i].lo, hi = searches[i].hi;
    if (!isfinite(lo) || !isfinite(hi) || !(hi - lo >= 0 && hi - lo <= 1) ||
        fabs(lo) > 1e6)
      return LBR_DOMAIN;
  }
  *sum = total;
  return LBR_OK;
}

static lbr_status fill(lbr_tracker *t, const double *w,
                       const lbr_search *searches) {
  t->w = lbr_alloc(t->n, sizeof *t->w);
  t->y = lbr_alloc(t->n, sizeof *t->y);
  t->searches = lbr_alloc(t->count, sizeof *t->searches);
  if (!t->w || !t->y || !t->searches) return LBR_NO_MEMORY;
  memcpy(t->w, w, t->n * sizeof *w);
  memcpy(t->searches, searches, t->count * sizeof *searches);
  for (size_t i = 0; i < t->count; i++) {
    size_t points = direct_points(t, &searches[i]) + 3;
    if (points > t->most_points) t->most_points = points;
  }
  t->at = lbr_alloc(t->most_points, sizeof *t->at);
  t->power = lbr_alloc(t->most_points, sizeof *t->power);
  t->blocks = lbr_alloc(t->n / LBR_PHASOR_BLOCK + 1, sizeof *t->blocks);
  if (!t->at || !t->power || !t->blocks) return LBR_NO_MEMORY;
  return make_transform(t);
}

lbr_status lbr_tracker_new(const double *w, size_t n,
                           const lbr_search *searches, size_t count,
                           lbr_tracker **out) {
  double sum;
  lbr_status status = check(w, n, searches, count, &sum);
  if (status != LBR_OK) return status;
  lbr_tracker *t = lbr_alloc(1, sizeof *t);
  if (!t) return LBR_NO_MEMORY;
  t->n = n;
  t->count = count;
  t->scale = 2 / sum;
  status = fill(t, w, searches);
  if (status == LBR_OK)
    *out = t;
  else
    lbr_tracker_free(t);
  return status;
}

void lbr_tracker_free(lbr_tracker *t) {
  if (!t) return;
  free(t->w);
  free(t->y);
  free(t->searches);
  free(t->at);
  free(t->power);
  free(t->blocks);
  lbr_transform_put(t->transform);
  lbr_transform_drop(t->padded);
  lbr_transform_drop(t->bins);
  free(t);
}

static inline double power_of(double complex x) {
  return creal(x) * creal(x) + cimag(x) * cimag(x);
}

static void put_direct(const lbr_tracker *t, size_t i, double f) {
  t->at[i] = f;
  t->power[i] = power_of(lbr_phasor_sum(t->y, t->n, f));
}

static size_t direct_grid(const lbr_tracker *t, const lbr_search *s) {
  size_t points = direct_points(t, s);
  double middle = 0.5 * (s->lo + s->hi);
  double step = (s->hi - s->lo) / (double)(points - 1);
  bool coarse = is_coarse(s);
  if (coarse) lbr_phasor_blocks(t->y, t->n, middle, t->blocks);
  for (size_t i = 0; i < points; i++) {
    double f = i + 1 < points ? s->lo + (double)i * step : s->hi;
    if (coarse) {
      t->at[i] = f;
      t->power[i] = lbr_phasor_coarse(t->blocks, t->n, f - middle);
    } else {
      put_direct(t, i, f);
    }
  }
  return points;
}

/* |X|^2 at grid number m of the padded transform, any whole m. */
static double padded_power(const lbr_tracker *t, double m) {
  double points = (double)lbr_transform_points(t->transform);
  double r = m - points * floor(m / points);
  if (r > points / 2) r = points - r;
  return power_of(t->bins[(size_t)r]);
}

/* The ends of the interval, and the transform's own points between them. */
static size_t padded_grid(const lbr_tracker *t, const lbr_search *s) {
  double points = (double)lbr_transform_points(t->transform);
  size_t i = 0;
  put_direct(t, i++, s->lo);
  for (double m = floor(s->lo * points) + 1; m < s->hi * points; m++) {
    t->at[i] = m / points;
    t->power[i++] = padded_power(t, m);
  }
  put_direct(t, i++, s->hi);
  return i;
}

/* The stationary point of |X|^2 between va and vb (bins from the centre of
 * the expansion), or the end towards which it rises. */
static double climb(const double complex m[LBR_PHASOR_MOMENTS], double va,
                    double vb) {
  double v = 0;
  for (int i = 0; i < STEPS && vb > va; i++) {
    double complex x, d, c;
    lbr_phasor_expand(m, v, &x, &d, &c);
    double rise = creal(x) * creal(d) + cimag(x) * cimag(d);
    double bend = power_of(d) + creal(x) * creal(c) + cimag(x) * cimag(c);
    if (rise == 0 || (rise > 0 && v >= vb) || (rise < 0 && v <= va)) return v;
    if (rise > 0)
      va = v;
    else
      vb = v;
    double next = bend < 0 ? v - rise / bend : NAN;
    if (!(next >= va && next <= vb)) next = 0.5 * (va + vb);
    if (fabs(next - v) < 1e-15) return next;
    v = next;
  }
  return v;
}

/* A first guess: the top of the parabola through three log powers. */
static double guess(const lbr_tracker *t, size_t g, size_t points) {
  if (g == 0 || g + 1 == points) return t->at[g];
  double a = t->at[g] - t->at[g - 1], b = t->at[g + 1] - t->at[g];
  if (!(t->power[g - 1] > 0) || !(t->power[g + 1] > 0) ||
      fabs(a - b) > 1e-3 * (a + b))
    return t->at[g];
  double below = log(t->power[g - 1] / t->power[g]);
  double above = log(t->power[g + 1] / t->power[g]);
  double bend = below + above;
  if (!(bend < 0)) return t->at[g];
  return t->at[g] + 0.5 * a * (below - above) / bend;
}

/* The highest point near grid maximum g: its frequency and transform.  The
 * climb is bounded by the interval alone, not by the grid point's neighbours:
 * a coarse grid may have the highest of nearly equal points wrong. */
static double complex refine(const lbr_tracker *t, size_t g, size_t points,
                             double *frequency) {
  double lo = t->at[0], hi = t->at[points - 1];
  double f = fmin(fmax(guess(t, g, points), lo), hi), v = 0;
  double bins = (double)t->n;
  double complex m[LBR_PHASOR_MOMENTS], x, d, c;
  for (int i = 0; i < ROUNDS; i++) {
    f = fmin(fmax(f + v / bins, lo), hi);
    lbr_phasor_moments(t->y, t->n, f, m);
    v = climb(m, fmax((lo - f) * bins, -STRIDE),
              fmin((hi - f) * bins, STRIDE));
    if (fabs(v) <= TRUSTED) break;
  }
  lbr_phasor_expand(m, v, &x, &d, &c);
  *frequency = fmin(fmax(f + v / bins, lo), hi);
  return x;
}

static double complex track(const lbr_tracker *t, const lbr_search *s,
                            double *frequency) {
  size_t points = t->transform ? padded_grid(t, s) : direct_grid(t, s);
  double share = t->transform ? PADDED_SHARE : FINE_SHARE;
  double top = 0;
  double complex best = 0;
  for (size_t g = 0; g < points; g++) top = fmax(top, t->power[g]);
  *frequency = s->lo;
  for (size_t g = 0; g < points; g++) {
    double here = t->power[g], f;
    if (here < share * share * top || (g && here < t->power[g - 1]) ||
        (g + 1 < points && here <= t->power[g + 1]))
      continue;
    double complex x = refine(t, g, points, &f);
    if (power_of(x) > power_of(best)) {
      best = x;
      *frequency = f;
    }
  }
  return best;
}

void lbr_tracker_run(lbr_tracker *t, const double *x, lbr_measured *tones) {
  for (size_t i = 0; i < t->n; i++) t->y[i] = t->w[i] * x[i];
  if (t->transform)
    lbr_transform_windowed(t->transform, t->y, NULL, t->n, t->padded, t->bins);
  for (size_t i = 0; i < t->count; i++) {
    const lbr_search *s = &t->searches[i];
    double f = s->lo;
    double complex sum = s->hi > s->lo ? track(t, s, &f)
                                       : lbr_phasor_sum(t->y, t->n, f);
    sum *= t->scale;
    tones[i] = (lbr_measured){cabs(sum), f, carg(sum)};
  }
}
