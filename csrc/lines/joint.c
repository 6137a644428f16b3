#include "lines/joint.h"

#include <math.h>
#include <string.h>

#include "base/checked.h"
#include "base/workers.h"
#include "lines/dirichlet.h"
#include "lines/normal.h"
#include "lines/phasor.h"
#include "lines/project.h"

#define TAU 6.283185307179586476925286766559
#define NEAR 64        /* bins: closer lines get their sums one by one */
#define EXACT_SHARE 1e-8 /* of the energy: a smaller residual is summed */

struct lbr_joint {
  size_t n, count;
  double *f;              /* count */
  double *even, *odd;     /* factors: count + 1 (offset first), count */
  double *even_inverse, *odd_inverse;
  double *a, *b;          /* right sides, then solutions */
  double *half_sin, *half_cos; /* of pi f, then of pi f n: 2 count each */
  double *residual;       /* n */
  double complex *sums;   /* count */
};

static size_t width_of(const lbr_joint *j) { return j->count + 1; }

lbr_status lbr_joint_new(size_t n, size_t count, lbr_joint **out) {
  if (count < 1 || count > LBR_JOINT_MOST || n < 2 * count + 2)
    return LBR_DOMAIN;
  lbr_joint *j = lbr_alloc(1, sizeof *j);
  if (!j) return LBR_NO_MEMORY;
  size_t width = count + 1, square = width * width;
  j->n = n;
  j->count = count;
  j->f = lbr_alloc(count, sizeof *j->f);
  j->even = lbr_alloc(square, sizeof *j->even);
  j->odd = lbr_alloc(square, sizeof *j->odd);
  j->even_inverse = lbr_alloc(square, sizeof *j->even_inverse);
  j->odd_inverse = lbr_alloc(square, sizeof *j->odd_inverse);
  j->a = lbr_alloc(width, sizeof *j->a);
  j->b = lbr_alloc(width, sizeof *j->b);
  j->half_sin = lbr_alloc(2 * count, sizeof *j->half_sin);
  j->half_cos = lbr_alloc(2 * count, sizeof *j->half_cos);
  j->residual = lbr_alloc(n, sizeof *j->residual);
  j->sums = lbr_alloc(count, sizeof *j->sums);
  if (j->f && j->even && j->odd && j->even_inverse && j->odd_inverse &&
      j->a && j->b && j->half_sin && j->half_cos && j->residual && j->sums) {
    *out = j;
    return LBR_OK;
  }
  lbr_joint_free(j);
  return LBR_NO_MEMORY;
}

void lbr_joint_free(lbr_joint *j) {
  if (!j) return;
  free(j->f);
  free(j->even);
  free(j->odd);
  free(j->even_inverse);
  free(j->odd_inverse);
  free(j->a);
  free(j->b);
  free(j->half_sin);
  free(j->half_cos);
  free(j->residual);
  free(j->sums);
  free(j);
}

/* sin and cos of pi f k from one exactly reduced phasor. */
static void half_turns(double f, double k, double *s, double *c) {
  double complex z = lbr_phasor_at(0.5 * f, k);
  *s = -cimag(z);
  *c = creal(z);
}

/* sums of cosines at f_i - f_k and f_i + f_k: by the addition theorem, which
 * loses digits only where the frequencies nearly meet. */
static void pair_sums(const lbr_joint *j, size_t i, size_t k, double *minus,
                      double *plus) {
  double bins = (double)j->n, far = NEAR / bins;
  double d = j->f[i] - j->f[k], s = j->f[i] + j->f[k];
  if (fabs(d - nearbyint(d)) < far || fabs(s - nearbyint(s)) < far) {
    *minus = lbr_dirichlet(d, j->n);
    *plus = lbr_dirichlet(s, j->n);
    return;
  }
  const double *hs = j->half_sin, *hc = j->half_cos;
  const double *ns = hs + j->count, *nc = hc + j->count;
  double u = hs[i] * hc[k], v = hc[i] * hs[k];
  double p = ns[i] * nc[k], q = nc[i] * ns[k];
  *minus = (p - q) / (u - v);
  *plus = (p + q) / (u + v);
}

static void fill_matrices(lbr_joint *j) {
  size_t width = width_of(j);
  for (size_t i = 0; i < j->count; i++) {
    half_turns(j->f[i], 1, &j->half_sin[i], &j->half_cos[i]);
    half_turns(j->f[i], (double)j->n, &j->half_sin[j->count + i],
               &j->half_cos[j->count + i]);
  }
  j->even[0] = (double)j->n;
  for (size_t i = 0; i < j->count; i++) {
    double *even = j->even + (i + 1) * width, *odd = j->odd + i * width;
    even[0] = lbr_dirichlet(j->f[i], j->n);
    for (size_t k = 0; k <= i; k++) {
      double minus, plus;
      pair_sums(j, i, k, &minus, &plus);
      even[k + 1] = 0.5 * (minus + plus);
      odd[k] = 0.5 * (minus - plus);
    }
  }
}

lbr_status lbr_joint_aim(lbr_joint *j, const double *f, size_t *line) {
  size_t column = 0, width = width_of(j);
  for (size_t i = 0; i < j->count; i++)
    if (!isfinite(f[i]) || fabs(f[i]) > 1e6 ||
        2 * f[i] == nearbyint(2 * f[i])) {
      if (line) *line = i;
      return LBR_DOMAIN;
    }
  memcpy(j->f, f, j->count * sizeof *f);
  fill_matrices(j);
  lbr_status status = lbr_normal_factor(j->even, j->count + 1, width, &column);
  if (status != LBR_OK) {
    if (line) *line = column ? column - 1 : 0;
    return status;
  }
  status = lbr_normal_factor(j->odd, j->count, width, &column);
  if (status != LBR_OK) {
    if (line) *line = column;
    return status;
  }
  lbr_normal_invert(j->even, j->count + 1, width, j->even_inverse);
  lbr_normal_invert(j->odd, j->count, width, j->odd_inverse);
  return LBR_OK;
}

/* Sum of squares that the fit leaves.  As energy less what the fit explains,
 * or sample by sample where that difference would have lost its digits. */
static double left_over(lbr_joint *j, const double *x, double energy,
                        double explained) {
  double rest = energy - explained;
  if (rest > EXACT_SHARE * energy) return rest;
  for (size_t i = 0; i < j->n; i++) j->residual[i] = x[i] - j->a[0];
  for (size_t i = 0; i < j->count; i++)
    lbr_take_away(j->residual, j->n, j->f[i], j->a[i + 1], j->b[i]);
  return lbr_energy(j->residual, j->n);
}

static void report_line(const lbr_joint *j, size_t i, double s2,
                        lbr_joint_line *out) {
  size_t width = width_of(j);
  double a = j->a[i + 1], b = j->b[i], r2 = a * a + b * b;
  double va = s2 * j->even_inverse[(i + 1) * width + i + 1];
  double vb = s2 * j->odd_inverse[i * width + i];
  out->amplitude = sqrt(r2);
  out->phase = atan2(-b, a);
  out->u_amplitude = r2 > 0 ? sqrt((a * a * va + b * b * vb) / r2)
                            : sqrt(0.5 * (va + vb));
  out->u_phase = r2 > 0 ? sqrt(b * b * va + a * a * vb) / r2 : INFINITY;
}

void lbr_joint_run(lbr_joint *j, const double *x, lbr_joint_line *lines,
                   lbr_joint_rest *rest) {
  size_t width = width_of(j), parameters = 2 * j->count + 1;
  double explained = 0, energy, *b = j->b;
  double before[2 * LBR_JOINT_MOST + 1];
  lbr_project(x, j->n, j->f, j->count, j->sums, &j->a[0], &energy);
  for (size_t i = 0; i < j->count; i++) {
    j->a[i + 1] = creal(j->sums[i]);
    b[i] = -cimag(j->sums[i]);
  }
  memcpy(before, j->a, width * sizeof *before);
  memcpy(before + width, b, j->count * sizeof *before);
  lbr_normal_solve(j->even, width, width, j->a);
  lbr_normal_solve(j->odd, j->count, width, b);
  for (size_t i = 0; i < width; i++) explained += before[i] * j->a[i];
  for (size_t i = 0; i < j->count; i++) explained += before[width + i] * b[i];
  double squares = left_over(j, x, energy, explained);
  double s2 = squares / (double)(j->n - parameters);
  for (size_t i = 0; i < j->count; i++) report_line(j, i, s2, &lines[i]);
  rest->offset = j->a[0];
  rest->u_offset = sqrt(s2 * j->even_inverse[0]);
  rest->rms = sqrt(squares / (double)j->n);
}

typedef struct batch {
  const double *x, *f;
  size_t n, records, count, share;
  int own;
  lbr_joint **joints; /* one a worker, aimed when not `own` */
  lbr_joint_line *lines;
  lbr_joint_rest *rests;
} batch;

static lbr_status ready(const batch *b, unsigned worker) {
  if (b->joints[worker]) return LBR_OK;
  lbr_status status = lbr_joint_new(b->n, b->count, &b->joints[worker]);
  if (status != LBR_OK || b->own) return status;
  return lbr_joint_aim(b->joints[worker], b->f, NULL);
}

static lbr_status run_share(void *context, size_t task, unsigned worker) {
  batch *b = context;
  size_t from = task * b->share, to = from + b->share;
  if (to > b->records) to = b->records;
  lbr_status status = ready(b, worker);
  for (size_t i = from; i < to && status == LBR_OK; i++) {
    if (b->own)
      status = lbr_joint_aim(b->joints[worker], b->f + i * b->count, NULL);
    if (status == LBR_OK)
      lbr_joint_run(b->joints[worker], b->x + i * b->n,
                    b->lines + i * b->count, &b->rests[i]);
  }
  return status;
}

lbr_status lbr_joint_batch(const double *x, size_t n, size_t records,
                           const double *f, size_t count, int own_frequencies,
                           unsigned workers, lbr_joint_line *lines,
                           lbr_joint_rest *rests) {
  if (workers == 0) workers = lbr_cores();
  size_t share = 1 + 65536 / n;
  batch b = {x, f, n, records, count, share, own_frequencies, NULL, lines,
             rests};
  b.joints = lbr_alloc(workers, sizeof(lbr_joint *));
  if (!b.joints) return LBR_NO_MEMORY;
  lbr_status status = lbr_workers_run(
      run_share, &b, (records + share - 1) / share, workers);
  for (unsigned i = 0; i < workers; i++) lbr_joint_free(b.joints[i]);
  free(b.joints);
  return status;
}
