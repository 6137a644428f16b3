#include "spectrum/chirp.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/checked.h"
#include "spectrum/fourier.h"
#include "spectrum/phase.h"
#include "spectrum/transform.h"

struct lbr_chirp {
  size_t n, points, folded;  /* folded: length of the convolution */
  lbr_fourier *fourier;
  double complex *before;    /* on sample j: exp(-2 pi i (first j + step j^2
                              * / 2)) */
  double complex *after;     /* on point k: exp(-pi i step k^2) */
  double complex *kernel;    /* transform of the conjugate chirp */
  double complex *product, *bins;
};

void lbr_chirp_free(lbr_chirp *c) {
  if (!c) return;
  lbr_fourier_free(c->fourier);
  free(c->before);
  free(c->after);
  lbr_transform_drop(c->kernel);
  lbr_transform_drop(c->product);
  lbr_transform_drop(c->bins);
  free(c);
}

static inline double complex times(double complex a, double complex b) {
  double ar = creal(a), ai = cimag(a), br = creal(b), bi = cimag(b);
  return CMPLX(ar * br - ai * bi, ar * bi + ai * br);
}

/* exp(-pi i step j^2); j^2 is a whole number below 2^53. */
static double complex chirp_at(double step, size_t j) {
  return lbr_phase_product(step / 2, (double)j * (double)j);
}

static size_t folded_length(size_t n) {
  if (n < 4096) return lbr_transform_fast_length(n);
  return 256 * lbr_transform_fast_length((n + 255) / 256);
}

static lbr_status fill(lbr_chirp *c, double first, double step) {
  size_t most = c->n > c->points ? c->n : c->points;
  memset(c->product, 0, c->folded * sizeof *c->product);
  for (size_t j = 0; j < most; j++) {
    double complex w = chirp_at(step, j);
    if (j < c->n)
      c->before[j] = times(w, lbr_phase_product(first, (double)j));
    if (j < c->points) c->after[j] = w;
    if (j < c->points) c->product[j] = conj(w);
    if (j > 0 && j < c->n) c->product[c->folded - j] = conj(w);
  }
  return lbr_fourier_run(c->fourier, c->product, NULL, c->kernel);
}

lbr_status lbr_chirp_new(size_t n, double first, double step, size_t points,
                         unsigned workers, lbr_chirp **out) {
  if (n < 1 || n > LBR_CHIRP_MOST || points < 1 || points > LBR_CHIRP_MOST ||
      !isfinite(first) || !isfinite(step))
    return LBR_DOMAIN;
  lbr_chirp *c = lbr_alloc(1, sizeof *c);
  if (!c) return LBR_NO_MEMORY;
  c->n = n;
  c->points = points;
  c->folded = folded_length(n + points - 1);
  lbr_status status = lbr_fourier_new(c->folded, workers, &c->fourier);
  c->before = lbr_alloc(n, sizeof *c->before);
  c->after = lbr_alloc(points, sizeof *c->after);
  c->kernel = (double complex *)lbr_transform_unset(2 * c->folded);
  c->product = (double complex *)lbr_transform_unset(2 * c->folded);
  c->bins = (double complex *)lbr_transform_unset(2 * c->folded);
  if (status == LBR_OK && !(c->before && c->after && c->kernel &&
                            c->product && c->bins))
    status = LBR_NO_MEMORY;
  if (status == LBR_OK) status = fill(c, first, step);
  if (status == LBR_OK)
    *out = c;
  else
    lbr_chirp_free(c);
  return status;
}

lbr_status lbr_chirp_run(lbr_chirp *c, const double complex *x,
                         double complex *out) {
  double scale = 1 / (double)c->folded;
  for (size_t j = 0; j < c->n; j++) c->product[j] = times(x[j], c->before[j]);
  memset(c->product + c->n, 0, (c->folded - c->n) * sizeof *c->product);
  lbr_status status = lbr_fourier_run(c->fourier, c->product, NULL, c->bins);
  if (status != LBR_OK) return status;
  for (size_t i = 0; i < c->folded; i++) {
    double complex p = times(c->bins[i], c->kernel[i]);
    c->product[i] = CMPLX(scale * creal(p), -scale * cimag(p));
  }
  status = lbr_fourier_run(c->fourier, c->product, NULL, c->bins);
  if (status != LBR_OK) return status;
  for (size_t k = 0; k < c->points; k++)
    out[k] = times(conj(c->bins[k]), c->after[k]);
  return LBR_OK;
}
