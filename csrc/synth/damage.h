/* What goes wrong in an amplifier, a converter or a word of bits: kernels that
 * spoil samples in place, on purpose.
 */
#ifndef LBR_SYNTH_DAMAGE_H
#define LBR_SYNTH_DAMAGE_H

#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

/* Samples beyond low .. high are put there; how many were. */
size_t lbr_clip(double *x, size_t n, double low, double high);

/* A smooth plateau: beyond (1 - knee) level, level (1 - knee + knee tanh((|x| /
 * level - 1 + knee) / knee)), for x > 0 with `high`, for x < 0 with `low`
 * (both > 0); 0 < knee <= 1. */
void lbr_soften(double *x, size_t n, double low, double high, double knee);

/* x += second x^2 + third x^3 */
void lbr_bend(double *x, size_t n, double second, double third);

/* x = step rint(x / step), step > 0 */
void lbr_coarsen(double *x, size_t n, double step);

/* What is done to integer codes. */
typedef struct lbr_code_damage {
  int bits;         /* width that is kept, two's complement, 1 .. 32: higher
                       bits are lost and the sign is that of the new top bit */
  uint32_t keep;    /* bits that survive */
  uint32_t force;   /* bits that are always 1 */
  int32_t skip;     /* 0: none; else codes c with c mod skip == skip / 2 never
                       appear: the next one does */
} lbr_code_damage;

/* Codes in doubles, each a whole number of at most 32 bits, else LBR_DOMAIN
 * (samples before that one are then already changed); *changed counts those
 * that are other codes now. */
LBR_CHECKED lbr_status lbr_damage_codes(double *x, size_t n,
                                        const lbr_code_damage *damage,
                                        size_t *changed);

/* A filter y[n] = b0 x[n] + b1 x[n-1] + b2 x[n-2] - a1 y[n-1] - a2 y[n-2]. */
typedef struct lbr_section {
  double b[3], a[2];
} lbr_section;

/* In place, as if the record had stood at x[0] for ever before (the gain at 0
 * Hz must be 1). */
void lbr_section_run(const lbr_section *section, double *x, size_t n);

/* A first-order low pass of gain sqrt(1/2) at `corner` cycles per sample, by
 * the bilinear transform; 0 < corner < 1/2. */
lbr_section lbr_low_pass(double corner);

/* A sensor or mount that resonates: gain 1 at 0 Hz, q at `cycles` per sample
 * (bilinear transform, exact there); 0 < cycles < 1/2, q > 0. */
lbr_section lbr_resonance(double cycles, double q);

#endif
