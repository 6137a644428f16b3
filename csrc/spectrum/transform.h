/* Fourier transforms of real records: plans made once, run many times.
 *
 *   X[k] = sum_n x[n] exp(-2 pi i k n / n_points),  k = 0 .. n_points / 2
 *
 * and back, scaled so that a round trip gives the record again.  Plans live in
 * one cache for the process, behind one lock, because the planner underneath
 * is neither re-entrant nor cheap.  A plan is immutable; any number of threads
 * may run it at the same time, each on its own buffers.
 */
#ifndef LBR_SPECTRUM_TRANSFORM_H
#define LBR_SPECTRUM_TRANSFORM_H

#include <complex.h>
#include <stddef.h>

#include "base/status.h"

/* Longest transform: the planner ends the process when it runs out of memory,
 * so lengths are bounded before it is asked. */
#define LBR_TRANSFORM_MOST ((size_t)1 << 27)

typedef struct lbr_transform lbr_transform;

/* The plan for n_points (1 .. LBR_TRANSFORM_MOST, else LBR_DOMAIN), from the
 * cache or new.  Give it back with lbr_transform_put. */
LBR_CHECKED lbr_status lbr_transform_get(size_t n_points, lbr_transform **out);
void lbr_transform_put(lbr_transform *transform); /* NULL is fine */

size_t lbr_transform_points(const lbr_transform *transform);

/* x: n_points values; bins: n_points / 2 + 1 values.  Both from
 * lbr_transform_buffer (the alignment is part of the plan).  x survives. */
void lbr_transform_forward(const lbr_transform *transform, double *x,
                           double complex *bins);

/* The inverse of lbr_transform_forward; bins are destroyed. */
void lbr_transform_back(const lbr_transform *transform, double complex *bins,
                        double *x);

/* bins = transform of w[n] x[n], zeros up to n_points; n <= n_points.  w NULL:
 * no window.  scratch: n_points values from lbr_transform_buffer. */
void lbr_transform_windowed(const lbr_transform *transform, const double *x,
                            const double *w, size_t n, double *scratch,
                            double complex *bins);

/* A complex transform, X[k] = sum_n x[n] exp(-2 pi i k n / n_points), from the
 * same cache; given back with lbr_transform_put.  Only lbr_transform_complex
 * may run it: from x to bins, n_points values each, not the same memory, both
 * aligned as lbr_transform_buffer does it (to 16 bytes).  x survives. */
LBR_CHECKED lbr_status lbr_transform_get_complex(size_t n_points,
                                                 lbr_transform **out);
void lbr_transform_complex(const lbr_transform *transform, double complex *x,
                           double complex *bins);

/* Aligned, zeroed memory for count doubles (a bin takes two), or NULL. */
double *lbr_transform_buffer(size_t count);
double *lbr_transform_unset(size_t count); /* the same, not zeroed */
void lbr_transform_drop(void *buffer); /* NULL is fine */

/* The smallest length >= n whose prime factors are 2, 3 and 5. */
size_t lbr_transform_fast_length(size_t n);

/* Tries out plans for n_points (1 .. LBR_TRANSFORM_MOST, else LBR_DOMAIN), real
 * and forward, and keeps the fastest for every later lbr_transform_get, until
 * lbr_transform_forget: 0.3 s for 8192 points, 1 s for 65536, minutes beyond
 * 2^22.  Results may change in their last bits. */
LBR_CHECKED lbr_status lbr_transform_tune(size_t n_points);

/* Empties the cache and gives back what the planner keeps; plans in use stay
 * valid until they are put back.  For leak checks and long-lived hosts. */
void lbr_transform_forget(void);

#endif
