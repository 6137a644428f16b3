#include "spectrum/single.h"

#include <stdlib.h>
#include <string.h>

#include "base/checked.h"
#include "base/workers.h"
#include "spectrum/fourier.h"
#include "spectrum/phase.h"
#include "spectrum/transform.h"

#define DIRECT_MOST 131072 /* longest in one piece */
#define CHIRP_LEAST 1024   /* shortest by a chirp, and only then if it has */
#define PRIME_MOST 200     /* a prime factor beyond this */
#define SMOOTH_MOST 13     /* largest prime factor of lengths in pieces */
#define CHUNK 16384        /* bins or samples a task does */
#define FINE 4096          /* roots in the fine table */

typedef enum way { IN_ONE, IN_HALVES, BY_CHIRP } way;

struct lbr_single {
  size_t points;
  way way;
  unsigned workers;
  lbr_transform *real;   /* IN_ONE */
  double *scratch;       /* padded samples */
  double complex *bins;  /* what the transform gives */
  lbr_fourier *fourier;  /* of points / 2, or of the convolution */
  size_t folded;         /* BY_CHIRP: length of the convolution */
  double complex *chirp; /* exp(-i pi j^2 / points) */
  double complex *kernel; /* transform of its conjugate, over `folded` */
  double complex *product; /* workspace of the convolution */
  size_t turn;           /* roots of unity are of this order */
  double complex *fine, *coarse; /* roots e, and FINE e */
};

typedef struct job {
  lbr_single *s;
  const double *x, *w;
  size_t n;
  double *re, *im;
} job;

static size_t largest_prime(size_t n) {
  size_t most = 1;
  for (size_t p = 2; p * p <= n; p++)
    for (; n % p == 0; n /= p) most = p;
  return n > 1 && n > most ? n : most;
}

static way way_of(size_t points) {
  size_t prime = largest_prime(points);
  if (points >= CHIRP_LEAST && prime > PRIME_MOST) return BY_CHIRP;
  if (points <= DIRECT_MOST) return IN_ONE;
  return points % 2 == 0 && prime <= SMOOTH_MOST ? IN_HALVES : BY_CHIRP;
}

void lbr_single_free(lbr_single *s) {
  if (!s) return;
  lbr_transform_put(s->real);
  lbr_fourier_free(s->fourier);
  lbr_transform_drop(s->scratch);
  lbr_transform_drop(s->bins);
  lbr_transform_drop(s->kernel);
  lbr_transform_drop(s->product);
  free(s->chirp);
  free(s->fine);
  free(s->coarse);
  free(s);
}

static lbr_status make_roots(lbr_single *s, size_t turn) {
  s->turn = turn;
  s->fine = lbr_alloc(FINE, sizeof *s->fine);
  s->coarse = lbr_alloc(turn / FINE + 1, sizeof *s->coarse);
  if (!s->fine || !s->coarse) return LBR_NO_MEMORY;
  for (size_t i = 0; i < FINE; i++) s->fine[i] = lbr_phase_root(i, turn);
  for (size_t i = 0; i <= turn / FINE; i++)
    s->coarse[i] = lbr_phase_root(i * FINE, turn);
  return LBR_OK;
}

static inline double complex times(double complex a, double complex b) {
  double ar = creal(a), ai = cimag(a), br = creal(b), bi = cimag(b);
  return CMPLX(ar * br - ai * bi, ar * bi + ai * br);
}

static inline double complex root_of(const lbr_single *s, size_t e) {
  return times(s->coarse[e / FINE], s->fine[e % FINE]);
}

/* The smallest length >= n of primes 2, 3, 5 that is a multiple of 256. */
static size_t folded_length(size_t n) {
  return 256 * lbr_transform_fast_length((n + 255) / 256);
}

/* The conjugate chirp from -(points - 1) to points / 2, transformed. */
static lbr_status make_kernel(lbr_single *s) {
  size_t n = s->points, l = s->folded;
  memset(s->product, 0, l * sizeof *s->product);
  for (size_t j = 0; j <= n / 2; j++) s->product[j] = conj(s->chirp[j]);
  for (size_t j = 1; j < n; j++) s->product[l - j] = conj(s->chirp[j]);
  return lbr_fourier_run(s->fourier, s->product, NULL, s->kernel);
}

static lbr_status prepare_chirp(lbr_single *s) {
  size_t n = s->points;
  s->folded = folded_length(n + n / 2);
  lbr_status status = lbr_fourier_new(s->folded, s->workers, &s->fourier);
  if (status == LBR_OK) status = make_roots(s, 2 * n);
  if (status != LBR_OK) return status;
  s->chirp = lbr_alloc(n, sizeof *s->chirp);
  s->kernel = (double complex *)lbr_transform_unset(2 * s->folded);
  s->product = (double complex *)lbr_transform_unset(2 * s->folded);
  s->bins = (double complex *)lbr_transform_unset(2 * s->folded);
  if (!s->chirp || !s->kernel || !s->product || !s->bins)
    return LBR_NO_MEMORY;
  size_t square = 0; /* j^2 modulo 2 n */
  for (size_t j = 0; j < n; j++) {
    s->chirp[j] = root_of(s, square);
    square = (square + 2 * j + 1) % (2 * n);
  }
  return make_kernel(s);
}

static lbr_status prepare(lbr_single *s) {
  size_t n = s->points;
  if (s->way == BY_CHIRP) return prepare_chirp(s);
  if (s->way == IN_ONE) {
    s->scratch = lbr_transform_buffer(n);
    s->bins = (double complex *)lbr_transform_buffer(2 * (n / 2 + 1));
    if (!s->scratch || !s->bins) return LBR_NO_MEMORY;
    return lbr_transform_get(n, &s->real);
  }
  s->bins = (double complex *)lbr_transform_unset(n);
  if (!s->bins) return LBR_NO_MEMORY;
  lbr_status status = make_roots(s, n);
  if (status != LBR_OK) return status;
  return lbr_fourier_new(n / 2, s->workers, &s->fourier);
}

lbr_status lbr_single_new(size_t points, unsigned workers, lbr_single **out) {
  if (points < 1 || points > LBR_TRANSFORM_MOST) return LBR_DOMAIN;
  lbr_single *s = lbr_alloc(1, sizeof *s);
  if (!s) return LBR_NO_MEMORY;
  s->points = points;
  s->way = way_of(points);
  if (s->way == BY_CHIRP && folded_length(points + points / 2) >
                                LBR_TRANSFORM_MOST)
    s->way = IN_ONE;
  s->workers = points < DIRECT_MOST ? 1 : workers;
  lbr_status status = prepare(s);
  if (status == LBR_OK)
    *out = s;
  else
    lbr_single_free(s);
  return status;
}

size_t lbr_single_points(const lbr_single *s) { return s->points; }

/* Tasks over `count` items in chunks; short ones stay on this thread. */
static lbr_status over_chunks(lbr_task run, job *j, size_t count) {
  return lbr_workers_run(run, j, (count + CHUNK - 1) / CHUNK, j->s->workers);
}

static size_t chunk_end(size_t task, size_t count) {
  size_t end = (task + 1) * CHUNK;
  return end < count ? end : count;
}

/* Bins k and m - k of the whole from those of the half transform: even and
 * odd samples are its real and imaginary part. */
static inline void untangle(const job *j, size_t k, size_t m) {
  const double *z = (const double *)j->s->bins;
  size_t mirror = k == 0 ? 0 : m - k;
  double complex w = root_of(j->s, k);
  double ar = z[2 * k], ai = z[2 * k + 1];
  double br = z[2 * mirror], bi = z[2 * mirror + 1];
  double er = (ar + br) / 2, ei = (ai - bi) / 2;
  double odd_r = (ai + bi) / 2, odd_i = (br - ar) / 2;
  double tr = creal(w) * odd_r - cimag(w) * odd_i;
  double ti = creal(w) * odd_i + cimag(w) * odd_r;
  j->re[k] = er + tr;
  j->im[k] = ei + ti;
  j->re[m - k] = er - tr;
  j->im[m - k] = ti - ei;
}

static lbr_status untangle_chunk(void *context, size_t task, unsigned worker) {
  const job *j = context;
  size_t m = j->s->points / 2, end = chunk_end(task, m / 2 + 1);
  (void)worker;
  for (size_t k = task * CHUNK; k < end; k++) untangle(j, k, m);
  return LBR_OK;
}

static lbr_status run_halves(job *j) {
  lbr_single *s = j->s;
  const double *x = j->x, *w = j->w;
  if (j->n < s->points) { /* padded, the window along with it */
    if (!s->scratch) s->scratch = lbr_transform_buffer(s->points);
    if (!s->scratch) return LBR_NO_MEMORY;
    for (size_t i = 0; i < j->n; i++) s->scratch[i] = w ? w[i] * x[i] : x[i];
    memset(s->scratch + j->n, 0, (s->points - j->n) * sizeof *x);
    x = s->scratch;
    w = NULL;
  }
  lbr_status status = lbr_fourier_run(
      s->fourier, (const double complex *)(const void *)x, w, s->bins);
  if (status != LBR_OK) return status;
  return over_chunks(untangle_chunk, j, s->points / 4 + 1);
}

static lbr_status chirped(void *context, size_t task, unsigned worker) {
  const job *j = context;
  lbr_single *s = j->s;
  size_t from = task * CHUNK, end = chunk_end(task, s->folded);
  (void)worker;
  for (size_t i = from; i < end; i++) {
    double v = i >= j->n ? 0 : j->w ? j->w[i] * j->x[i] : j->x[i];
    s->product[i] = i < j->n ? CMPLX(v * creal(s->chirp[i]),
                                     v * cimag(s->chirp[i])) : 0;
  }
  return LBR_OK;
}

/* The conjugate of the product, over the length: its forward transform is the
 * conjugate of the convolution. */
static lbr_status multiplied(void *context, size_t task, unsigned worker) {
  const job *j = context;
  lbr_single *s = j->s;
  size_t end = chunk_end(task, s->folded);
  double scale = 1 / (double)s->folded;
  (void)worker;
  for (size_t i = task * CHUNK; i < end; i++) {
    double complex p = times(s->bins[i], s->kernel[i]);
    s->product[i] = CMPLX(scale * creal(p), -scale * cimag(p));
  }
  return LBR_OK;
}

static lbr_status unchirped(void *context, size_t task, unsigned worker) {
  const job *j = context;
  lbr_single *s = j->s;
  size_t end = chunk_end(task, s->points / 2 + 1);
  (void)worker;
  for (size_t k = task * CHUNK; k < end; k++) {
    double complex v = times(conj(s->bins[k]), s->chirp[k]);
    j->re[k] = creal(v);
    j->im[k] = cimag(v);
  }
  return LBR_OK;
}

static lbr_status run_chirp(job *j) {
  lbr_single *s = j->s;
  lbr_status status = over_chunks(chirped, j, s->folded);
  if (status == LBR_OK)
    status = lbr_fourier_run(s->fourier, s->product, NULL, s->bins);
  if (status == LBR_OK) status = over_chunks(multiplied, j, s->folded);
  if (status == LBR_OK)
    status = lbr_fourier_run(s->fourier, s->product, NULL, s->bins);
  if (status == LBR_OK)
    status = over_chunks(unchirped, j, s->points / 2 + 1);
  return status;
}

lbr_status lbr_single_run(lbr_single *s, const double *x, const double *w,
                          size_t n, double *re, double *im) {
  if (n > s->points) return LBR_DOMAIN;
  job j = {s, x, w, n, re, im};
  if (s->way == IN_HALVES) return run_halves(&j);
  if (s->way == BY_CHIRP) return run_chirp(&j);
  lbr_transform_windowed(s->real, x, w, n, s->scratch, s->bins);
  for (size_t k = 0; k <= s->points / 2; k++) {
    re[k] = creal(s->bins[k]);
    im[k] = cimag(s->bins[k]);
  }
  return LBR_OK;
}
