#include "spectrum/thin.h"

#include <math.h>
#include <stdlib.h>

#include "base/checked.h"
#include "spectrum/phase.h"

#define CLONES __attribute__((target_clones("avx512f", "avx2", "default")))
#define LANES 8
#define TOLERANCE 1e-15
#define PI 3.14159265358979323846

void lbr_thin_free(lbr_thin *t) {
  free(t->re);
  free(t->im);
  t->re = t->im = NULL;
}

/* Running means until the nearest that folds in, 1 / by off by `half`, is
 * small enough: each takes it down by half by / (1 - half by). */
static size_t times_for(double half_by) {
  double ratio = half_by / (1 - half_by);
  double times = ratio > 0 ? ceil(log(TOLERANCE) / log(ratio)) : 1;
  return times < 1 ? 1 : (size_t)times;
}

/* re = the running mean of `by` over re[0 .. filled - 1]. */
static void average_over(double *re, size_t filled, size_t by) {
  for (size_t i = filled + by - 1; i-- > 0;) {
    double sum = 0;
    size_t first = i + 1 > by ? i + 1 - by : 0;
    for (size_t j = first; j <= i && j < filled; j++) sum += re[j];
    re[i] = sum / (double)by;
  }
}

lbr_status lbr_thin_make(lbr_thin *t, size_t by, double half, double shift) {
  t->by = by;
  t->times = times_for(half * (double)by);
  t->taps = t->times * (by - 1) + 1;
  t->shift = shift;
  t->re = lbr_alloc(t->taps, sizeof *t->re);
  t->im = shift != 0 ? lbr_alloc(t->taps, sizeof *t->im) : NULL;
  if (!t->re || (shift != 0 && !t->im)) return LBR_NO_MEMORY;
  t->re[0] = 1;
  for (size_t r = 0; r < t->times; r++)
    average_over(t->re, r * (by - 1) + 1, by);
  /* h is even: tap i in the order of samples is h[taps - 1 - i] = h[i] */
  for (size_t i = 0; t->im && i < t->taps; i++) {
    double back = (double)(t->taps - 1 - i);
    double complex w = conj(lbr_phase_product(shift, back));
    t->im[i] = t->re[i] * cimag(w);
    t->re[i] *= creal(w);
  }
  return LBR_OK;
}

size_t lbr_thin_count(const lbr_thin *t, size_t n) {
  return (n + t->taps - 2) / t->by + 1;
}

/* Eight doubles that go together, on processors of any width; at any address
 * where a double may stand. */
typedef double lanes
    __attribute__((vector_size(LANES * sizeof(double)), aligned(8), may_alias));

static inline double sum_of(const double *p) {
  return ((p[0] + p[4]) + (p[2] + p[6])) + ((p[1] + p[5]) + (p[3] + p[7]));
}

/* Both sums of n products. */
CLONES static void dot_both(const double *restrict x, const double *restrict a,
                            const double *restrict b, size_t n,
                            double *restrict out) {
  lanes p = {0}, q = {0}, p2 = {0}, q2 = {0};
  size_t i = 0;
  for (; i + 2 * LANES <= n; i += 2 * LANES) {
    lanes v = *(const lanes *)(x + i), v2 = *(const lanes *)(x + i + LANES);
    p += v * *(const lanes *)(a + i);
    q += v * *(const lanes *)(b + i);
    p2 += v2 * *(const lanes *)(a + i + LANES);
    q2 += v2 * *(const lanes *)(b + i + LANES);
  }
  p += p2;
  q += q2;
  double re = sum_of((const double *)&p), im = sum_of((const double *)&q);
  for (; i < n; i++) {
    re += x[i] * a[i];
    im += x[i] * b[i];
  }
  out[0] = re;
  out[1] = im;
}

CLONES static double dot_one(const double *restrict x,
                             const double *restrict a, size_t n) {
  lanes p = {0};
  size_t i = 0;
  for (; i + LANES <= n; i += LANES)
    p += *(const lanes *)(x + i) * *(const lanes *)(a + i);
  double sum = sum_of((const double *)&p);
  for (; i < n; i++) sum += x[i] * a[i];
  return sum;
}

/* The samples that output m sees: x[first .. first + count - 1] under taps
 * from `tap` on. */
static size_t reach(const lbr_thin *t, size_t n, size_t m, size_t *first,
                    size_t *tap) {
  size_t q = m * t->by, last = q < n ? q : n - 1;
  *first = q + 1 > t->taps ? q + 1 - t->taps : 0;
  *tap = *first + t->taps - 1 - q;
  return last + 1 > *first ? last + 1 - *first : 0;
}

void lbr_thin_real(const lbr_thin *t, const double *x, size_t n, size_t from,
                   size_t count, double *re, double *im) {
  for (size_t i = 0; i < count; i++) {
    size_t first, tap, seen = reach(t, n, from + i, &first, &tap);
    double both[2] = {0, 0};
    if (t->im)
      dot_both(x + first, t->re + tap, t->im + tap, seen, both);
    else
      both[0] = dot_one(x + first, t->re + tap, seen);
    re[i] = both[0];
    im[i] = both[1];
  }
}

void lbr_thin_part(const lbr_thin *t, const double *x, size_t n, size_t from,
                   size_t count, double *out) {
  for (size_t i = 0; i < count; i++) {
    size_t first, tap, seen = reach(t, n, from + i, &first, &tap);
    out[i] = dot_one(x + first, t->re + tap, seen);
  }
}

double complex lbr_thin_response(const lbr_thin *t, double nu) {
  double by = (double)t->by, r = (double)t->times;
  double mean = nu == 0 ? 1 : sin(PI * nu * by) / (by * sin(PI * nu));
  double complex turn = lbr_phase_product(nu / 2, (by - 1) * r);
  double size = pow(mean, r);
  return CMPLX(size * creal(turn), size * cimag(turn));
}
