/* A tone added to a record, exact to rounding at any length, fast.
 *
 *   x[n] += amplitude cos(2 pi frequency t + phase
 *                         - index cos(2 pi t / N + wander_phase))
 *
 * with t = n - (N - 1) / 2.  The last term is the phase of a frequency that
 * swings once per record by frequency * wander / 2 either way, for
 * index = cycles per record * wander / 2.
 */
#ifndef LBR_PROOF_TONE_H
#define LBR_PROOF_TONE_H

#include <stddef.h>

typedef struct lbr_proof_tone {
  double frequency;    /* cycles per sample */
  double amplitude;    /* peak */
  double phase;        /* rad, at the centre */
  double index;        /* rad, modulation index; 0: a steady tone */
  double wander_phase; /* rad, at the centre */
} lbr_proof_tone;

void lbr_proof_tone_add(const lbr_proof_tone *tone, double *x, size_t n);

#endif
