/* Analog low-pass responses: what stands before a converter.
 *
 * Shapes: none, Butterworth (corner where the power is halved), Chebyshev
 * (edge of the ripple), Bessel (-3 dB normalised corner), elliptic (edge of
 * the ripple, given pass-band ripple and stop-band rejection), and a table of
 * points (interpolated in dB over log frequency; flat before the first point,
 * and the last point's value after the last).
 */
#ifndef LBR_FILTER_ANALOG_H
#define LBR_FILTER_ANALOG_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

#include "base/status.h"

#define LBR_FILTER_MOST_ORDER 16
#define LBR_FILTER_MOST_POINTS 256

typedef enum lbr_filter_shape {
  LBR_FILTER_NONE,
  LBR_FILTER_BUTTERWORTH,
  LBR_FILTER_CHEBYSHEV,
  LBR_FILTER_BESSEL,
  LBR_FILTER_ELLIPTIC,
  LBR_FILTER_POINTS
} lbr_filter_shape;

typedef struct lbr_filter {
  lbr_filter_shape shape;
  int order;               /* 1 .. LBR_FILTER_MOST_ORDER */
  double corner;           /* Hz, or a share of the sample rate */
  bool corner_of_rate;     /* true: corner is a share of the sample rate */
  double ripple_db;        /* pass band, Chebyshev and elliptic, > 0 */
  double stop_db;          /* stop band rejection, elliptic, > ripple_db */
  size_t points;           /* rows of the table */
  double point_at[LBR_FILTER_MOST_POINTS]; /* Hz or share, increasing, > 0 */
  double point_db[LBR_FILTER_MOST_POINTS]; /* gain in dB (0 pass, -80 stop) */
  /* filled by lbr_filter_prepare for a corner of 1 rad/s: */
  size_t poles, zeros;
  double complex pole[LBR_FILTER_MOST_ORDER], zero[LBR_FILTER_MOST_ORDER];
  double scale; /* gain factor that makes the pass band start as specified */
  /* the same as factors of the power gain at w rad/s, each 1 at w = 0:
   * (top (null - w^2))^2 / ((stiff - w^2)^2 + damp w^2), without zeros
   * stiff^2 / (...), and for a real pole drag / (drag + w^2) */
  size_t pairs;
  double stiff[LBR_FILTER_MOST_ORDER / 2]; /* |pole|^2 */
  double damp[LBR_FILTER_MOST_ORDER / 2];  /* (2 Re pole)^2 */
  double null[LBR_FILTER_MOST_ORDER / 2];  /* zero^2; unused when zeros is 0 */
  double top[LBR_FILTER_MOST_ORDER / 2];   /* stiff / null */
  double drag;  /* square of the real pole, 0: there is none */
  double start; /* gain at 0 Hz */
  /* Chebyshev and elliptic: */
  double ripple;      /* passband ripple factor, floor = 1/sqrt(1+ripple^2) */
  double floor;       /* least gain of the pass band */
  double ceiling;     /* largest gain of the stop band, elliptic */
  double selectivity; /* pass edge / stop edge, elliptic, 0 < . <= 1 */
  /* turning points of the pass band, turn[0] = 1 > turn[1] > ... >
   * turn[order] = 0: the gain is `floor` at even, 1 at odd indices; in the
   * stop band of an elliptic response it turns at 1/(selectivity turn[m]),
   * where it is `ceiling` at even, 0 at odd indices */
  double turn[LBR_FILTER_MOST_ORDER + 1];
} lbr_filter;

/* Checks the fields above the line and fills the rest; LBR_DOMAIN when a
 * field is out of range. */
LBR_CHECKED lbr_status lbr_filter_prepare(lbr_filter *filter);

/* |F(f)| at f >= 0 Hz for a sample rate in S/s. */
double lbr_filter_gain(const lbr_filter *filter, double hz, double rate);

/* The corner in Hz at a rate in S/s (of a table: its first point). */
double lbr_filter_corner(const lbr_filter *filter, double rate);

/* Complex response (tables of points: zero phase). */
double complex lbr_filter_response(const lbr_filter *filter, double hz,
                                   double rate);

/* low <= |F(f)| <= high for all f in [hz1, hz2]; a true enclosure. */
void lbr_filter_range(const lbr_filter *filter, double hz1, double hz2,
                      double rate, double *low, double *high);

/* The frequency (Hz) beyond which |F| <= level for good, or INFINITY. */
double lbr_filter_edge(const lbr_filter *filter, double level, double rate);

#endif
