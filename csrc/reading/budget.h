/* The budget of a line: every term of its bound as a named entry. */
#ifndef LBR_READING_BUDGET_H
#define LBR_READING_BUDGET_H

#include "reading/bound.h"

typedef enum lbr_term_kind {
  LBR_TERM_SCALLOP,      /* own droop off the bin, or main lobe over 1 */
  LBR_TERM_IMAGE,        /* own negative-frequency image */
  LBR_TERM_SMEAR,        /* own wander within the record */
  LBR_TERM_DROOP,        /* filter: flatness and slope over the interval */
  LBR_TERM_ACCURACY,     /* sensor and range tolerance */
  LBR_TERM_JITTER_LOSS,  /* loss by aperture jitter */
  LBR_TERM_OFFSET,       /* mean of the record */
  LBR_TERM_LEAKAGE,      /* another source, its image and fold included */
  LBR_TERM_PRODUCTS,     /* products of the terms above, and joint slack */
  LBR_TERM_NOISE,        /* random from here on: noise at the input */
  LBR_TERM_QUANTISATION, /* rounding to codes */
  LBR_TERM_JITTER_NOISE, /* noise by aperture jitter */
  LBR_TERM_KINDS
} lbr_term_kind;

typedef struct lbr_term {
  lbr_term_kind kind;
  size_t source; /* LBR_TERM_LEAKAGE: index of the other source */
  double value;  /* demand's unit at lbr_bound.amplitude: a bound, or for
                    random kinds coverage * sigma / sqrt(averages) */
} lbr_term;

const char *lbr_term_text(lbr_term_kind kind); /* "own image", never NULL */

/* The entries of a line's budget: systematic ones add up to bound->error's
 * systematic part (joint suprema make LBR_TERM_PRODUCTS negative where single
 * suprema cannot coincide), random ones in quadrature.  `terms` has room for
 * n_sources + LBR_TERM_KINDS entries; returns the count. */
size_t lbr_bound_budget(const lbr_case *c, size_t line,
                        const lbr_bound *bound, lbr_term *terms);

#endif
