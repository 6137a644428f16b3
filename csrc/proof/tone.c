#include "proof/tone.h"

#include <math.h>

#include "lines/phasor.h"

#define BLOCK LBR_PHASOR_BLOCK
#define TAU 6.283185307179586476925286766559
#define FAST __attribute__((target_clones("avx512f", "avx2", "default")))

/* y[k] += a c[k] - b s[k] */
FAST static void add_block(double *restrict y, const double *restrict c,
                           const double *restrict s, double a, double b,
                           size_t count) {
  if (count == BLOCK) {
    for (size_t k = 0; k < BLOCK; k++) y[k] += a * c[k] - b * s[k];
  } else {
    for (size_t k = 0; k < count; k++) y[k] += a * c[k] - b * s[k];
  }
}

static void add_steady(const lbr_proof_tone *tone, double *x, size_t n) {
  double c[BLOCK], s[BLOCK];
  double middle = 0.5 * ((double)n - 1);
  double re = tone->amplitude * cos(tone->phase);
  double im = tone->amplitude * sin(tone->phase);
  lbr_phasor_walk walk;
  lbr_phasor_table(-tone->frequency, c, s);
  lbr_phasor_walk_start(&walk, -tone->frequency, -middle);
  for (size_t at = 0; at < n; at += BLOCK) {
    double complex z = lbr_phasor_walk_next(&walk);
    double a = re * creal(z) - im * cimag(z);
    double b = re * cimag(z) + im * creal(z);
    add_block(x + at, c, s, a, b, n - at < BLOCK ? n - at : BLOCK);
  }
}

/* cos(2 pi r) for any r: the Taylor series in a quarter turn, where its next
 * term is below 3e-17. */
static inline double cos_turns(double r) {
  double half = rint(2 * r);
  double odd = half - 2 * floor(0.5 * half);
  double q = TAU * (r - 0.5 * half), z = q * q;
  double p = 1 + z * (-1.0 / 2 + z * (1.0 / 24 + z * (-1.0 / 720 +
      z * (1.0 / 40320 + z * (-1.0 / 3628800 + z * (1.0 / 479001600 +
      z * (-1.0 / 87178291200 + z * (1.0 / 20922789888000 +
      z * (-1.0 / 6402373705728000 + z * (1.0 / 2432902008176640000
      ))))))))));
  return (1 - 2 * odd) * p;
}

/* y[k] += amplitude cos(2 pi (start + turns[k] + swing[k])) */
FAST static void add_swinging(double *restrict y,
                              const double *restrict turns,
                              const double *restrict swing, double start,
                              double amplitude) {
  for (size_t k = 0; k < BLOCK; k++)
    y[k] += amplitude * cos_turns(start + turns[k] + swing[k]);
}

/* f t in turns, reduced exactly. */
static double turns_of(double f, double t) {
  double product = f * t, rest = fma(f, t, -product);
  return (product - nearbyint(product)) + rest;
}

static void add_wandering(const lbr_proof_tone *tone, double *x, size_t n) {
  double turns[BLOCK], c[BLOCK], s[BLOCK], swing[BLOCK], y[BLOCK];
  double middle = 0.5 * ((double)n - 1), slow = 1 / (double)n;
  double re = -tone->index / TAU * cos(tone->wander_phase);
  double im = -tone->index / TAU * sin(tone->wander_phase);
  lbr_phasor_walk walk;
  lbr_phasor_table(-slow, c, s);
  lbr_phasor_walk_start(&walk, -slow, -middle);
  for (size_t k = 0; k < BLOCK; k++)
    turns[k] = turns_of(tone->frequency, (double)k);
  for (size_t at = 0; at < n; at += BLOCK) {
    size_t count = n - at < BLOCK ? n - at : BLOCK;
    double t = (double)at - middle;
    double complex z = lbr_phasor_walk_next(&walk);
    double start = turns_of(tone->frequency, t) + tone->phase / TAU;
    for (size_t k = 0; k < BLOCK; k++) y[k] = swing[k] = 0;
    add_block(swing, c, s, re * creal(z) - im * cimag(z),
              re * cimag(z) + im * creal(z), BLOCK);
    add_swinging(y, turns, swing, start, tone->amplitude);
    for (size_t k = 0; k < count; k++) x[at + k] += y[k];
  }
}

void lbr_proof_tone_add(const lbr_proof_tone *tone, double *x, size_t n) {
  if (tone->index > 0)
    add_wandering(tone, x, n);
  else
    add_steady(tone, x, n);
}
