#include "spectrum/zoom.h"

#include <math.h>
#include <stdlib.h>

#include "base/checked.h"
#include "base/workers.h"
#include "spectrum/phase.h"
#include "spectrum/thin.h"

#define FIRST_MOST 32   /* most that the first stage thins out by */
#define KEEP 8          /* the band is at most 1 / KEEP of the thinned rate
                         * to either side */
#define LEAST 4096      /* records below are not thinned out */
#define CHUNK 2048      /* outputs of the first stage that a task does */
#define FINE 256

struct lbr_zoom {
  size_t n, points;
  unsigned workers;
  double centre;             /* cycles/sample */
  size_t stages;             /* 0, 1 or 2 */
  lbr_thin stage[2];
  size_t count[2];           /* samples after each */
  size_t by;                 /* thinned out by in all */
  double *re[2], *im[2];     /* samples after each stage */
  double complex *fine, *coarse; /* exp(-2 pi i centre by1 m) for m, FINE m */
  double complex *x;         /* samples of the chirp */
  double complex *bins;      /* what it gives */
  double complex *correction; /* on each point */
  lbr_chirp *chirp;
};

void lbr_zoom_free(lbr_zoom *z) {
  if (!z) return;
  for (size_t s = 0; s < 2; s++) {
    lbr_thin_free(&z->stage[s]);
    free(z->re[s]);
    free(z->im[s]);
  }
  free(z->fine);
  free(z->coarse);
  free(z->x);
  free(z->bins);
  free(z->correction);
  lbr_chirp_free(z->chirp);
  free(z);
}

static inline double complex times(double complex a, double complex b) {
  double ar = creal(a), ai = cimag(a), br = creal(b), bi = cimag(b);
  return CMPLX(ar * br - ai * bi, ar * bi + ai * br);
}

static lbr_status make_stage(lbr_zoom *z, size_t by, double half, double shift,
                             size_t n) {
  size_t s = z->stages++;
  lbr_status status = lbr_thin_make(&z->stage[s], by, half, shift);
  if (status != LBR_OK) return status;
  z->count[s] = lbr_thin_count(&z->stage[s], n);
  z->re[s] = lbr_alloc(z->count[s], sizeof(double));
  z->im[s] = lbr_alloc(z->count[s], sizeof(double));
  z->by *= by;
  return z->re[s] && z->im[s] ? LBR_OK : LBR_NO_MEMORY;
}

static lbr_status make_turns(lbr_zoom *z) {
  size_t by = z->stage[0].by, coarse = z->count[0] / FINE + 1;
  z->fine = lbr_alloc(FINE, sizeof *z->fine);
  z->coarse = lbr_alloc(coarse, sizeof *z->coarse);
  if (!z->fine || !z->coarse) return LBR_NO_MEMORY;
  for (size_t m = 0; m < FINE; m++)
    z->fine[m] = lbr_phase_product(z->centre, (double)(m * by));
  for (size_t m = 0; m < coarse; m++)
    z->coarse[m] = lbr_phase_product(z->centre, (double)(m * FINE * by));
  return LBR_OK;
}

/* half: of the band, cycles/sample */
static lbr_status make_stages(lbr_zoom *z, double half) {
  double wide = half > 0 ? 1 / (KEEP * half) : (double)z->n;
  size_t by = wide < (double)(z->n / 64) ? (size_t)wide : z->n / 64;
  if (z->n < LEAST || by < 2) return LBR_OK;
  size_t first = by < FIRST_MOST ? by : FIRST_MOST;
  lbr_status status = make_stage(z, first, half, z->centre, z->n);
  if (status == LBR_OK) status = make_turns(z);
  if (status != LBR_OK || by / first < 2) return status;
  return make_stage(z, by / first, half * (double)first, 0, z->count[0]);
}

static lbr_status make_correction(lbr_zoom *z, double offset, double step) {
  for (size_t k = 0; k < z->points; k++) {
    double nu = offset + (double)k * step;
    double complex c = (double)z->by;
    if (z->stages > 0) c /= lbr_thin_response(&z->stage[0], nu);
    if (z->stages > 1)
      c /= lbr_thin_response(&z->stage[1], nu * (double)z->stage[0].by);
    z->correction[k] = c;
  }
  return LBR_OK;
}

static lbr_status prepare(lbr_zoom *z, double first, double step) {
  double span = step * (double)(z->points - 1);
  z->centre = first + span / 2;
  lbr_status status = make_stages(z, fabs(span) / 2);
  if (status != LBR_OK) return status;
  if (z->stages == 0) z->centre = 0;
  size_t left = z->stages ? z->count[z->stages - 1] : z->n;
  double offset = first - z->centre, by = (double)z->by;
  z->x = lbr_alloc(left, sizeof *z->x);
  z->bins = lbr_alloc(z->points, sizeof *z->bins);
  z->correction = lbr_alloc(z->points, sizeof *z->correction);
  if (!z->x || !z->bins || !z->correction) return LBR_NO_MEMORY;
  status = make_correction(z, offset, step);
  if (status != LBR_OK) return status;
  return lbr_chirp_new(left, offset * by, step * by, z->points, z->workers,
                       &z->chirp);
}

lbr_status lbr_zoom_new(size_t n, double first, double step, size_t points,
                        unsigned workers, lbr_zoom **out) {
  if (n < 1 || n > LBR_CHIRP_MOST || points < 1 || points > LBR_CHIRP_MOST ||
      !(fabs(first) <= 1) || !(fabs(step) <= 1))
    return LBR_DOMAIN;
  lbr_zoom *z = lbr_alloc(1, sizeof *z);
  if (!z) return LBR_NO_MEMORY;
  z->n = n;
  z->points = points;
  z->workers = workers;
  z->by = 1;
  lbr_status status = prepare(z, first, step);
  if (status == LBR_OK)
    *out = z;
  else
    lbr_zoom_free(z);
  return status;
}

size_t lbr_zoom_samples(const lbr_zoom *z) { return z->n; }
size_t lbr_zoom_points(const lbr_zoom *z) { return z->points; }
size_t lbr_zoom_decimation(const lbr_zoom *z) { return z->by; }

typedef struct job {
  lbr_zoom *z;
  const double *x;
} job;

static lbr_status thin_chunk(void *context, size_t task, unsigned worker) {
  const job *j = context;
  lbr_zoom *z = j->z;
  size_t from = task * CHUNK;
  size_t count = z->count[0] - from < CHUNK ? z->count[0] - from : CHUNK;
  double *re = z->re[0] + from, *im = z->im[0] + from;
  (void)worker;
  lbr_thin_real(&z->stage[0], j->x, z->n, from, count, re, im);
  for (size_t i = 0; i < count; i++) {
    size_t m = from + i;
    double complex turn = times(z->coarse[m / FINE], z->fine[m % FINE]);
    double complex v = times(CMPLX(re[i], im[i]), turn);
    re[i] = creal(v);
    im[i] = cimag(v);
  }
  return LBR_OK;
}

lbr_status lbr_zoom_run(lbr_zoom *z, const double *x, double *re, double *im) {
  job j = {z, x};
  size_t left = z->stages ? z->count[z->stages - 1] : z->n;
  if (z->stages > 0) {
    lbr_status status = lbr_workers_run(
        thin_chunk, &j, (z->count[0] + CHUNK - 1) / CHUNK, z->workers);
    if (status != LBR_OK) return status;
  }
  if (z->stages > 1) {
    lbr_thin_part(&z->stage[1], z->re[0], z->count[0], 0, left, z->re[1]);
    lbr_thin_part(&z->stage[1], z->im[0], z->count[0], 0, left, z->im[1]);
  }
  size_t s = z->stages ? z->stages - 1 : 0;
  for (size_t i = 0; i < left; i++)
    z->x[i] = z->stages ? CMPLX(z->re[s][i], z->im[s][i]) : x[i];
  lbr_status status = lbr_chirp_run(z->chirp, z->x, z->bins);
  if (status != LBR_OK) return status;
  for (size_t k = 0; k < z->points; k++) {
    double complex v = times(z->bins[k], z->correction[k]);
    re[k] = creal(v);
    im[k] = cimag(v);
  }
  return LBR_OK;
}
