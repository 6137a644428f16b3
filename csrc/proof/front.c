#include "proof/front.h"

#include <math.h>
#include <string.h>

#include "base/checked.h"
#include "proof/draw.h"
#include "proof/tone.h"
#include "spectrum/transform.h"

#define TAU 6.283185307179586476925286766559
#define SHAPE 512        /* intervals at which the folded density is known */
#define FOLD_LEVEL 1e-4  /* gain below which input noise is left out */
#define MOST_FOLDS 4096

/* Keys that keep the two kinds of random numbers apart. */
#define NOISE_KEY UINT64_C(0x6e6f697365)
#define JITTER_KEY UINT64_C(0x6a6974746572)

struct lbr_front {
  const lbr_proof *proof;
  double density[SHAPE + 1]; /* one-sided, unit^2/Hz, 0 .. rate / 2 */
  double *slope;             /* n: time derivative of the record, unit/s */
  lbr_transform *transform;  /* n points; NULL: no noise */
  double *noise;             /* n */
  double complex *bins;
};

/* Sum of |F|^2 over all frequencies that show at `hz` of the first zone. */
static double folded(const lbr_filter *filter, double hz, double rate) {
  double edge = lbr_filter_edge(filter, FOLD_LEVEL, rate), sum = 0;
  if (filter->shape == LBR_FILTER_NONE || !isfinite(edge)) return 1;
  double folds = fmin(ceil(edge / rate), MOST_FOLDS);
  for (double k = 0; k <= folds; k++) {
    double up = lbr_filter_gain(filter, k * rate + hz, rate);
    double down = lbr_filter_gain(filter, (k + 1) * rate - hz, rate);
    sum += up * up + down * down;
  }
  return sum;
}

static lbr_status fill_noise(lbr_front *f) {
  const lbr_proof *proof = f->proof;
  double input = proof->scene->noise, own = proof->front->noise;
  if (!(input > 0) && !(own > 0)) return LBR_OK;
  for (int i = 0; i <= SHAPE; i++) {
    double hz = 0.5 * proof->rate * i / SHAPE;
    double fold = input > 0 ? folded(&proof->front->filter, hz, proof->rate) : 0;
    f->density[i] = input * input * fold + own * own;
  }
  lbr_status status = lbr_transform_get(proof->n, &f->transform);
  if (status != LBR_OK) return status;
  f->noise = lbr_transform_buffer(proof->n);
  f->bins = (double complex *)lbr_transform_buffer(2 * (proof->n / 2 + 1));
  return f->noise && f->bins ? LBR_OK : LBR_NO_MEMORY;
}

lbr_status lbr_front_new(const lbr_proof *proof, lbr_front **out) {
  lbr_front *f = lbr_alloc(1, sizeof *f);
  if (!f) return LBR_NO_MEMORY;
  f->proof = proof;
  f->slope = lbr_alloc(proof->n, sizeof *f->slope);
  lbr_status status = f->slope ? fill_noise(f) : LBR_NO_MEMORY;
  if (status == LBR_OK)
    *out = f;
  else
    lbr_front_free(f);
  return status;
}

void lbr_front_free(lbr_front *f) {
  if (!f) return;
  free(f->slope);
  lbr_transform_put(f->transform);
  lbr_transform_drop(f->noise);
  lbr_transform_drop(f->bins);
  free(f);
}

/* Two independent normal numbers (Box & Muller 1958). */
static double complex normal_pair(lbr_draw *d) {
  double radius = sqrt(-2 * log(1 - lbr_draw_unit(d)));
  double angle = TAU * lbr_draw_unit(d);
  return CMPLX(radius * cos(angle), radius * sin(angle));
}

static double density_at(const lbr_front *f, double share) {
  double place = share * SHAPE, low = floor(place);
  size_t i = (size_t)low;
  if (i >= SHAPE) return f->density[SHAPE];
  return f->density[i] + (place - low) * (f->density[i + 1] - f->density[i]);
}

/* White noise of density S has E|X|^2 = n S rate / 2 in every bin. */
static void add_noise(lbr_front *f, uint64_t seed, uint64_t trial, double *x) {
  size_t n = f->proof->n;
  lbr_draw d = lbr_draw_start(seed ^ NOISE_KEY, trial);
  double scale = (double)n * f->proof->rate / 2;
  for (size_t k = 0; k <= n / 2; k++) {
    double power = scale * density_at(f, 2 * (double)k / (double)n);
    double complex g = normal_pair(&d);
    if (k == 0 || 2 * k == n)
      f->bins[k] = sqrt(power) * creal(g);
    else
      f->bins[k] = sqrt(power / 2) * g;
  }
  lbr_transform_back(f->transform, f->bins, f->noise);
  for (size_t i = 0; i < n; i++) x[i] += f->noise[i];
}

static void add_jitter(lbr_front *f, const lbr_particulars *p, uint64_t seed,
                       uint64_t trial, double *x) {
  const lbr_proof *proof = f->proof;
  double true_rate = proof->rate * (1 + p->timebase);
  lbr_draw d = lbr_draw_start(seed ^ JITTER_KEY, trial);
  memset(f->slope, 0, proof->n * sizeof *f->slope);
  for (size_t i = 0; i < proof->scene->n_sources; i++) {
    const lbr_actual *a = &p->actual[i];
    lbr_proof_tone tone = {.frequency = a->hz / true_rate,
                           .amplitude = TAU * a->hz * a->amplitude * a->gain,
                           .phase = a->phase + TAU / 4};
    lbr_proof_tone_add(&tone, f->slope, proof->n);
  }
  double sigma = proof->front->jitter_s;
  for (size_t i = 0; i < proof->n; i += 2) {
    double complex g = normal_pair(&d);
    x[i] += sigma * creal(g) * f->slope[i];
    if (i + 1 < proof->n) x[i + 1] += sigma * cimag(g) * f->slope[i + 1];
  }
}

static void encode(const lbr_front_end *front, double *x, size_t n) {
  if (isfinite(front->range))
    for (size_t i = 0; i < n; i++)
      x[i] = fmin(fmax(x[i], -front->range), front->range);
  if (front->step > 0)
    for (size_t i = 0; i < n; i++)
      x[i] = front->step * rint(x[i] / front->step);
}

void lbr_front_record(lbr_front *f, const lbr_particulars *p, uint64_t seed,
                      uint64_t trial, const double *clean, double *noisy) {
  const lbr_proof *proof = f->proof;
  memcpy(noisy, clean, proof->n * sizeof *clean);
  if (proof->front->jitter_s > 0) add_jitter(f, p, seed, trial, noisy);
  if (f->transform) add_noise(f, seed, trial, noisy);
  encode(proof->front, noisy, proof->n);
}
