/* Linear-phase filters by the window method with Kaiser's window (Kaiser,
 * Nonrecursive digital filter design using the I0-sinh window function, Proc.
 * IEEE Int. Symp. Circuits and Systems 1974; Oppenheim and Schafer,
 * Discrete-Time Signal Processing, section 7.6).  Frequencies are shares of
 * the sample rate.
 */
#ifndef LBR_FILTER_FIR_H
#define LBR_FILTER_FIR_H

#include <stddef.h>

#include "base/status.h"
#include "filter/digital.h"

#define LBR_FIR_MOST_TAPS ((size_t)1 << 22)

/* Kaiser's estimate: taps and shape parameter of his window for pass-band
 * ripple and stop-band gain of -db dB (8 or more) with a transition of `width`
 * (share of the rate, 0 < width < 0.5).  LBR_OVERFLOW above
 * LBR_FIR_MOST_TAPS. */
LBR_CHECKED lbr_status lbr_fir_kaiser(double db, double width, size_t *taps,
                                      double *beta);

/* weight[i], i < n: Kaiser's window, symmetric, 1 in the middle. */
void lbr_fir_kaiser_window(double beta, double *weight, size_t n);

/* h[i] = ideal response of the band, edges where its gain is one half, times
 * weight[i] (symmetric), scaled to gain 1 at 0 (low, stop), at half the rate
 * (high) or in the middle of the band (pass).  LBR_DOMAIN for edges that are
 * not 0 < edge[0] < edge[1] < 0.5, and for high and stop with an even n, which
 * are 0 at half the rate. */
LBR_CHECKED lbr_status lbr_fir_design(lbr_band band, const double edge[2],
                                      const double *weight, double *h,
                                      size_t n);

/* Gain of symmetric taps, with its sign, about their middle:
 * sum h[i] cos(2 pi share (i - (n - 1) / 2)). */
double lbr_fir_gain(const double *h, size_t n, double share);

#endif
