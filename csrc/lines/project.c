#include "lines/project.h"

#include <math.h>

#include "base/cycles.h"
#include "lines/phasor.h"

#define BLOCK LBR_PHASOR_BLOCK
#define LANES 8
#define RUN 4          /* blocks against one loading of the table */
#define TILE (RUN * BLOCK)
#define PAIR 2         /* the same where sums with the place are wanted, too */
#define TAU 6.283185307179586476925286766559
#define FAST __attribute__((target_clones("avx512f", "avx2", "default")))

typedef double lanes __attribute__((vector_size(LANES * sizeof(double))));
typedef double loose __attribute__((vector_size(LANES * sizeof(double)),
                                    aligned(sizeof(double)), may_alias));

static inline double complex times(double complex a, double complex b) {
  return CMPLX(creal(a) * creal(b) - cimag(a) * cimag(b),
               creal(a) * cimag(b) + cimag(a) * creal(b));
}

#define CHUNK 64 /* anchors made at a time; a multiple of RUN */

FAST static void phases(double f, double start, double step, size_t count,
                        double *restrict re, double *restrict im) {
  for (size_t k = 0; k < count; k++) {
    double t = start + (double)(int)k * step, product = f * t, c, s;
    double rest = fma(f, t, -product);
    lbr_cos_sin_cycles(lbr_fraction_part(product) + rest, &c, &s);
    re[k] = c;
    im[k] = -s;
  }
}

void lbr_phases(double f, double start, double step, size_t count, double *re,
                double *im) {
  phases(f, start, step, count, re, im);
}

/* RUN blocks against one table; the partial sums of a block are turned by its
 * anchor before they are folded. */
static inline __attribute__((always_inline)) void run_of_blocks(
    const double *restrict y, const double *restrict c,
    const double *restrict s, const double *restrict zr,
    const double *restrict zi, lanes *re, lanes *im) {
  lanes a[RUN], b[RUN];
  for (size_t r = 0; r < RUN; r++) a[r] = b[r] = (lanes){0};
  for (size_t k = 0; k < BLOCK; k += LANES) {
    lanes cs = *(const loose *)(c + k), sn = *(const loose *)(s + k);
    for (size_t r = 0; r < RUN; r++) {
      lanes v = *(const loose *)(y + r * BLOCK + k);
      a[r] += v * cs;
      b[r] += v * sn;
    }
  }
  for (size_t r = 0; r < RUN; r++) {
    *re += a[r] * zr[r] - b[r] * zi[r];
    *im += a[r] * zi[r] + b[r] * zr[r];
  }
}

/* The samples past the last whole tile, n - at of them. */
static double complex project_tail(const double *x, size_t n, size_t at,
                                   double f, double start) {
  double complex sum = 0;
  for (; at < n; at++) {
    double complex z = lbr_phasor_at(f, start + (double)at);
    sum += CMPLX(x[at] * creal(z), x[at] * cimag(z));
  }
  return sum;
}

FAST static double complex project_one(const double *x, size_t n, double f) {
  double c[BLOCK], s[BLOCK], zr[CHUNK], zi[CHUNK];
  double start = -0.5 * ((double)n - 1);
  lanes re = {0}, im = {0};
  size_t at = 0, next = CHUNK;
  phases(f, 0, 1, BLOCK, c, s);
  for (; at + TILE <= n; at += TILE, next += RUN) {
    if (next == CHUNK) {
      size_t left = (n - at) / TILE * RUN;
      phases(f, start + (double)at, BLOCK, left < CHUNK ? left : CHUNK, zr, zi);
      next = 0;
    }
    run_of_blocks(x + at, c, s, zr + next, zi + next, &re, &im);
  }
  double complex sum = project_tail(x, n, at, f, start);
  for (size_t l = 0; l < LANES; l++) sum += CMPLX(re[l], im[l]);
  return sum;
}

/* Sums that lanes carry: of y exp and of y t exp. */
typedef struct carried {
  lanes re, im, slope_re, slope_im;
} carried;

/* PAIR blocks against the table and the table times place in the block. */
static inline __attribute__((always_inline)) void pair_of_blocks(
    const double *restrict y, const double *restrict c,
    const double *restrict s, const double *restrict zr,
    const double *restrict zi, double middle, carried *out) {
  lanes a[PAIR], b[PAIR], d[PAIR], e[PAIR];
  for (size_t r = 0; r < PAIR; r++) a[r] = b[r] = d[r] = e[r] = (lanes){0};
  for (size_t k = 0; k < BLOCK; k += LANES) {
    lanes cs = *(const loose *)(c + k), sn = *(const loose *)(s + k);
    lanes kc = *(const loose *)(c + BLOCK + k);
    lanes ks = *(const loose *)(s + BLOCK + k);
    for (size_t r = 0; r < PAIR; r++) {
      lanes v = *(const loose *)(y + r * BLOCK + k);
      a[r] += v * cs;
      b[r] += v * sn;
      d[r] += v * kc;
      e[r] += v * ks;
    }
  }
  for (size_t r = 0; r < PAIR; r++) {
    double t = middle + (double)(int)(r * BLOCK);
    lanes re = a[r] * zr[r] - b[r] * zi[r], im = a[r] * zi[r] + b[r] * zr[r];
    out->re += re;
    out->im += im;
    out->slope_re += d[r] * zr[r] - e[r] * zi[r] + t * re;
    out->slope_im += d[r] * zi[r] + e[r] * zr[r] + t * im;
  }
}

FAST static void project_slope(const double *x, size_t n, double f,
                               double complex *sum, double complex *slope) {
  double c[2 * BLOCK], s[2 * BLOCK], zr[CHUNK], zi[CHUNK];
  double start = -0.5 * ((double)n - 1), half = 0.5 * (BLOCK - 1);
  carried all = {{0}, {0}, {0}, {0}};
  size_t at = 0, next = CHUNK;
  phases(f, 0, 1, BLOCK, c, s);
  for (size_t k = 0; k < BLOCK; k++) {
    c[BLOCK + k] = ((double)(int)k - half) * c[k];
    s[BLOCK + k] = ((double)(int)k - half) * s[k];
  }
  for (; at + PAIR * BLOCK <= n; at += PAIR * BLOCK, next += PAIR) {
    if (next == CHUNK) {
      size_t left = (n - at) / (PAIR * BLOCK) * PAIR;
      phases(f, start + (double)at, BLOCK, left < CHUNK ? left : CHUNK, zr, zi);
      next = 0;
    }
    pair_of_blocks(x + at, c, s, zr + next, zi + next,
                   start + (double)at + half, &all);
  }
  double complex total = 0, tilt = 0;
  for (; at < n; at++) {
    double t = start + (double)at;
    double complex z = lbr_phasor_at(f, t);
    total += CMPLX(x[at] * creal(z), x[at] * cimag(z));
    tilt += CMPLX(t * x[at] * creal(z), t * x[at] * cimag(z));
  }
  for (size_t l = 0; l < LANES; l++) {
    total += CMPLX(all.re[l], all.im[l]);
    tilt += CMPLX(all.slope_re[l], all.slope_im[l]);
  }
  *sum = total;
  *slope = times(tilt, CMPLX(0, -TAU / (double)n));
}

void lbr_project_slope(const double *x, size_t n, double f,
                       double complex *sum, double complex *slope) {
  project_slope(x, n, f, sum, slope);
}

FAST static void totals(const double *x, size_t n, double *sum,
                        double *energy) {
  double a[LANES] = {0}, b[LANES] = {0}, plain = 0, square = 0;
  size_t i = 0;
  for (; i + LANES <= n; i += LANES)
    for (size_t l = 0; l < LANES; l++) {
      a[l] += x[i + l];
      b[l] += x[i + l] * x[i + l];
    }
  for (; i < n; i++) {
    plain += x[i];
    square += x[i] * x[i];
  }
  for (size_t l = 0; l < LANES; l++) {
    plain += a[l];
    square += b[l];
  }
  *sum = plain;
  *energy = square;
}

void lbr_project(const double *x, size_t n, const double *f, size_t count,
                 double complex *sums, double *sum, double *energy) {
  totals(x, n, sum, energy);
  for (size_t i = 0; i < count; i++) sums[i] = project_one(x, n, f[i]);
}

FAST static void take_away(double *x, size_t n, double f, double a, double b) {
  double c[BLOCK], s[BLOCK];
  lbr_phasor_walk walk;
  lbr_phasor_table(f, c, s);
  lbr_phasor_walk_start(&walk, f, -0.5 * ((double)n - 1));
  for (size_t at = 0; at < n; at += BLOCK) {
    size_t present = n - at < BLOCK ? n - at : BLOCK;
    double complex z = lbr_phasor_walk_next(&walk); /* cos - i sin */
    double p = a * creal(z) - b * cimag(z), q = a * cimag(z) + b * creal(z);
    for (size_t k = 0; k < present; k++) x[at + k] -= p * c[k] - q * s[k];
  }
}

void lbr_take_away(double *x, size_t n, double f, double a, double b) {
  take_away(x, n, f, a, b);
}

double lbr_energy(const double *x, size_t n) {
  double sum, energy;
  totals(x, n, &sum, &energy);
  return energy;
}
