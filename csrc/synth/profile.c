#include "synth/profile.h"

#include <math.h>

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

static double level_of(const lbr_order *o, double speed, double reference) {
  if (o->power == 0) return o->amplitude;
  return o->amplitude * pow(speed / reference, o->power);
}

void lbr_profile_add(const void *profile, int64_t first, double *out,
                     size_t n) {
  const lbr_profile *p = profile;
  for (size_t i = 0; i < n; i++) {
    double speed, sum = 0;
    long double t = (long double)(first + (int64_t)i);
    long double turns = lbr_profile_turns(p, t, &speed);
    for (size_t k = 0; k < p->n_orders; k++) {
      double cosine, sine;
      const lbr_order *o = &p->orders[k];
      long double cycles = o->times * turns + o->phase / TURN;
      lbr_cos_sin_cycles((double)(cycles - rintl(cycles)), &cosine, &sine);
      sum += level_of(o, speed, p->reference) * cosine;
    }
    out[i] += sum;
  }
}
