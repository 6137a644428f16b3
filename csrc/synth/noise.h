/* White and coloured Gaussian noise from keyed streams.
 *
 * White noise of one-sided density d (unit/sqrt(Hz)) at a rate has standard
 * deviation d sqrt(rate / 2).  Coloured noise is white noise through a
 * symmetric FIR filter by direct convolution, so that sample n depends only
 * on the key, n and the taps.
 */
#ifndef LBR_SYNTH_NOISE_H
#define LBR_SYNTH_NOISE_H

#include <stddef.h>
#include <stdint.h>

#include "base/random.h"
#include "base/status.h"

#define LBR_MOST_HALF_TAPS 2048

/* A symmetric filter of 2 half + 1 taps; tap[0] is the centre. */
typedef struct lbr_shape {
  size_t half;
  const double *tap; /* half + 1 values */
} lbr_shape;

/* Amplitude response wanted at frequency f (cycles per sample, 0 .. 0.5). */
typedef double (*lbr_target)(void *context, double f);

/* Taps of the symmetric filter with the given response: cosine-series
 * coefficients of the target on a dense grid, tapered (Hann) over the
 * half-length; tap[0 .. half] out.  The deviation follows from the taps: see
 * lbr_shape_response. */
LBR_CHECKED lbr_status lbr_shape_design(lbr_target target, void *context,
                                        size_t half, double *tap);

/* The response that the taps really have at f cycles per sample. */
double lbr_shape_response(const lbr_shape *shape, double f);

/* out[i] += sigma * Gaussian value first + i of the stream. */
void lbr_noise_add_white(const lbr_key *key, double sigma, uint64_t first,
                         double *out, size_t n);

/* out[i] += sigma * sum_k tap[|k|] Gaussian(first + i + k), |k| <= half <=
 * LBR_MOST_HALF_TAPS. */
void lbr_noise_add_shaped(const lbr_key *key, double sigma,
                          const lbr_shape *shape, uint64_t first, double *out,
                          size_t n);

#endif
