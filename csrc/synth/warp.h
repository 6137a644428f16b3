/* A record sampled at other instants than it says: delays, wrong clocks,
 * jitter, drifting speed.
 *
 *   out[i] = x at  t = i + shift + stretch i + bend i^2 / 2 + sigma g[i]
 *
 * by band-limited interpolation: a sinc over LBR_WARP_HALF samples on each
 * side under a four-term cosine-sum window (F. J. Harris, "On the use of
 * windows for harmonic analysis with the discrete Fourier transform", Proc.
 * IEEE 66(1), 1978: the 92 dB Blackman-Harris coefficients).  Below 0.4 of
 * the rate the error stays under 1e-4 of a tone's amplitude; whole instants
 * give the sample itself.  Beyond its ends the record is continued by odd
 * reflection.
 */
#ifndef LBR_SYNTH_WARP_H
#define LBR_SYNTH_WARP_H

#include <stddef.h>
#include <stdint.h>

#include "base/random.h"

#define LBR_WARP_HALF 32

typedef struct lbr_warp {
  double shift;    /* samples; positive: later in the record */
  double stretch;  /* relative; 1e-6: instants drift one sample in 10^6 */
  double bend;     /* change of stretch per sample */
  double sigma;    /* standard deviation of the jitter, samples */
  uint64_t period; /* samples that share one displacement; 1: each its own */
  lbr_key key;     /* of the jitter: g[i] is Gaussian number i / period */
} lbr_warp;

/* Samples that can be had before t leaves the record for good, at most n. */
size_t lbr_warp_count(const lbr_warp *warp, size_t n);

/* x: n > 0 samples; out: count samples, another block. */
void lbr_warp_run(const lbr_warp *warp, const double *x, size_t n, double *out,
                  size_t count);

#endif
