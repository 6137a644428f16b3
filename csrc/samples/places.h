/* Samples between samples: band-limited interpolation of a record at places
 * that are not whole numbers, and cubic interpolation of a table of places.
 *
 * The kernel is a sine cardinal times Kaiser's window, tabulated at 128 steps
 * a sample and interpolated by cubics between them (8.5e-9 of the kernel at
 * most).
 */
#ifndef LBR_SAMPLES_PLACES_H
#define LBR_SAMPLES_PLACES_H

#include <stddef.h>

#include "base/status.h"

#define LBR_PLACES_STEPS 128

typedef struct lbr_places {
  size_t half;  /* samples to each side that one value looks at */
  double *row;  /* kernels at steps -1 .. 129, 2 half values each; owned */
} lbr_places;

/* A kernel for values taken `ratio` times as often as the samples (0 < ratio
 * <= 1; 1 when they are taken as often or more often): what lies below keep *
 * ratio of the sample rate (0 < keep < 0.5) is kept to 10^(-db/20) of its
 * amplitude (8 <= db <= 140), what lies above (1 - keep) * ratio is taken away
 * likewise.  Kaiser's estimate for 6 dB more leaves room for what the images
 * add up to.  LBR_OVERFLOW where the kernel would be longer than 2^15 samples.
 * The caller frees row. */
LBR_CHECKED lbr_status lbr_places_make(double keep, double ratio, double db,
                                       lbr_places *out);

/* y[i] = record at place at[i], 0 .. n - 1, n > 0.  Closer than half to an
 * end the record is taken to go on turned about its end point, or with its
 * end sample where it is shorter than that. */
void lbr_places_take(const lbr_places *p, const double *x, size_t n,
                     const double *at, double *y, size_t count);

/* y[i] = value at argument i / per (0 .. n - 1) of a table given at 0, 1, ...
 * n - 1 (n >= 4): the cubic through the four nearest.  Exact for cubics, else
 * off by 3/128 of the fourth difference, more in the first and last cell. */
void lbr_table_even(const double *table, size_t n, size_t per, double *y,
                    size_t count);

#endif
