#include "synth/profile.h"

#include <math.h>
#include <string.h>

#include "base/cycles.h"

#define TURN 6.283185307179586476925286766559L

lbr_status lbr_profile_set(lbr_knot *k, size_t n) {
  if (n < 1) return LBR_DOMAIN;
  for (size_t i = 0; i < n; i++) {
    if (!isfinite(k[i].at) || !isfinite(k[i].speed) || k[i].speed < 0)
      return LBR_DOMAIN;
    if (i > 0 && !(k[i].at > k[i - 1].at)) return LBR_DOMAIN;
  }
  k[0].turns = 0;
  for (size_t i = 1; i < n; i++) {
    long double mean = ((long double)k[i - 1].speed + k[i].speed) / 2;
    k[i].turns =
        k[i - 1].turns + mean * ((long double)k[i].at - k[i - 1].at);
  }
  return LBR_OK;
}

lbr_status lbr_profile_check(const lbr_profile *p) {
  if (!(isfinite(p->reference) && p->reference > 0)) return LBR_DOMAIN;
  for (size_t i = 0; i < p->n_orders; i++) {
    const lbr_order *o = &p->orders[i];
    if (!isfinite(o->times) || o->times < 0 || !isfinite(o->amplitude) ||
        !isfinite(o->power) || !(fabs(o->phase) < 1e9))
      return LBR_DOMAIN;
  }
  return LBR_OK;
}

/* The last knot that is not after t; the first where there is none. */
static size_t knot_before(const lbr_profile *p, long double t) {
  size_t low = 0, high = p->n_knots;
  while (high - low > 1) {
    size_t middle = low + (high - low) / 2;
    if (p->knots[middle].at <= t)
      low = middle;
    else
      high = middle;
  }
  return low;
}

long double lbr_profile_turns(const lbr_profile *p, long double t,
                              double *speed) {
  size_t i = knot_before(p, t);
  const lbr_knot *a = &p->knots[i], *b = a + 1;
  long double u = t - a->at, slope = 0;
  if (u > 0 && i + 1 < p->n_knots)
    slope = ((long double)b->speed - a->speed) / ((long double)b->at - a->at);
  *speed = (double)(a->speed + slope * u);
  return a->turns + u * (a->speed + slope * u / 2);
}

/* A stretch of constant slope, from sample 0 of it. */
typedef struct stretch {
  long double turns; /* of the driver at sample 0 */
  double speed;      /* there, turns per sample */
  double slope;      /* turns per sample^2 */
} stretch;

static stretch stretch_at(const lbr_profile *p, long double t) {
  stretch s = {0, 0, 0};
  size_t i = knot_before(p, t);
  const lbr_knot *a = &p->knots[i];
  s.turns = lbr_profile_turns(p, t, &s.speed);
  if (t >= a->at && i + 1 < p->n_knots)
    s.slope = (a[1].speed - a[0].speed) / (a[1].at - a[0].at);
  return s;
}

/* The first sample at or behind the next knot. */
static int64_t stretch_end(const lbr_profile *p, int64_t first, int64_t end) {
  long double t = (long double)first;
  size_t i = knot_before(p, t);
  if (t >= p->knots[i].at) i++;
  if (i >= p->n_knots || p->knots[i].at >= (double)end) return end;
  return (int64_t)ceil(p->knots[i].at);
}

__attribute__((target_clones("avx512f", "avx2", "default"))) static void
add_cosines(double start, double v, double a, const double *level,
            double *out, int n) {
  for (int k = 0; k < n; k++) {
    double c, s, t = (double)k;
    lbr_cos_sin_cycles(start + t * (v + t * a), &c, &s);
    out[k] += level[k] * c;
  }
}

static void levels_of(const lbr_order *o, const stretch *s, double reference,
                      double *level, size_t n) {
  for (size_t k = 0; k < n; k++) {
    double speed = fmax(s->speed + (double)k * s->slope, 0);
    level[k] = o->amplitude;
    if (o->power != 0) level[k] *= pow(speed / reference, o->power);
  }
}

static void add_stretch(const lbr_profile *p, const stretch *s, double *out,
                        size_t n) {
  double level[LBR_SPREAD_BLOCK];
  for (size_t i = 0; i < p->n_orders; i++) {
    const lbr_order *o = &p->orders[i];
    long double cycles = o->times * s->turns + o->phase / TURN;
    double start = (double)(cycles - rintl(cycles));
    levels_of(o, s, p->reference, level, n);
    add_cosines(start, o->times * s->speed, o->times * s->slope / 2, level,
                out, (int)n);
  }
}

static void make_block(const void *profile, int64_t first, double *block) {
  const lbr_profile *p = profile;
  int64_t end = first + LBR_SPREAD_BLOCK;
  memset(block, 0, LBR_SPREAD_BLOCK * sizeof *block);
  for (int64_t at = first; at < end;) {
    int64_t stop = stretch_end(p, at, end);
    stretch s = stretch_at(p, (long double)at);
    if (stop <= at) stop = at + 1;
    add_stretch(p, &s, block + (at - first), (size_t)(stop - at));
    at = stop;
  }
}

void lbr_profile_add(const void *profile, int64_t first, double *out,
                     size_t n) {
  lbr_add_blocks(make_block, profile, first, out, n);
}
