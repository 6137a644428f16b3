/* Keyed random numbers: number `index` of trial `trial` under seed `seed`, no
 * matter what was drawn before or by whom. */
#ifndef LBR_PROOF_DRAW_H
#define LBR_PROOF_DRAW_H

#include <stdint.h>

typedef struct lbr_draw {
  uint64_t key;   /* made of seed and trial */
  uint64_t index; /* the next number to be drawn */
} lbr_draw;

lbr_draw lbr_draw_start(uint64_t seed, uint64_t trial);

/* Uniform in [0, 1). */
double lbr_draw_unit(lbr_draw *draw);

/* In [-1, 1]: uniform, but one time in four at an end. */
double lbr_draw_spread(lbr_draw *draw);

/* In [least, most]: uniform in the logarithm (in the value when least is not
 * positive), but one time in four at an end. */
double lbr_draw_range(lbr_draw *draw, double least, double most);

#endif
