/* What two channels have in common: coherence, responses, their errors.
 *
 * xx, yy: averaged powers of the input x and the output y; re, im: real and
 * imaginary part of the mean of conj(X) Y.  With that sign a y that comes
 * later than x has a falling phase.  All scaled alike, n bins.
 */
#ifndef LBR_SPECTRUM_RESPONSE_H
#define LBR_SPECTRUM_RESPONSE_H

#include <stddef.h>

typedef struct lbr_pair {
  const double *xx, *yy; /* powers, unit_x^2 and unit_y^2 */
  const double *re, *im; /* cross spectrum, unit_x unit_y */
  size_t n;              /* bins */
} lbr_pair;

typedef enum lbr_estimate {
  LBR_RESPONSE_H1,    /* Sxy / Sxx: all noise is on the output */
  LBR_RESPONSE_H2,    /* Syy / conj(Sxy): all noise is on the input */
  LBR_RESPONSE_TOTAL, /* total least squares: noise on both */
  LBR_RESPONSE_KINDS
} lbr_estimate;

/* |Sxy|^2 / (Sxx Syy), at most 1; not a number where there is no power. */
void lbr_coherence(const lbr_pair *pair, double *out);

/* The response y / x.  noise_ratio: power of the noise on y over that on x,
 * for LBR_RESPONSE_TOTAL alone (unit_y^2 / unit_x^2, positive and finite).
 *   H = (Syy - r Sxx + sqrt((Syy - r Sxx)^2 + 4 r |Sxy|^2)) / (2 conj(Sxy))
 * tends to H1 for r -> infinity and to H2 for r -> 0. */
void lbr_response(const lbr_pair *pair, lbr_estimate estimate,
                  double noise_ratio, double *re, double *im);

/* Normalised random error of |H| for each coherence,
 * sqrt(1 - g2) / (sqrt(g2) sqrt(2 averages)) (Bendat and Piersol, Random
 * Data, table of statistical errors; from memory). */
void lbr_response_error(const double *coherence, size_t n, double averages,
                        double *out);

/* A peak of |H|^2 and how wide it looks. */
typedef struct lbr_narrow {
  size_t bin;    /* the peak, from 0 */
  double width;  /* at half its power, bins */
} lbr_narrow;

/* Peaks of a power that fall to a half on both sides before they meet a
 * larger value, and there are narrower than `least` bins; at most `most` of
 * them, in order.  Returns how many there are in all. */
size_t lbr_narrow_peaks(const double *power, size_t n, double least,
                        lbr_narrow *out, size_t most);

#endif
