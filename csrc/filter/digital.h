/* Recursive digital filters from the analog low-pass shapes, by the bilinear
 * transformation: s = 2 (z - 1) / (z + 1), with band edges moved beforehand to
 * 2 tan(pi edge / rate) so that the digital filter has them where they were
 * asked for (Oppenheim and Schafer, Discrete-Time Signal Processing, ch. 7).
 */
#ifndef LBR_FILTER_DIGITAL_H
#define LBR_FILTER_DIGITAL_H

#include "filter/analog.h"
#include "filter/sections.h"

typedef enum lbr_band {
  LBR_BAND_LOW,  /* passes below edge[0] */
  LBR_BAND_HIGH, /* passes above edge[0] */
  LBR_BAND_PASS, /* passes between edge[0] and edge[1] */
  LBR_BAND_STOP  /* passes outside edge[0] .. edge[1] */
} lbr_band;

/* The digital filter of a prepared analog shape (not none, not points) for
 * edges given as shares of the sample rate, 0 < edge[0] < edge[1] < 0.5 (low
 * and high use edge[0] alone).  The analog filter's own corner is not used;
 * the edges stand where its corner stands.  LBR_DOMAIN for other edges and
 * shapes, LBR_NO_CONVERGE where double precision cannot hold a stable filter
 * of that kind.  Where the analog gain is `start` (0 Hz, half the rate, the
 * middle of the band) the gain of the result is that, to rounding. */
LBR_CHECKED lbr_status lbr_digital_design(const lbr_filter *analog,
                                          lbr_band band, const double edge[2],
                                          lbr_sections *out);

#endif
