/* Filling a long run of samples in pieces, on several threads.
 *
 * Tones and noise have the same bits on every processor.  Chirps (expm1l),
 * powers of the speed (pow), decays (exp) and interpolation (cos) go through
 * the C library, whose last bit may depend on its version and the processor.
 */
#ifndef LBR_SYNTH_SPREAD_H
#define LBR_SYNTH_SPREAD_H

#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

#define LBR_SPREAD_BLOCK 256 /* samples of one block; they start at multiples */

/* Adds samples first .. first + n - 1 of `what` to out.  Sample numbers are
 * 64-bit integers, negative ones included. */
typedef void (*lbr_adder)(const void *what, int64_t first, double *out,
                          size_t n);

/* Runs add over pieces of out; the same bits for any number of workers (0:
 * one per core) as long as a sample depends on its number only. */
LBR_CHECKED lbr_status lbr_spread(lbr_adder add, const void *what,
                                  int64_t first, double *out, size_t n,
                                  unsigned workers);

/* Makes whole blocks: writes LBR_SPREAD_BLOCK samples from `first`, a
 * multiple of that. */
typedef void (*lbr_maker)(const void *what, int64_t first, double *block);

/* out[i] += sample first + i, made block by block. */
void lbr_add_blocks(lbr_maker make, const void *what, int64_t first,
                    double *out, size_t n);

#endif
