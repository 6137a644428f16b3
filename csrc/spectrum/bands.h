/* Fractional-octave bands: exact frequencies, class limits, and band powers
 * from a power spectrum.
 *
 * IEC 61260-1:2014: octave ratio G = 10^0.3, reference 1 kHz; band number x of
 * 1/b octaves has the exact mid-band frequency 1000 G^(x / b) Hz for odd b and
 * 1000 G^((2 x + 1) / (2 b)) for even b, and edges G^(-+ 1 / (2 b)) from it.
 *
 * A band's power is the sum of line powers times |H|^2 of a band-pass with the
 * Butterworth magnitude of a given order:
 *   |H|^2 = 1 / (1 + X^(2 order)),
 *   X = (r - 1 / r) / (e - 1 / e),  r = f / mid,  e = G^(1 / (2 b)),
 * half power at both edges.  From order 3 on it lies inside the class 1 limits
 * (tests/bands_spec.lua).
 */
#ifndef LBR_SPECTRUM_BANDS_H
#define LBR_SPECTRUM_BANDS_H

#include <stddef.h>

#include "base/status.h"

#define LBR_MOST_FRACTION 48     /* narrowest bands: 1/48 octave */
#define LBR_MOST_BAND 4096       /* |band number| */
#define LBR_MOST_BAND_ORDER 32

typedef struct lbr_band {
  double mid, low, high; /* exact mid-band frequency and edges, Hz */
} lbr_band;

/* Band x of 1/b octaves; LBR_DOMAIN when b or x is out of range. */
LBR_CHECKED lbr_status lbr_band_of(int b, int x, lbr_band *out);

/* The band number whose edges hold hz > 0 (its low edge included). */
LBR_CHECKED lbr_status lbr_band_at(int b, double hz, int *x);

/* Limits of the relative attenuation of Table 1 of IEC 61260-1:2014 at f / mid
 * = ratio > 0, class 1 or 2, dB; linear in lg ratio between the breakpoints;
 * *most is INFINITY outside the band. */
LBR_CHECKED lbr_status lbr_band_limits(int b, int class_number, double ratio,
                                       double *least, double *most);

/* Relative attenuation of the band-pass above at f / mid = ratio, dB. */
LBR_CHECKED lbr_status lbr_band_attenuation(int b, int order, double ratio,
                                            double *db);

/* out[i] = power in band first + i, i < count, of power[k] at k step_hz.
 * Bins more than 200 dB down are left out. */
LBR_CHECKED lbr_status lbr_band_powers(const double *power, size_t bins,
                                       double step_hz, int b, int order,
                                       int first, size_t count, double *out);

#endif
