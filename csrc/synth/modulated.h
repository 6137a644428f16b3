/* A carrier whose amplitude and phase are modulated by tones.
 *
 *   x[n] = amplitude (1 + sum a cos(2 pi cycles n + phase))
 *          cos(2 pi cycles n + phase + sum b sin(2 pi cycles n + phase))
 *
 * Phases of the carrier and of the modulators are exact at any sample number.
 */
#ifndef LBR_SYNTH_MODULATED_H
#define LBR_SYNTH_MODULATED_H

#include "synth/spread.h"

#define LBR_MOST_SWAYS 256

typedef struct lbr_sway {
  double depth;  /* amplitude modulation: relative; phase modulation: rad */
  double cycles; /* frequency, cycles per sample */
  double phase;  /* at sample 0, rad, |phase| < 1e9 */
} lbr_sway;

typedef struct lbr_modulated {
  double amplitude; /* peak of the carrier alone, any unit */
  double cycles;    /* frequency of the carrier, cycles per sample */
  double phase;     /* of the carrier at sample 0, rad, |phase| < 1e9 */
  const lbr_sway *am, *pm; /* n_am and n_pm modulators, each at most
                              LBR_MOST_SWAYS */
  size_t n_am, n_pm;
} lbr_modulated;

/* LBR_DOMAIN where a field is out of range. */
LBR_CHECKED lbr_status lbr_modulated_check(const lbr_modulated *m);

/* An lbr_adder; `modulated` points to a checked lbr_modulated. */
void lbr_modulated_add(const void *modulated, int64_t first, double *out,
                       size_t n);

#endif
