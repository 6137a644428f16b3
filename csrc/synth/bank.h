/* What tones.c and moving.c share: a bank of tones made ready.
 *
 * Steady tones, block of LBR_TONE_BLOCK samples with centre c (between two
 * samples), distance k = 1/2, 3/2, ...:
 *   x[c + k] = E - O,  x[c - k] = E + O,
 *   E = sum A cos(phase at c) cos(2 pi f k),  O = the same with sines,
 * so that a table over (tone, k) serves all blocks and only the phases at the
 * centres change.
 */
#ifndef LBR_SYNTH_BANK_H
#define LBR_SYNTH_BANK_H

#include "synth/phase.h"
#include "synth/tones.h"

#define LBR_TILE 8                                 /* distances side by side */
#define LBR_TILES (LBR_TONE_BLOCK / 2 / LBR_TILE)  /* tiles in half a block */

typedef struct lbr_ready {
  lbr_tone tone;
  lbr_turn step;  /* frequency / 2: phase per half sample */
  lbr_turn start; /* phase at sample 0 */
  lbr_turn bend;  /* ramp / 2 */
  lbr_turn beat, beat_start; /* of the swing */
  double depth;   /* of the swing's phase modulation, cycles */
} lbr_ready;

struct lbr_bank {
  size_t most, steady, count; /* tones: room, steady ones (first), all */
  lbr_ready *ready;           /* most */
  double *table; /* [tile][steady tone][8 cosines, 8 sines], 64-byte aligned */
  void *memory;  /* what table lies in */
};

/* out[i] += tone at first + i + shift[i] (shift NULL: 0). */
void lbr_ready_add(const lbr_ready *ready, uint64_t first, const double *shift,
                   double *out, size_t n);

#endif
