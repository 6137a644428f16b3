#include "spectrum/fourier.h"

#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "base/checked.h"
#include "base/workers.h"
#include "spectrum/phase.h"
#include "spectrum/transform.h"

#define CLONES __attribute__((target_clones("avx512f", "avx2", "default")))
#define BATCH 16              /* columns or rows that go together */
#define DIRECT_MOST 4096      /* longest that is one transform */
#define THREADED 65536        /* shortest that is worth threads */
#define FINE 4096             /* roots in the fine table */
#define MOST_WORKERS 64

typedef struct seat {
  double complex *from, *to; /* a batch before and after its transforms */
} seat;

struct lbr_fourier {
  size_t n, n1, n2;        /* n2 == 1: one transform */
  unsigned workers;
  lbr_transform *columns, *rows; /* of n1 and of n2 points */
  double complex *middle;  /* n1 rows of n2 */
  double complex *fine, *coarse; /* roots of unity e, and FINE e */
  double *near;            /* exp(-2 pi i k1 b / n), b < BATCH: real, then
                            * imaginary parts, for each k1 */
  seat seats[MOST_WORKERS];
};

typedef struct job {
  lbr_fourier *f;
  const double complex *in;
  const double *weights;
  double complex *out;
} job;

void lbr_fourier_free(lbr_fourier *f) {
  if (!f) return;
  lbr_transform_put(f->columns);
  lbr_transform_put(f->rows);
  lbr_transform_drop(f->middle);
  free(f->fine);
  free(f->coarse);
  free(f->near);
  for (unsigned i = 0; i < MOST_WORKERS; i++) {
    lbr_transform_drop(f->seats[i].from);
    lbr_transform_drop(f->seats[i].to);
  }
  free(f);
}

/* The largest divisor up to the square root. */
static size_t side_of(size_t n) {
  size_t side = 1;
  for (size_t d = 1; d * d <= n; d++)
    if (n % d == 0) side = d;
  return side;
}

static void fill_tables(lbr_fourier *f) {
  for (size_t i = 0; i < FINE; i++) f->fine[i] = lbr_phase_root(i, f->n);
  for (size_t i = 0; i <= f->n / FINE; i++)
    f->coarse[i] = lbr_phase_root(i * FINE, f->n);
  for (size_t k = 0; k < f->n1; k++)
    for (size_t b = 0; b < BATCH; b++) {
      double complex w = lbr_phase_root(k * b % f->n, f->n);
      f->near[2 * BATCH * k + b] = creal(w);
      f->near[2 * BATCH * k + BATCH + b] = cimag(w);
    }
}

static lbr_status prepare(lbr_fourier *f) {
  size_t longest = f->n1 > f->n2 ? f->n1 : f->n2;
  lbr_status status = lbr_transform_get_complex(f->n1, &f->columns);
  if (status != LBR_OK) return status;
  f->middle = (double complex *)lbr_transform_unset(2 * f->n);
  if (f->n2 == 1) return f->middle ? LBR_OK : LBR_NO_MEMORY;
  status = lbr_transform_get_complex(f->n2, &f->rows);
  if (status != LBR_OK) return status;
  f->fine = lbr_alloc(FINE, sizeof *f->fine);
  f->coarse = lbr_alloc(f->n / FINE + 1, sizeof *f->coarse);
  f->near = lbr_alloc(2 * BATCH * f->n1, sizeof *f->near);
  if (!f->middle || !f->fine || !f->coarse || !f->near) return LBR_NO_MEMORY;
  fill_tables(f);
  for (unsigned i = 0; i < f->workers; i++) {
    size_t values = 2 * BATCH * longest;
    f->seats[i].from = (double complex *)lbr_transform_buffer(values);
    f->seats[i].to = (double complex *)lbr_transform_buffer(values);
    if (!f->seats[i].from || !f->seats[i].to) return LBR_NO_MEMORY;
  }
  return LBR_OK;
}

lbr_status lbr_fourier_new(size_t n, unsigned workers, lbr_fourier **out) {
  if (n < 1 || n > LBR_TRANSFORM_MOST) return LBR_DOMAIN;
  lbr_fourier *f = lbr_alloc(1, sizeof *f);
  if (!f) return LBR_NO_MEMORY;
  size_t side = n > DIRECT_MOST ? side_of(n) : 1;
  if (side < BATCH) side = 1;
  f->n = n;
  f->n1 = n / side;
  f->n2 = side;
  f->workers = n < THREADED ? 1 : workers ? workers : lbr_cores();
  if (f->workers > MOST_WORKERS) f->workers = MOST_WORKERS;
  lbr_status status = prepare(f);
  if (status == LBR_OK)
    *out = f;
  else
    lbr_fourier_free(f);
  return status;
}

/* exp(-2 pi i e / n), e < n. */
static inline double complex root_of(const lbr_fourier *f, size_t e) {
  double complex a = f->coarse[e / FINE], b = f->fine[e % FINE];
  return CMPLX(creal(a) * creal(b) - cimag(a) * cimag(b),
               creal(a) * cimag(b) + cimag(a) * creal(b));
}

/* Columns j2 .. j2 + count - 1 one after the other. */
CLONES static void gather(const double complex *restrict in,
                          const double *restrict weights, size_t n1, size_t n2,
                          size_t j2, size_t count,
                          double complex *restrict out) {
  const double *x = (const double *)in;
  double *y = (double *)out;
  for (size_t j1 = 0; j1 < n1; j1++) {
    size_t at = 2 * (j1 * n2 + j2);
    for (size_t b = 0; b < count; b++) {
      double re = x[at + 2 * b], im = x[at + 2 * b + 1];
      if (weights) {
        re *= weights[at + 2 * b];
        im *= weights[at + 2 * b + 1];
      }
      y[2 * (b * n1 + j1)] = re;
      y[2 * (b * n1 + j1) + 1] = im;
    }
  }
}

/* Row k1 of a batch times its twiddle factors: those of column 0, `first`,
 * times those of the distance from it, `near`. */
CLONES static void twiddle(const double complex *restrict column, size_t n1,
                           size_t count, double wr, double wi,
                           const double *restrict near,
                           double *restrict out) {
  const double *x = (const double *)column;
  for (size_t b = 0; b < count; b++) {
    double tr = wr * near[b] - wi * near[BATCH + b];
    double ti = wr * near[BATCH + b] + wi * near[b];
    double re = x[2 * b * n1], im = x[2 * b * n1 + 1];
    double first = re * tr, second = im * ti;
    double third = re * ti, fourth = im * tr;
    out[2 * b] = first - second;
    out[2 * b + 1] = third + fourth;
  }
}

static lbr_status run_columns(void *context, size_t task, unsigned worker) {
  const job *j = context;
  lbr_fourier *f = j->f;
  const seat *s = &f->seats[worker];
  size_t j2 = task * BATCH;
  size_t count = f->n2 - j2 < BATCH ? f->n2 - j2 : BATCH;
  gather(j->in, j->weights, f->n1, f->n2, j2, count, s->from);
  for (size_t b = 0; b < count; b++)
    lbr_transform_complex(f->columns, s->from + b * f->n1, s->to + b * f->n1);
  size_t e = 0; /* k1 j2 modulo n */
  for (size_t k1 = 0; k1 < f->n1; k1++) {
    double complex w = root_of(f, e);
    twiddle(s->to + k1, f->n1, count, creal(w), cimag(w),
            f->near + 2 * BATCH * k1, (double *)(f->middle + k1 * f->n2 + j2));
    e += j2;
    if (e >= f->n) e -= f->n;
  }
  return LBR_OK;
}

static lbr_status run_rows(void *context, size_t task, unsigned worker) {
  const job *j = context;
  lbr_fourier *f = j->f;
  double complex *to = f->seats[worker].to;
  size_t k1 = task * BATCH;
  size_t count = f->n1 - k1 < BATCH ? f->n1 - k1 : BATCH;
  for (size_t r = 0; r < count; r++)
    lbr_transform_complex(f->rows, f->middle + (k1 + r) * f->n2,
                          to + r * f->n2);
  for (size_t k2 = 0; k2 < f->n2; k2++)
    for (size_t r = 0; r < count; r++)
      j->out[k1 + r + f->n1 * k2] = to[r * f->n2 + k2];
  return LBR_OK;
}

/* By way of the workspace: the input may stand anywhere. */
static void run_directly(const lbr_fourier *f, const double complex *in,
                         const double *weights, double complex *out) {
  gather(in, weights, f->n, 1, 0, 1, f->middle);
  lbr_transform_complex(f->columns, f->middle, out);
}

lbr_status lbr_fourier_run(lbr_fourier *f, const double complex *in,
                           const double *weights, double complex *out) {
  if (f->n2 == 1) {
    run_directly(f, in, weights, out);
    return LBR_OK;
  }
  job j = {f, in, weights, out};
  lbr_status status = lbr_workers_run(run_columns, &j,
                                      (f->n2 + BATCH - 1) / BATCH, f->workers);
  if (status != LBR_OK) return status;
  return lbr_workers_run(run_rows, &j, (f->n1 + BATCH - 1) / BATCH,
                         f->workers);
}
