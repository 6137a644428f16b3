/* Recursive digital filters as second-order sections.
 *
 *   H(z) = product over sections of
 *          (b0 + b1 z^-1 + b2 z^-2) / (1 + a1 z^-1 + a2 z^-2)
 *
 * run in the transposed second direct form.  Every section of every sample is
 * computed by the same operations in the same order whatever the blocks are:
 * results do not depend on how a record is cut.
 */
#ifndef LBR_FILTER_SECTIONS_H
#define LBR_FILTER_SECTIONS_H

#include <complex.h>
#include <stddef.h>

#include "base/status.h"

#define LBR_MOST_SECTIONS 16

typedef struct lbr_section {
  double b0, b1, b2; /* numerator */
  double a1, a2;     /* denominator, its first coefficient is 1 */
} lbr_section;

typedef struct lbr_sections {
  size_t count;                         /* 1 .. LBR_MOST_SECTIONS */
  lbr_section part[LBR_MOST_SECTIONS];  /* in the order they are run */
} lbr_sections;

/* What the sections remember between blocks; all 0 is a filter at rest. */
typedef struct lbr_sections_state {
  double hold[LBR_MOST_SECTIONS][2];
} lbr_sections_state;

/* y[i] for n samples; y may be x.  step 1 runs forward from x[0], step -1
 * backward from x[0] to x[-(n - 1)]. */
void lbr_sections_run(const lbr_sections *s, lbr_sections_state *state,
                      const double *x, double *y, size_t n, int step);

/* The state after a constant `level` has been there for ever. */
void lbr_sections_settled(const lbr_sections *s, double level,
                          lbr_sections_state *state);

/* H at a frequency given as a share of the sample rate. */
double complex lbr_sections_response(const lbr_sections *s, double share);

/* Samples after which the slowest pole has decayed to `level` (0 < level < 1);
 * SIZE_MAX / 4 where that takes longer or for ever. */
size_t lbr_sections_settling(const lbr_sections *s, double level);

/* How a record goes on beyond its ends while it is filtered. */
typedef enum lbr_ends {
  LBR_ENDS_TURN,   /* turned about the end point by half a turn */
  LBR_ENDS_MIRROR, /* mirrored at the end point */
  LBR_ENDS_HOLD,   /* the end sample for ever */
  LBR_ENDS_BARE    /* not at all: zeros */
} lbr_ends;

/* Sample at place `at` (beyond the ends: by the rule) of n > 0 samples; turned
 * and mirrored records reach n - 1 samples beyond. */
double lbr_ends_sample(const double *x, size_t n, ptrdiff_t at, lbr_ends ends);

/* Forward and backward over x with `pad` samples of extension at both ends
 * (pad < n unless held or bare); each pass starts settled at its first sample,
 * or at rest with bare ends.  The gain is |H|^2, the phase 0.  spare: pad
 * samples of workspace; y is not x. */
void lbr_sections_both_ways(const lbr_sections *s, const double *x, double *y,
                            size_t n, lbr_ends ends, size_t pad,
                            double *spare);

#endif
