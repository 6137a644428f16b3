/* Where the strongest line of a record is, and fits of many records. */
#include <math.h>

#include "base/checked.h"
#include "base/workers.h"
#include "lines/phasor.h"
#include "lines/sine.h"
#include "spectrum/transform.h"

#define FEW 5     /* cycles below which image and offset disturb the bins */
#define GRID 0.25 /* bins between the fits that are tried there */

struct lbr_finder {
  size_t n;
  lbr_transform *transform;
  double *scratch;
  double complex *bins;
};

lbr_status lbr_finder_new(size_t n, lbr_finder **out) {
  if (n < LBR_SINE_LEAST) return LBR_DOMAIN;
  lbr_finder *f = lbr_alloc(1, sizeof *f);
  if (!f) return LBR_NO_MEMORY;
  f->n = n;
  lbr_status status = lbr_transform_get(n, &f->transform);
  if (status == LBR_OK) {
    f->scratch = lbr_transform_buffer(n);
    f->bins = (double complex *)lbr_transform_buffer(2 * (n / 2 + 1));
    if (!f->scratch || !f->bins) status = LBR_NO_MEMORY;
  }
  if (status == LBR_OK)
    *out = f;
  else
    lbr_finder_free(f);
  return status;
}

void lbr_finder_free(lbr_finder *f) {
  if (!f) return;
  lbr_transform_put(f->transform);
  lbr_transform_drop(f->scratch);
  lbr_transform_drop(f->bins);
  free(f);
}

static double power_of(double complex x) {
  return creal(x) * creal(x) + cimag(x) * cimag(x);
}

/* Bin k, the record being real: any whole k from -n / 2 to n. */
static double complex bin(const lbr_finder *f, long k) {
  long n = (long)f->n;
  if (k < 0) return conj(f->bins[-k]);
  return k > n / 2 ? conj(f->bins[n - k]) : f->bins[k];
}

/* |X| of the record times a Hann window, from the bins without one. */
static double hann_at(const lbr_finder *f, long k) {
  return cabs(bin(f, k) - 0.5 * (bin(f, k - 1) + bin(f, k + 1)));
}

/* Bins from k, by T. Grandke 1983 (IEEE Trans. Instrum. Meas. 32, 350-355):
 * (2 r - 1) / (r + 1), r the ratio of the larger neighbour to the bin. */
static double offset_at(const lbr_finder *f, long k) {
  double below = hann_at(f, k - 1), here = hann_at(f, k);
  double above = hann_at(f, k + 1), r = fmax(below, above) / here;
  double offset = (2 * r - 1) / (r + 1);
  if (!isfinite(offset)) return 0;
  offset = fmin(fmax(offset, -0.5), 1);
  return above > below ? offset : -offset;
}

/* Few cycles: the fit with the smallest residual on a grid. */
static double best_of_grid(const lbr_finder *f, const double *x) {
  double best = INFINITY, at = 1, last = fmin(FEW + 1, 0.5 * (double)f->n);
  for (double bins = 0.5; bins < last; bins += GRID) {
    lbr_sine fit;
    if (lbr_sine_fit3(x, f->n, bins / (double)f->n, &fit) == LBR_OK &&
        fit.rms < best) {
      best = fit.rms;
      at = bins;
    }
  }
  return at / (double)f->n;
}

double lbr_finder_run(lbr_finder *f, const double *x) {
  long top = 1, last = ((long)f->n - 1) / 2;
  lbr_transform_windowed(f->transform, x, NULL, f->n, f->scratch, f->bins);
  double most = power_of(f->bins[1]);
  for (long k = 2; k <= last; k++) {
    double power = power_of(f->bins[k]);
    if (!(power > most)) continue;
    most = power;
    top = k;
  }
  if (top < FEW) return best_of_grid(f, x);
  return ((double)top + offset_at(f, top)) / (double)f->n;
}

typedef struct batch {
  const double *x, *starts;
  size_t n, count, share; /* records in all; in one task */
  lbr_finder **finders;   /* one a worker */
  lbr_sine *out;
} batch;

static const lbr_sine no_fit = {NAN, NAN, NAN, NAN, NAN, NAN,
                                NAN, NAN, NAN, NAN, NAN, NAN};

static void fit_record(const batch *b, size_t i, lbr_finder *finder) {
  const double *x = b->x + i * b->n;
  double start = b->starts ? b->starts[i] : lbr_finder_run(finder, x);
  if (lbr_sine_fit4(x, b->n, start, &b->out[i]) != LBR_OK) b->out[i] = no_fit;
}

static lbr_status run_share(void *context, size_t task, unsigned worker) {
  batch *b = context;
  size_t from = task * b->share, to = from + b->share;
  if (to > b->count) to = b->count;
  if (!b->starts && !b->finders[worker]) {
    lbr_status status = lbr_finder_new(b->n, &b->finders[worker]);
    if (status != LBR_OK) return status;
  }
  for (size_t i = from; i < to; i++) fit_record(b, i, b->finders[worker]);
  return LBR_OK;
}

lbr_status lbr_sine_batch(const double *x, size_t n, size_t count,
                          const double *starts, unsigned workers,
                          lbr_sine *out) {
  if (n < LBR_SINE_LEAST) return LBR_DOMAIN;
  if (workers == 0) workers = lbr_cores();
  size_t share = 1 + 65536 / n;
  batch b = {x, starts, n, count, share, NULL, out};
  b.finders = lbr_alloc(workers, sizeof(lbr_finder *));
  if (!b.finders) return LBR_NO_MEMORY;
  lbr_status status = lbr_workers_run(run_share, &b,
                                      (count + share - 1) / share, workers);
  for (unsigned i = 0; i < workers; i++) lbr_finder_free(b.finders[i]);
  free(b.finders);
  return status;
}
