/* Taps applied to records: filtering, decimation and rational resampling are
 * one computation, up zeros put in, filtered, every down-th kept:
 *
 *   y[j] = sum_i h[centre + j down - i up] x[i]
 *
 * of which only the products that are not zero are computed.  A stream takes
 * blocks of any size and gives bit for bit what one block gives.
 */
#ifndef LBR_FILTER_POLYPHASE_H
#define LBR_FILTER_POLYPHASE_H

#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

#define LBR_POLYPHASE_MOST_FACTOR 65536
#define LBR_POLYPHASE_MOST_SEEN ((uint64_t)1 << 45) /* samples of a stream */

typedef struct lbr_polyphase {
  size_t up, down; /* factors, 1 .. LBR_POLYPHASE_MOST_FACTOR */
  size_t taps;     /* of h */
  size_t centre;   /* tap that stands at time 0: 0 causal, (taps - 1) / 2
                      no delay */
  size_t span;     /* samples that one output looks at: ceil(taps / up) */
  double *phase;   /* up rows of span taps, last sample's last; owned */
} lbr_polyphase;

/* Fills *out, whose phase the caller frees.  LBR_DOMAIN for factors or a
 * centre out of range. */
LBR_CHECKED lbr_status lbr_polyphase_make(const double *h, size_t taps,
                                          size_t up, size_t down,
                                          size_t centre, lbr_polyphase *out);

/* Where a stream stands; zeroed, with seam of 2 (span - 1) zeros, it is at the
 * beginning, with zeros before the record. */
typedef struct lbr_polyphase_state {
  uint64_t seen, made; /* samples taken and given so far */
  double *seam;        /* the last span - 1 samples, and room for as many */
} lbr_polyphase_state;

/* Outputs that n more samples give. */
size_t lbr_polyphase_count(const lbr_polyphase *p,
                           const lbr_polyphase_state *state, size_t n);

/* Takes n samples, writes lbr_polyphase_count of them to y (not x). */
void lbr_polyphase_run(const lbr_polyphase *p, lbr_polyphase_state *state,
                       const double *x, size_t n, double *y);

/* Outputs that a record of n samples has in all: ceil(n up / down), or with
 * centre 0 likewise. */
size_t lbr_polyphase_total(const lbr_polyphase *p, uint64_t n);

/* Samples past the end that the last of those outputs looks at. */
size_t lbr_polyphase_beyond(const lbr_polyphase *p);

#endif
