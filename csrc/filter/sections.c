#include "filter/sections.h"

#include <math.h>
#include <stdint.h>

#define PI 3.14159265358979323846
#define LANES 4  /* sections run side by side */
#define CHUNK 256
#define CLONES __attribute__((target_clones("avx512f", "avx2", "default")))

/* What does not wait for y is added first. */
static inline double advance(const lbr_section *s, double *hold, double x) {
  double y = s->b0 * x + hold[0];
  hold[0] = (s->b1 * x + hold[1]) - s->a1 * y;
  hold[1] = s->b2 * x - s->a2 * y;
  return y;
}

/* Samples one by one through `count` sections. */
static void run_plain(const lbr_section *s, double (*hold)[2], size_t count,
                      const double *x, double *y, size_t n, int step) {
  for (size_t j = 0; j < count; j++) {
    const lbr_section part = s[j];
    double memory[2] = {hold[j][0], hold[j][1]};
    for (size_t i = 0; i < n; i++) {
      ptrdiff_t at = (ptrdiff_t)i * step;
      y[at] = advance(&part, memory, x[at]);
    }
    hold[j][0] = memory[0];
    hold[j][1] = memory[1];
    x = y;
  }
}

typedef double side __attribute__((vector_size(8 * LANES)));

/* Coefficients and memories of LANES sections, a lane each. */
typedef struct bank {
  side b0, b1, b2, a1, a2;
  side p, q; /* memories */
  side in;   /* what each section takes next */
} bank;

static void fill_bank(bank *k, const lbr_section *s, double (*hold)[2]) {
  for (size_t j = 0; j < LANES; j++) {
    k->b0[j] = s[j].b0;
    k->b1[j] = s[j].b1;
    k->b2[j] = s[j].b2;
    k->a1[j] = s[j].a1;
    k->a2[j] = s[j].a2;
    k->p[j] = hold[j][0];
    k->q[j] = hold[j][1];
    k->in[j] = 0;
  }
}

/* Lanes first .. last work, at the ends of a block; returns what the last
 * lane gives and hands the rest on. */
static double edge_step(bank *k, const lbr_section *s, size_t first,
                        size_t last) {
  double out[LANES] = {0};
  for (size_t j = first; j <= last; j++) {
    double hold[2] = {k->p[j], k->q[j]};
    out[j] = advance(&s[j], hold, k->in[j]);
    k->p[j] = hold[0];
    k->q[j] = hold[1];
  }
  for (size_t j = LANES - 1; j > 0; j--) k->in[j] = out[j - 1];
  return out[LANES - 1];
}

/* All lanes work: y[0] .. y[n - 1] from the samples that lane 0 takes. */
CLONES static void full_steps(bank *bank_, const double *x, double *y,
                              size_t n, int step) {
  bank k = *bank_;
  for (size_t i = 0; i < n; i++) {
    ptrdiff_t at = (ptrdiff_t)i * step;
    k.in[0] = x[at];
    side v = k.b0 * k.in + k.p;
    k.p = (k.b1 * k.in + k.q) - k.a1 * v;
    k.q = k.b2 * k.in - k.a2 * v;
    k.in = __builtin_shufflevector(v, v, 0, 0, 1, 2);
    y[at] = v[LANES - 1];
  }
  *bank_ = k;
}

/* Section j works on sample t - j while section 0 works on sample t: they wait
 * for each other no more.  n >= LANES. */
static void run_side(const lbr_section *s, double (*hold)[2], const double *x,
                     double *y, size_t n, int step) {
  bank k;
  double head[LANES - 1], tail[LANES - 1];
  ptrdiff_t lag = (ptrdiff_t)(LANES - 1) * step;
  fill_bank(&k, s, hold);
  for (size_t t = 0; t < LANES - 1; t++) head[t] = x[(ptrdiff_t)t * step];
  for (size_t t = 0; t < LANES - 1; t++) {
    k.in[0] = head[t];
    (void)edge_step(&k, s, 0, t);
  }
  full_steps(&k, x + lag, y, n - (LANES - 1), step);
  for (size_t t = 0; t < LANES - 1; t++)
    tail[t] = edge_step(&k, s, t + 1, LANES - 1);
  for (size_t t = 0; t < LANES - 1; t++)
    y[(ptrdiff_t)(n - (LANES - 1) + t) * step] = tail[t];
  for (size_t j = 0; j < LANES; j++) {
    hold[j][0] = k.p[j];
    hold[j][1] = k.q[j];
  }
}

/* The same for fewer sections: those that are missing let all pass. */
static void run_some(const lbr_section *s, double (*hold)[2], size_t count,
                     const double *x, double *y, size_t n, int step) {
  lbr_section part[LANES];
  double memory[LANES][2] = {{0, 0}};
  for (size_t j = 0; j < LANES; j++) {
    part[j] = j < count ? s[j] : (lbr_section){1, 0, 0, 0, 0};
    for (size_t k = 0; j < count && k < 2; k++) memory[j][k] = hold[j][k];
  }
  run_side(part, memory, x, y, n, step);
  for (size_t j = 0; j < count; j++) {
    hold[j][0] = memory[j][0];
    hold[j][1] = memory[j][1];
  }
}

void lbr_sections_run(const lbr_sections *s, lbr_sections_state *state,
                      const double *x, double *y, size_t n, int step) {
  for (size_t at = 0; at < s->count; at += LANES) {
    size_t lanes = s->count - at < LANES ? s->count - at : LANES;
    if (lanes > 1 && n >= LANES)
      run_some(s->part + at, state->hold + at, lanes, x, y, n, step);
    else
      run_plain(s->part + at, state->hold + at, lanes, x, y, n, step);
    x = y;
  }
}

void lbr_sections_settled(const lbr_sections *s, double level,
                          lbr_sections_state *state) {
  for (size_t j = 0; j < s->count; j++) {
    const lbr_section *p = &s->part[j];
    double gain = (p->b0 + p->b1 + p->b2) / (1 + p->a1 + p->a2);
    double out = gain * level;
    state->hold[j][0] = out - p->b0 * level;
    state->hold[j][1] = p->b2 * level - p->a2 * out;
    level = out;
  }
}

/* 1 + a (z^-1 - 1) ... is written around z = 1 so that nothing cancels at low
 * frequencies: c0 + c1 w + c2 w^2 = (c0 + c1 + c2) + (w - 1)(c1 + c2 (w + 1)).
 */
static double complex quadratic(double c0, double c1, double c2,
                                double complex w, double complex less) {
  return ((c0 + c2) + c1) + less * (c1 + c2 * (w + 1));
}

double complex lbr_sections_response(const lbr_sections *s, double share) {
  double half = sin(PI * share), angle = 2 * PI * share;
  double complex w = CMPLX(cos(angle), -sin(angle)), h = 1;
  double complex less = CMPLX(-2 * half * half, -sin(angle));
  for (size_t j = 0; j < s->count; j++) {
    const lbr_section *p = &s->part[j];
    h *= quadratic(p->b0, p->b1, p->b2, w, less) /
         quadratic(1, p->a1, p->a2, w, less);
  }
  return h;
}

/* Distance of the larger pole of a section from 0. */
static double radius(const lbr_section *p) {
  double split = p->a1 * p->a1 - 4 * p->a2;
  if (split < 0) return sqrt(p->a2);
  return (fabs(p->a1) + sqrt(split)) / 2;
}

size_t lbr_sections_settling(const lbr_sections *s, double level) {
  double most = 0;
  for (size_t j = 0; j < s->count; j++) most = fmax(most, radius(&s->part[j]));
  if (most <= 0) return 2 * s->count;
  double samples = ceil(log(level) / log(most));
  if (!(most < 1) || samples > (double)(SIZE_MAX / 4)) return SIZE_MAX / 4;
  return (size_t)samples + 2 * s->count;
}

double lbr_ends_sample(const double *x, size_t n, ptrdiff_t at,
                       lbr_ends ends) {
  ptrdiff_t last = (ptrdiff_t)n - 1;
  if (at >= 0 && at <= last) return x[at];
  double end = at < 0 ? x[0] : x[last];
  ptrdiff_t inside = at < 0 ? -at : 2 * last - at;
  switch (ends) {
    case LBR_ENDS_TURN: return 2 * end - x[inside];
    case LBR_ENDS_MIRROR: return x[inside];
    case LBR_ENDS_HOLD: return end;
    case LBR_ENDS_BARE: break;
  }
  return 0;
}

/* Runs the extension before the record and leaves the state behind it. */
static void run_before(const lbr_sections *s, lbr_sections_state *state,
                       const double *x, size_t n, lbr_ends ends, size_t pad) {
  double chunk[CHUNK];
  for (size_t at = 0; at < pad; at += CHUNK) {
    size_t some = pad - at < CHUNK ? pad - at : CHUNK;
    for (size_t i = 0; i < some; i++)
      chunk[i] = lbr_ends_sample(x, n, (ptrdiff_t)(at + i) - (ptrdiff_t)pad,
                                 ends);
    lbr_sections_run(s, state, chunk, chunk, some, 1);
  }
}

void lbr_sections_both_ways(const lbr_sections *s, const double *x, double *y,
                            size_t n, lbr_ends ends, size_t pad,
                            double *spare) {
  lbr_sections_state state = {{{0, 0}}};
  int settled = ends != LBR_ENDS_BARE;
  double first = lbr_ends_sample(x, n, -(ptrdiff_t)pad, ends);
  if (settled) lbr_sections_settled(s, first, &state);
  run_before(s, &state, x, n, ends, pad);
  lbr_sections_run(s, &state, x, y, n, 1);
  for (size_t i = 0; i < pad; i++)
    spare[i] = lbr_ends_sample(x, n, (ptrdiff_t)(n + i), ends);
  lbr_sections_run(s, &state, spare, spare, pad, 1);
  state = (lbr_sections_state){{{0, 0}}};
  if (settled)
    lbr_sections_settled(s, pad ? spare[pad - 1] : y[n - 1], &state);
  if (pad) lbr_sections_run(s, &state, spare + (pad - 1), spare + (pad - 1),
                            pad, -1);
  lbr_sections_run(s, &state, y + (n - 1), y + (n - 1), n, -1);
}
