/* Frequency weightings A, C and Z of IEC 61672-1:2013 (formulas of clause
 * 5.5.7 and Annex E).
 */
#ifndef LBR_SPECTRUM_WEIGHTING_H
#define LBR_SPECTRUM_WEIGHTING_H

#include <stddef.h>

#include "base/status.h"

typedef enum lbr_weighting {
  LBR_WEIGHTING_A,
  LBR_WEIGHTING_C,
  LBR_WEIGHTING_Z /* flat: 1 at all frequencies */
} lbr_weighting;

/* The weighting called "A", "C" or "Z", else LBR_UNKNOWN. */
LBR_CHECKED lbr_status lbr_weighting_of(const char *name, lbr_weighting *out);

/* Gain (amplitude ratio, 1 at 1 kHz) at hz >= 0. */
double lbr_weighting_gain(lbr_weighting weighting, double hz);

/* out[k] = power[k] gain(k step_hz)^2; out may be power. */
void lbr_weigh_powers(lbr_weighting weighting, const double *power, size_t n,
                      double step_hz, double *out);

#endif
