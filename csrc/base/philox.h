/* Philox4x32-10, a keyed bijection of 128-bit counters that passes for random
 * (Salmon, Moraes, Dror and Shaw, SC11, 2011).
 */
#ifndef LBR_BASE_PHILOX_H
#define LBR_BASE_PHILOX_H

#include <stddef.h>
#include <stdint.h>

/* One block. */
void lbr_philox(const uint32_t counter[4], const uint32_t key[2],
                uint32_t out[4]);

/* Blocks of the counters (first + i, high), i < n, n a multiple of 16: words
 * 0 and 1 of block i in low[i] (word 0 in the low half), 2 and 3 in up[i]. */
void lbr_philox_run(const uint32_t key[2], const uint32_t high[2],
                    uint64_t first, uint64_t *low, uint64_t *up, size_t n);

#endif
