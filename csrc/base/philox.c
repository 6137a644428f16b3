/* LBR_NO_WIDE leaves the hand-made AVX-512 loop out, to compare with. */
#include "base/philox.h"

#if defined(__x86_64__) && !defined(LBR_NO_WIDE)
#include <immintrin.h>
#endif

/* Multipliers and key steps of Philox4x32: the paper, section 3.3. */
#define MULTIPLIER_0 0xD2511F53u
#define MULTIPLIER_1 0xCD9E8D57u
#define STEP_0 0x9E3779B9u
#define STEP_1 0xBB67AE85u
#define ROUNDS 10
#define LANES 16

static inline uint32_t high_half(uint32_t a, uint32_t b) {
  return (uint32_t)(((uint64_t)a * b) >> 32);
}

void lbr_philox(const uint32_t counter[4], const uint32_t key[2],
                uint32_t out[4]) {
  uint32_t x0 = counter[0], x1 = counter[1], x2 = counter[2], x3 = counter[3];
  uint32_t k0 = key[0], k1 = key[1];
  for (int round = 0; round < ROUNDS; round++) {
    uint32_t h0 = high_half(x0, MULTIPLIER_0), l0 = x0 * MULTIPLIER_0;
    uint32_t h1 = high_half(x2, MULTIPLIER_1), l1 = x2 * MULTIPLIER_1;
    x0 = h1 ^ x1 ^ k0, x1 = l1, x2 = h0 ^ x3 ^ k1, x3 = l0;
    k0 += STEP_0, k1 += STEP_1;
  }
  out[0] = x0, out[1] = x1, out[2] = x2, out[3] = x3;
}

/* Sixteen counters side by side, the compiler's vectors. */
__attribute__((target_clones("avx2", "default"))) static void
run_plain(const uint32_t key[2], const uint32_t high[2], uint64_t first,
          uint64_t *restrict low, uint64_t *restrict up, size_t n) {
  for (size_t start = 0; start < n; start += LANES)
    for (size_t i = start; i < start + LANES; i++) {
      uint64_t c = first + i;
      uint32_t x0 = (uint32_t)c, x1 = (uint32_t)(c >> 32);
      uint32_t x2 = high[0], x3 = high[1], k0 = key[0], k1 = key[1];
      for (int round = 0; round < ROUNDS; round++) {
        uint32_t h0 = high_half(x0, MULTIPLIER_0), l0 = x0 * MULTIPLIER_0;
        uint32_t h1 = high_half(x2, MULTIPLIER_1), l1 = x2 * MULTIPLIER_1;
        x0 = h1 ^ x1 ^ k0, x1 = l1, x2 = h0 ^ x3 ^ k1, x3 = l0;
        k0 += STEP_0, k1 += STEP_1;
      }
      low[i] = x0 | (uint64_t)x1 << 32;
      up[i] = x2 | (uint64_t)x3 << 32;
    }
}

#if defined(__x86_64__) && !defined(LBR_NO_WIDE)
/* Eight counters in 64-bit lanes.  Only the low halves of the lanes count:
 * the multiplication does not see what the shifts and xors leave above. */
__attribute__((target("avx512f"))) static void
run_wide(const uint32_t key[2], const uint32_t high[2], uint64_t first,
         uint64_t *low, uint64_t *up, size_t n) {
  const __m512i m0 = _mm512_set1_epi64(MULTIPLIER_0);
  const __m512i m1 = _mm512_set1_epi64(MULTIPLIER_1);
  const __m512i half = _mm512_set1_epi64(0xffffffff);
  const __m512i lane = _mm512_set_epi64(7, 6, 5, 4, 3, 2, 1, 0);
  for (size_t i = 0; i < n; i += 8) {
    __m512i x0 = _mm512_add_epi64(_mm512_set1_epi64((int64_t)(first + i)),
                                  lane);
    __m512i x1 = _mm512_srli_epi64(x0, 32);
    __m512i x2 = _mm512_set1_epi64(high[0]), x3 = _mm512_set1_epi64(high[1]);
    uint32_t k0 = key[0], k1 = key[1];
    for (int round = 0; round < ROUNDS; round++) {
      __m512i p0 = _mm512_mul_epu32(x0, m0), p1 = _mm512_mul_epu32(x2, m1);
      x0 = _mm512_ternarylogic_epi64(_mm512_srli_epi64(p1, 32), x1,
                                     _mm512_set1_epi64(k0), 0x96);
      x2 = _mm512_ternarylogic_epi64(_mm512_srli_epi64(p0, 32), x3,
                                     _mm512_set1_epi64(k1), 0x96);
      x1 = p1, x3 = p0;
      k0 += STEP_0, k1 += STEP_1;
    }
    x0 = _mm512_or_epi64(_mm512_and_epi64(x0, half),
                         _mm512_slli_epi64(x1, 32));
    x2 = _mm512_or_epi64(_mm512_and_epi64(x2, half),
                         _mm512_slli_epi64(x3, 32));
    _mm512_storeu_si512(low + i, x0);
    _mm512_storeu_si512(up + i, x2);
  }
}
#endif

void lbr_philox_run(const uint32_t key[2], const uint32_t high[2],
                    uint64_t first, uint64_t *low, uint64_t *up, size_t n) {
#if defined(__x86_64__) && !defined(LBR_NO_WIDE)
  if (__builtin_cpu_supports("avx512f")) {
    run_wide(key, high, first, low, up, n);
    return;
  }
#endif
  run_plain(key, high, first, low, up, n);
}
