/* Sums of tones at any sample number.
 *
 *   x[n] = sum over tones of  amplitude cos(2 pi (cycles n + ramp n^2 / 2)
 *                                           + phase)
 *
 * with |error| <= 1e-12 of the sum of amplitudes for n < 2^40: phases are
 * reduced modulo one cycle in 128-bit fixed point.  Samples are computed in
 * blocks that start at multiples of LBR_TONE_BLOCK, so that x[n] has the same
 * bits whatever is asked for around it.
 */
#ifndef LBR_SYNTH_TONES_H
#define LBR_SYNTH_TONES_H

#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

#define LBR_TONE_BLOCK 256
#define LBR_MOST_TONES 65536

typedef struct lbr_tone {
  double amplitude; /* peak, any unit, finite */
  double cycles;    /* frequency at sample 0, cycles per sample, any finite
                       value (above 1/2: folds, as sampling does) */
  double phase;     /* at sample 0, rad, |phase| < 1e9 */
  double ramp;      /* change of frequency, cycles per sample^2; 0: steady */
  double swing;     /* slow frequency modulation, peak, cycles per sample:
                       frequency += swing sin(2 pi beat n + swing_phase),
                       without moving the phase at sample 0; 0: steady */
  double beat;      /* frequency of the swing, cycles per sample, not 0 when
                       swing is not 0 */
  double swing_phase; /* of the swing at sample 0, rad */
} lbr_tone;

/* Tones made ready; built once for a largest number of tones, then set as
 * often as wanted without allocating. */
typedef struct lbr_bank lbr_bank;

LBR_CHECKED lbr_status lbr_bank_make(size_t most_tones, lbr_bank **bank);
void lbr_bank_free(lbr_bank *bank); /* NULL is fine */

/* Makes the bank hold n tones; LBR_DOMAIN for a field out of range or
 * n > most_tones. */
LBR_CHECKED lbr_status lbr_bank_set(lbr_bank *bank, const lbr_tone *tones,
                                    size_t n);

/* out[i] += sample first + i.  The bank is only read. */
void lbr_bank_add(const lbr_bank *bank, uint64_t first, double *out, size_t n);

/* out[i] += k-th derivative of x by n at sample first + i, k = 0, 1, 2;
 * steady tones only (others are left out). */
void lbr_bank_add_derivative(const lbr_bank *bank, int k, uint64_t first,
                             double *out, size_t n);

/* out[i] += x at first + i + shift[i], |shift[i]| <= 2^20, each tone of the
 * choice evaluated at its own instant (slower: one sine per tone and sample).
 * moving_only: only tones that ramp or swing. */
void lbr_bank_add_shifted(const lbr_bank *bank, uint64_t first,
                          const double *shift, double *out, size_t n,
                          int moving_only);

#endif
