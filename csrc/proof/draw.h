/* The numbers of a trial, drawn one after the other from a keyed stream: they
 * depend on seed, trial and purpose alone. */
#ifndef LBR_PROOF_DRAW_H
#define LBR_PROOF_DRAW_H

#include "base/random.h"

typedef struct lbr_draw {
  lbr_key key;
  uint64_t index; /* the next number to be drawn */
} lbr_draw;

lbr_draw lbr_draw_start(uint64_t seed, uint64_t trial, lbr_purpose purpose);

/* Uniform in (0, 1). */
double lbr_draw_unit(lbr_draw *draw);

/* In [-1, 1]: uniform, but one time in four at an end. */
double lbr_draw_spread(lbr_draw *draw);

/* In [least, most]: uniform in the logarithm (in the value when least is not
 * positive), but one time in four at an end. */
double lbr_draw_range(lbr_draw *draw, double least, double most);

#endif
