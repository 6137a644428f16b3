#include "synth/noise.h"

#include <math.h>
#include <string.h>

#include "base/cycles.h"

#define CHUNK 2048 /* samples made at once */
#define LANES 8
#define LEAST_GRID 4096 /* points of the design grid */

typedef double vec __attribute__((vector_size(LANES * sizeof(double)),
                                  aligned(8), may_alias));

/* sum over the grid of value cos(2 pi f k), f at the midpoints. */
static double cosine_sum(const double *value, size_t grid, size_t k) {
  double sum = 0;
  for (size_t i = 0; i < grid; i++) {
    double c, s;
    size_t turns = (2 * i + 1) * k % (4 * grid);
    lbr_cos_sin_cycles((double)turns / (double)(4 * grid), &c, &s);
    sum += value[i] * c;
  }
  return sum;
}

/* The target at (i + 1/2) / (2 grid); false when it is not finite. */
static int sample_target(lbr_target target, void *context, double *value,
                         size_t grid) {
  for (size_t i = 0; i < grid; i++) {
    value[i] = target(context, ((double)i + 0.5) / (double)(2 * grid));
    if (!isfinite(value[i])) return 0;
  }
  return 1;
}

lbr_status lbr_shape_design(lbr_target target, void *context, size_t half,
                            double *tap) {
  double value[LEAST_GRID * 4];
  if (half > LBR_MOST_HALF_TAPS) return LBR_DOMAIN;
  size_t grid = 8 * half < LEAST_GRID ? LEAST_GRID : 4 * LEAST_GRID;
  if (!sample_target(target, context, value, grid)) return LBR_DOMAIN;
  for (size_t k = 0; k <= half; k++) {
    double c, s, share = (double)k / (double)(2 * half + 2);
    lbr_cos_sin_cycles(share, &c, &s);
    tap[k] = cosine_sum(value, grid, k) / (double)grid * (0.5 + 0.5 * c);
  }
  return LBR_OK;
}

double lbr_shape_response(const lbr_shape *shape, double f) {
  double sum = shape->tap[0];
  for (size_t k = 1; k <= shape->half; k++) {
    double c, s;
    lbr_cos_sin_cycles(lbr_fraction_part(f * (double)k), &c, &s);
    sum += 2 * shape->tap[k] * c;
  }
  return sum;
}

void lbr_noise_add_white(const lbr_key *key, double sigma, uint64_t first,
                         double *out, size_t n) {
  double g[CHUNK];
  if (sigma == 0) return;
  for (size_t done = 0; done < n; done += CHUNK) {
    size_t take = n - done < CHUNK ? n - done : CHUNK;
    lbr_random_gaussian(key, first + done, g, take);
    for (size_t i = 0; i < take; i++) out[done + i] += sigma * g[i];
  }
}

static inline const vec *at(const double *p) {
  return (const vec *)(const void *)p;
}

/* out[i] += sigma * sum_k tap[|k|] g[i + half + k], n a multiple of LANES.
 * Four vectors side by side hide the latency of the sums; each output is
 * summed in the same order either way. */
__attribute__((target_clones("avx512f", "avx2", "default"))) static void
convolve(const lbr_shape *shape, double sigma, const double *g, double *out,
         size_t n) {
  const double *tap = shape->tap, *centre = g + shape->half;
  size_t i = 0;
  for (; i + 4 * LANES <= n; i += 4 * LANES) {
    const vec *c = at(centre + i);
    vec a = tap[0] * c[0], b = tap[0] * c[1];
    vec d = tap[0] * c[2], e = tap[0] * c[3];
    for (size_t k = 1; k <= shape->half; k++) {
      const vec *low = at(centre + i - k), *high = at(centre + i + k);
      a += tap[k] * (low[0] + high[0]), b += tap[k] * (low[1] + high[1]);
      d += tap[k] * (low[2] + high[2]), e += tap[k] * (low[3] + high[3]);
    }
    vec *to = (vec *)(void *)(out + i);
    to[0] += sigma * a, to[1] += sigma * b;
    to[2] += sigma * d, to[3] += sigma * e;
  }
  for (; i < n; i += LANES) {
    vec sum = tap[0] * *at(centre + i);
    for (size_t k = 1; k <= shape->half; k++)
      sum += tap[k] * (*at(centre + i - k) + *at(centre + i + k));
    *(vec *)(void *)(out + i) += sigma * sum;
  }
}

void lbr_noise_add_shaped(const lbr_key *key, double sigma,
                          const lbr_shape *shape, uint64_t first, double *out,
                          size_t n) {
  double g[CHUNK + 2 * LBR_MOST_HALF_TAPS], edge[LANES] = {0};
  if (sigma == 0) return;
  for (size_t done = 0; done < n; done += CHUNK) {
    size_t take = n - done < CHUNK ? n - done : CHUNK;
    size_t whole = take / LANES * LANES, rest = take - whole;
    size_t padded = whole + (rest ? LANES : 0);
    lbr_random_gaussian(key, first + done - shape->half, g,
                        padded + 2 * shape->half);
    convolve(shape, sigma, g, out + done, whole);
    if (rest == 0) continue;
    memcpy(edge, out + done + whole, rest * sizeof *edge);
    convolve(shape, sigma, g + whole, edge, LANES);
    memcpy(out + done + whole, edge, rest * sizeof *edge);
  }
}
