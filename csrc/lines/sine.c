#include "lines/sine.h"

#include <math.h>
#include <stdbool.h>
#include <string.h>

#include "base/checked.h"
#include "lines/dirichlet.h"
#include "lines/normal.h"
#include "lines/phasor.h"
#include "lines/project.h"

#define TAU 6.283185307179586476925286766559
#define STRIDE 0.5   /* largest step of a round, bins */
#define LARGE 0.0625 /* a step after which a and b are fitted anew */
#define LEASH 1.5    /* farthest from the start, bins */
#define ROUNDS 60
#define SETTLED 1e-8 /* last step, bins: the next would be its square */
#define LANES 8
#define BLOCK LBR_PHASOR_BLOCK
#define CHUNK 64 /* anchors of blocks made at a time */
#define FAST __attribute__((target_clones("avx512f", "avx2", "default")))

/* a cos + b sin + offset at frequency f; v is measured from it in bins. */
typedef struct model {
  double f, a, b, offset;
  double inverse[16];  /* of the normal matrix; lower triangle, 4 a row */
} model;

/* sum cos, sin, 1 times the samples, and the derivatives per bin. */
typedef struct products {
  double complex x, slope;
  double sum;
} products;

static double sum_of(const double *x, size_t n) {
  double lane[LANES] = {0}, rest = 0;
  size_t i = 0;
  for (; i + LANES <= n; i += LANES)
    for (size_t l = 0; l < LANES; l++) lane[l] += x[i + l];
  for (; i < n; i++) rest += x[i];
  for (size_t l = 0; l < LANES; l++) rest += lane[l];
  return rest;
}

/* The normal matrix of the columns cos, sin, 1 and d/dv of the model; the
 * last is t / n times 2 pi (-a sin + b cos). */
static void normal_matrix(const model *m, size_t n, double g[16]) {
  lbr_closed_sums one = lbr_dirichlet_sums(m->f, n);
  lbr_closed_sums two = lbr_dirichlet_sums(2 * m->f, n);
  double count = (double)n, all = lbr_square_sum(n), a = m->a, b = m->b;
  memset(g, 0, 16 * sizeof *g);
  g[0] = 0.5 * (count + two.cosine);
  g[5] = 0.5 * (count - two.cosine);
  g[8] = one.cosine;
  g[10] = count;
  g[12] = -0.5 * TAU * a * two.ramp;
  g[13] = 0.5 * TAU * b * two.ramp;
  g[14] = -TAU * a * one.ramp;
  g[15] = 0.5 * TAU * TAU *
          (a * a * (all - two.square) + b * b * (all + two.square));
}

static products at_frequency(const double *x, size_t n, double f) {
  products p = {0};
  double square;
  lbr_project(x, n, &f, 1, &p.x, &p.sum, &square);
  return p;
}

/* Solves for a, b, offset, and the step in bins when size is 4. */
static lbr_status solve(model *m, size_t n, const products *p, size_t size,
                        double *step) {
  double g[16], b[4] = {creal(p->x), -cimag(p->x), p->sum, 0};
  size_t column;
  if (size == 4) b[3] = m->a * creal(p->slope) - m->b * cimag(p->slope);
  normal_matrix(m, n, g);
  lbr_status status = lbr_normal_factor(g, size, 4, &column);
  if (status != LBR_OK) return status;
  lbr_normal_solve(g, size, 4, b);
  lbr_normal_invert(g, size, 4, m->inverse);
  m->a = b[0];
  m->b = b[1];
  m->offset = b[2];
  *step = b[3];
  return LBR_OK;
}

/* sum of squares of the residual, straight from the samples. */
FAST static double residual_of(const double *x, size_t n, const model *m) {
  double c[BLOCK], s[BLOCK], zr[CHUNK], zi[CHUNK], lane[LANES] = {0}, rest = 0;
  double start = -0.5 * ((double)n - 1), offset = m->offset;
  size_t block = 0;
  lbr_phases(m->f, 0, 1, BLOCK, c, s);
  for (size_t at = 0; at < n; at += BLOCK, block++) {
    if (block % CHUNK == 0) {
      size_t left = (n - at + BLOCK - 1) / BLOCK;
      lbr_phases(m->f, start + (double)at, BLOCK, left < CHUNK ? left : CHUNK,
                 zr, zi);
    }
    double re = zr[block % CHUNK], im = zi[block % CHUNK]; /* cos, -sin */
    double p = m->a * re - m->b * im, q = m->a * im + m->b * re;
    const double *y = x + at;
    if (n - at >= BLOCK) {
      for (size_t k = 0; k < BLOCK; k += LANES)
        for (size_t l = 0; l < LANES; l++) {
          double r = (y[k + l] - offset) - (p * c[k + l] - q * s[k + l]);
          lane[l] += r * r;
        }
      continue;
    }
    for (size_t k = 0; k < n - at; k++) {
      double r = (y[k] - offset) - (p * c[k] - q * s[k]);
      rest += r * r;
    }
  }
  for (size_t l = 0; l < LANES; l++) rest += lane[l];
  return rest;
}

static double deviation(double variance) { return sqrt(fmax(variance, 0)); }

/* From a, b, offset and the inverse to what is reported. */
static void report(const double *x, size_t n, const model *m, size_t size,
                   double rounds, lbr_sine *out) {
  const double *v = m->inverse;
  double squares = residual_of(x, n, m), count = (double)n;
  double s2 = squares / (count - (double)size);
  double r2 = m->a * m->a + m->b * m->b, r = sqrt(r2), half = 0.5 * (count - 1);
  double da = m->a / r, db = m->b / r;   /* of the amplitude */
  double pa = m->b / r2, pb = -m->a / r2; /* of the phase atan2(-b, a) */
  double turn = TAU * half / count;       /* of the start phase, per bin */
  double step = size == 4 ? v[15] : 0, sa = size == 4 ? v[12] : 0;
  double sb = size == 4 ? v[13] : 0;
  double phase = pa * pa * v[0] + 2 * pa * pb * v[4] + pb * pb * v[5];
  double start = phase - 2 * turn * (pa * sa + pb * sb) + turn * turn * step;
  double at_start = atan2(-m->b, m->a) - TAU * fmod(m->f * half, 1);
  *out = (lbr_sine){
      .amplitude = r,
      .frequency = m->f,
      .phase = atan2(-m->b, m->a),
      .start_phase = at_start - TAU * nearbyint(at_start / TAU),
      .offset = m->offset,
      .rms = sqrt(squares / count),
      .u_amplitude = deviation(
          s2 * (da * da * v[0] + 2 * da * db * v[4] + db * db * v[5])),
      .u_frequency = deviation(s2 * step) / count,
      .u_phase = deviation(s2 * phase),
      .u_start_phase = deviation(s2 * start),
      .u_offset = deviation(s2 * v[10]),
      .rounds = rounds};
}

static bool is_usable(size_t n, double f) {
  return n >= LBR_SINE_LEAST && isfinite(f) && fabs(f) < 1e6 &&
         2 * f != nearbyint(2 * f);
}

lbr_status lbr_sine_fit3(const double *x, size_t n, double f, lbr_sine *out) {
  model m = {.f = f};
  double step;
  if (!is_usable(n, f)) return LBR_DOMAIN;
  products p = at_frequency(x, n, f);
  if (!isfinite(p.sum)) return LBR_DOMAIN;
  lbr_status status = solve(&m, n, &p, 3, &step);
  if (status != LBR_OK) return status;
  report(x, n, &m, 3, 0, out);
  return LBR_OK;
}

static products slope_at(const double *x, size_t n, double f, double sum) {
  products p = {.sum = sum};
  lbr_project_slope(x, n, f, &p.x, &p.slope);
  return p;
}

/* Rounds of the four-parameter fit from m->f; *rounds counts them.  The last
 * step moves the frequency by so little that a and b, which were fitted along
 * with the step, are right to its square. */
static lbr_status iterate(const double *x, size_t n, double sum, model *m,
                          double *rounds) {
  double first = m->f, step, enough = SETTLED + 4e-16 * fabs(m->f) * (double)n;
  products p = slope_at(x, n, m->f, sum);
  lbr_status status = solve(m, n, &p, 3, &step);
  for (int i = 1; i <= ROUNDS && status == LBR_OK; i++) {
    status = solve(m, n, &p, 4, &step);
    if (status != LBR_OK) break;
    if (!isfinite(step)) return LBR_NO_CONVERGE;
    m->f += fmin(fmax(step, -STRIDE), STRIDE) / (double)n;
    if (fabs(m->f - first) * (double)n > LEASH) return LBR_NO_CONVERGE;
    *rounds = i;
    if (fabs(step) <= enough) return LBR_OK;
    p = slope_at(x, n, m->f, sum);
    if (fabs(step) > LARGE) status = solve(m, n, &p, 3, &step);
  }
  return status == LBR_OK ? LBR_NO_CONVERGE : status;
}

lbr_status lbr_sine_fit4(const double *x, size_t n, double start,
                         lbr_sine *out) {
  model m = {.f = start};
  double rounds;
  if (!is_usable(n, start)) return LBR_DOMAIN;
  double sum = sum_of(x, n);
  if (!isfinite(sum)) return LBR_DOMAIN;
  lbr_status status = iterate(x, n, sum, &m, &rounds);
  if (status != LBR_OK) return status;
  report(x, n, &m, 4, rounds, out);
  return LBR_OK;
}
