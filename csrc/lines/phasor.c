#include "lines/phasor.h"

#include <math.h>

#define BLOCK LBR_PHASOR_BLOCK
#define ROW 8   /* of the table: BLOCK is a multiple of it */
#define LANES 8 /* independent partial sums: what vector units want */
#define MOMENTS LBR_PHASOR_MOMENTS
#define LONG 3072         /* samples from which blocks are short */
#define SHORT_MOMENTS 5   /* then enough: 1e-14 of sum |y| at 1/16 bin */
#define TAU 6.283185307179586476925286766559
/* On static functions only: the linker would export the others. */
#define FAST __attribute__((target_clones("avx512f", "avx2", "default")))

double complex lbr_phasor_at(double f, double t) {
  double product = f * t;
  double rest = fma(f, t, -product);
  double turns = (product - nearbyint(product)) + rest;
  return CMPLX(cos(TAU * turns), -sin(TAU * turns));
}

/* Complex product without the library's care for infinities. */
static inline double complex times(double complex a, double complex b) {
  return CMPLX(creal(a) * creal(b) - cimag(a) * cimag(b),
               creal(a) * cimag(b) + cimag(a) * creal(b));
}

void lbr_phasor_table(double f, double c[BLOCK], double s[BLOCK]) {
  double complex near[ROW];
  for (size_t k = 0; k < ROW; k++) near[k] = lbr_phasor_at(f, (double)k);
  for (size_t row = 0; row < BLOCK; row += ROW) {
    double complex far = lbr_phasor_at(f, (double)row);
    for (size_t k = 0; k < ROW; k++) {
      double complex z = times(far, near[k]);
      c[row + k] = creal(z);
      s[row + k] = cimag(z);
    }
  }
}

void lbr_phasor_walk_start(lbr_phasor_walk *walk, double f, double start) {
  walk->f = f;
  walk->start = start;
  walk->block = 0;
  for (size_t k = 0; k < LBR_PHASOR_GROUP; k++)
    walk->step[k] = lbr_phasor_at(f, (double)(k * BLOCK));
}

double complex lbr_phasor_walk_next(lbr_phasor_walk *walk) {
  size_t in_group = walk->block % LBR_PHASOR_GROUP;
  if (in_group == 0)
    walk->base = lbr_phasor_at(
        walk->f, walk->start + (double)(walk->block * BLOCK));
  walk->block++;
  return times(walk->base, walk->step[in_group]);
}

/* A full block against the table: sum y c and sum y s. */
static inline double complex block_sum(const double *restrict y,
                                       const double *restrict c,
                                       const double *restrict s) {
  double a[LANES] = {0}, b[LANES] = {0};
  for (size_t k = 0; k < BLOCK; k += LANES)
    for (size_t l = 0; l < LANES; l++) {
      a[l] += y[k + l] * c[k + l];
      b[l] += y[k + l] * s[k + l];
    }
  double re = ((a[0] + a[4]) + (a[2] + a[6])) + ((a[1] + a[5]) + (a[3] + a[7]));
  double im = ((b[0] + b[4]) + (b[2] + b[6])) + ((b[1] + b[5]) + (b[3] + b[7]));
  return CMPLX(re, im);
}

static double complex tail_sum(const double *y, size_t n, const double *c,
                               const double *s) {
  double re = 0, im = 0;
  for (size_t k = 0; k < n; k++) {
    re += y[k] * c[k];
    im += y[k] * s[k];
  }
  return CMPLX(re, im);
}

FAST static double complex sum_at(const double *y, size_t n, double f) {
  double c[BLOCK], s[BLOCK];
  double middle = 0.5 * ((double)n - 1);
  double complex sum = 0;
  lbr_phasor_walk walk;
  size_t at = 0;
  lbr_phasor_table(f, c, s);
  lbr_phasor_walk_start(&walk, f, -middle);
  for (; at + BLOCK <= n; at += BLOCK)
    sum += times(block_sum(y + at, c, s), lbr_phasor_walk_next(&walk));
  if (at < n)
    sum += times(tail_sum(y + at, n - at, c, s), lbr_phasor_walk_next(&walk));
  return sum;
}

double complex lbr_phasor_sum(const double *y, size_t n, double f) {
  return sum_at(y, n, f);
}

static inline double fold_lanes(const double *a) {
  return ((a[0] + a[4]) + (a[2] + a[6])) + ((a[1] + a[5]) + (a[3] + a[7]));
}

/* re[p] = sum a u^p, im[p] = sum b u^p over a block, p < count; a and b are
 * used up. */
static inline void block_moments(double *restrict a, double *restrict b,
                                 const double *restrict u, size_t count,
                                 double *restrict re, double *restrict im) {
  for (size_t p = 0; p < count; p++) {
    double ra[LANES] = {0}, ia[LANES] = {0};
    for (size_t k = 0; k < BLOCK; k += LANES)
      for (size_t l = 0; l < LANES; l++) {
        ra[l] += a[k + l];
        ia[l] += b[k + l];
        a[k + l] *= u[k + l];
        b[k + l] *= u[k + l];
      }
    re[p] = fold_lanes(ra);
    im[p] = fold_lanes(ia);
  }
}

/* m[p] += anchor sum_q binomial(p, q) centre^(p-q) (re[q] + i im[q]): from
 * moments about the middle of a block to those about the record's centre. */
static inline void add_moments(double complex *m, double complex anchor,
                               double centre, size_t count, const double *re,
                               const double *im) {
  double row[MOMENTS] = {1}; /* binomial(p, q) centre^(p-q) */
  for (size_t p = 0; p < MOMENTS; p++) {
    double a = 0, b = 0;
    size_t last = p < count ? p + 1 : count;
    for (size_t q = 0; q < last; q++) {
      a += row[q] * re[q];
      b += row[q] * im[q];
    }
    m[p] += times(CMPLX(a, b), anchor);
    for (size_t q = count; q-- > 0;)
      row[q] = row[q] * centre + (q ? row[q - 1] : 0);
  }
}

/* Inside a block, powers of the distance from its middle beyond `count` do
 * not matter when blocks are short against the record: the first one left out
 * of X(f + v / N) is below (pi |v| BLOCK / N)^count / count! of sum |y|. */
FAST static void moments_at(const double *y, size_t n, double f,
                            double complex *m) {
  double c[BLOCK], s[BLOCK], a[BLOCK], b[BLOCK], u[BLOCK];
  double re[MOMENTS], im[MOMENTS];
  double middle = 0.5 * ((double)n - 1), scale = 1.0 / (double)n;
  double half = 0.5 * (BLOCK - 1);
  size_t count = n >= LONG ? SHORT_MOMENTS : MOMENTS;
  lbr_phasor_walk walk;
  lbr_phasor_table(f, c, s);
  lbr_phasor_walk_start(&walk, f, -middle);
  for (size_t k = 0; k < BLOCK; k++) u[k] = ((double)k - half) * scale;
  for (size_t p = 0; p < MOMENTS; p++) m[p] = 0;
  for (size_t at = 0; at < n; at += BLOCK) {
    size_t present = n - at < BLOCK ? n - at : BLOCK;
    for (size_t k = 0; k < BLOCK; k++) {
      double value = k < present ? y[at + k] : 0;
      a[k] = value * c[k];
      b[k] = value * s[k];
    }
    block_moments(a, b, u, count, re, im);
    add_moments(m, lbr_phasor_walk_next(&walk),
                ((double)at - middle + half) * scale, count, re, im);
  }
}

void lbr_phasor_moments(const double *y, size_t n, double f,
                        double complex m[LBR_PHASOR_MOMENTS]) {
  moments_at(y, n, f, m);
}

/* The block sums of coarse powers, phases of the middle of each block. */
FAST static void sum_blocks(const double *y, size_t n, double f,
                            double complex *sums) {
  double c[BLOCK], s[BLOCK];
  lbr_phasor_walk walk;
  size_t at = 0;
  lbr_phasor_table(f, c, s);
  lbr_phasor_walk_start(&walk, f, -0.5 * ((double)n - 1));
  for (; at + BLOCK <= n; at += BLOCK)
    *sums++ = times(block_sum(y + at, c, s), lbr_phasor_walk_next(&walk));
  if (at < n)
    *sums = times(tail_sum(y + at, n - at, c, s), lbr_phasor_walk_next(&walk));
}

void lbr_phasor_blocks(const double *y, size_t n, double f,
                       double complex *sums) {
  sum_blocks(y, n, f, sums);
}

double lbr_phasor_coarse(const double complex *sums, size_t n, double shift) {
  size_t blocks = (n + BLOCK - 1) / BLOCK;
  double complex turn = lbr_phasor_at(shift, BLOCK), z = 1, total = 0;
  for (size_t b = 0; b < blocks; b++) {
    total += times(sums[b], z);
    z = times(z, turn);
  }
  return creal(total) * creal(total) + cimag(total) * cimag(total);
}

void lbr_phasor_expand(const double complex m[LBR_PHASOR_MOMENTS], double v,
                       double complex *x, double complex *slope,
                       double complex *curve) {
  const double complex step = CMPLX(0, -TAU);
  double complex power = 1; /* (-2 pi i v)^p / p! */
  double complex x0 = 0, x1 = 0, x2 = 0;
  for (size_t p = 0; p < LBR_PHASOR_MOMENTS; p++) {
    x0 += times(m[p], power);
    if (p + 1 < LBR_PHASOR_MOMENTS) x1 += times(m[p + 1], power);
    if (p + 2 < LBR_PHASOR_MOMENTS) x2 += times(m[p + 2], power);
    power = times(power, step * (v / (double)(p + 1)));
  }
  *x = x0;
  *slope = times(x1, step);
  *curve = times(x2, times(step, step));
}
