#include "synth/chirp.h"

#include <math.h>

#include "base/cycles.h"

#define TURN 6.283185307179586476925286766559L

/* What all samples share. */
typedef struct run {
  const lbr_chirp *chirp;
  long double growth; /* ln(to / from); 0: linear */
  long double pass;   /* cycles of a whole pass */
} run;

lbr_status lbr_chirp_check(const lbr_chirp *c) {
  bool finite = isfinite(c->amplitude) && isfinite(c->from) &&
                isfinite(c->to) && isfinite(c->start) && isfinite(c->length);
  if (!finite || !(c->length > 0) || !(fabs(c->phase) < 1e9))
    return LBR_DOMAIN;
  if (!(c->fade >= 0 && c->fade <= c->length / 2)) return LBR_DOMAIN;
  if (c->exponential && !(c->from > 0 && c->to > 0)) return LBR_DOMAIN;
  return LBR_OK;
}

/* Cycles since the start of a pass. */
static long double cycles_at(const run *r, long double u) {
  const lbr_chirp *c = r->chirp;
  long double length = c->length;
  if (r->growth == 0) {
    long double slope = ((long double)c->to - c->from) / (2 * length);
    return u * (c->from + slope * u);
  }
  return c->from * length / r->growth * expm1l(r->growth * u / length);
}

static run run_of(const lbr_chirp *c) {
  run r = {c, 0, 0};
  if (c->exponential && c->from != c->to)
    r.growth = logl((long double)c->to / c->from);
  r.pass = cycles_at(&r, c->length);
  return r;
}

/* Cycles of a chirp that goes on for ever. */
static long double cycles_repeated(const run *r, long double u) {
  long double length = r->chirp->length, pass = floorl(u / length);
  long double inside = u - pass * length;
  bool reversed = r->chirp->back && fmodl(pass, 2) != 0;
  long double part = reversed ? r->pass - cycles_at(r, length - inside)
                              : cycles_at(r, inside);
  return pass * (r->pass - rintl(r->pass)) + part;
}

static double fade_at(const lbr_chirp *c, double u) {
  double c0, s0, edge = fmin(u, c->length - u);
  if (edge >= c->fade) return 1;
  lbr_cos_sin_cycles(edge / (2 * c->fade), &c0, &s0);
  return 0.5 - 0.5 * c0;
}

void lbr_chirp_add(const void *chirp, int64_t first, double *out, size_t n) {
  const lbr_chirp *c = chirp;
  run r = run_of(c);
  long double phase = c->phase / TURN;
  for (size_t i = 0; i < n; i++) {
    double cosine, sine;
    long double u = (long double)(first + (int64_t)i) - c->start;
    if (!c->repeats && (u < 0 || u >= c->length)) continue;
    long double turns = phase + (c->repeats ? cycles_repeated(&r, u)
                                            : cycles_at(&r, u));
    lbr_cos_sin_cycles((double)(turns - rintl(turns)), &cosine, &sine);
    double level = c->repeats ? 1 : fade_at(c, (double)u);
    out[i] += c->amplitude * level * cosine;
  }
}
