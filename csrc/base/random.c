#include "base/random.h"

#include <math.h>
#include <string.h>

#include "base/cycles.h"
#include "base/philox.h"

#define BLOCKS 256 /* generator blocks in one go */
#define GROUP 16   /* Gaussian values from eight blocks */
#define LAST_BLOCK ((uint64_t)1 << 63)  /* indices start again there: words */
#define LAST_GROUP ((uint64_t)1 << 60)  /* and Gaussian values */

lbr_key lbr_key_make(uint64_t seed, const uint64_t *words, size_t n) {
  uint32_t state[4] = {(uint32_t)seed, (uint32_t)(seed >> 32), (uint32_t)n, 0};
  const uint32_t none[2] = {0, 0};
  lbr_philox(state, none, state);
  for (size_t i = 0; i < n; i++) {
    uint32_t word[2] = {(uint32_t)words[i], (uint32_t)(words[i] >> 32)};
    lbr_philox(state, word, state);
  }
  return (lbr_key){{state[0], state[1]}, {state[2], state[3]}};
}

lbr_key lbr_key_of(uint64_t seed, uint64_t trial, uint64_t channel,
                   uint64_t purpose) {
  uint64_t words[3] = {trial, channel, purpose};
  return lbr_key_make(seed, words, 3);
}

static size_t at_most(size_t n, uint64_t most) {
  return n < most ? n : (size_t)most;
}

static size_t round_up(size_t n, size_t to) { return (n + to - 1) / to * to; }

void lbr_random_words(const lbr_key *key, uint64_t first, uint64_t *out,
                      size_t n) {
  uint64_t low[BLOCKS], up[BLOCKS];
  size_t done = 0;
  while (done < n) {
    uint64_t word = first + done, block = word / 2;
    size_t skip = word % 2, left = n - done;
    size_t blocks = at_most(left / 2 + 1, BLOCKS);
    blocks = at_most(blocks, LAST_BLOCK - block);
    size_t take = at_most(left, 2 * blocks - skip);
    lbr_philox_run(key->key, key->stream, block, low, up,
                   round_up(blocks, 16));
    for (size_t i = 0; i < take; i++) {
      size_t at = i + skip;
      out[done + i] = at % 2 ? up[at / 2] : low[at / 2];
    }
    done += take;
  }
}

/* The 52 high bits as an odd multiple of 2^-53 between 0 and 1; exact. */
static inline double open_unit(uint64_t word) {
  return lbr_of_bits(word >> 12 | 0x3ff0000000000000u) - (1 - 0x1p-53);
}

double lbr_random_uniform_at(const lbr_key *key, uint64_t n) {
  uint32_t out[4], counter[4] = {(uint32_t)(n / 2), (uint32_t)(n / 2 >> 32),
                                 key->stream[0], key->stream[1]};
  lbr_philox(counter, key->key, out);
  size_t half = n % 2 * 2;
  return open_unit(out[half] | (uint64_t)out[half + 1] << 32);
}

void lbr_random_uniform(const lbr_key *key, uint64_t first, double *out,
                        size_t n) {
  uint64_t words[2 * BLOCKS];
  if (n == 1) *out = lbr_random_uniform_at(key, first);
  for (size_t done = 0; n > 1 && done < n;) {
    size_t take = n - done < 2 * BLOCKS ? n - done : 2 * BLOCKS;
    lbr_random_words(key, first + done, words, take);
    for (size_t i = 0; i < take; i++) out[done + i] = open_unit(words[i]);
    done += take;
  }
}

/* Natural logarithm of u in (0, 1): u = 2^e m, sqrt(1/2) <= m < sqrt(2), and
 * ln m = 2 artanh((m - 1)/(m + 1)), whose series ends below 3e-17. */
static inline double log_unit(double u) {
  const uint64_t root = 0x3fe6a09e667f3bcdu, offset = (uint64_t)1024 << 52;
  uint64_t bits = lbr_bits_of(u), above = bits - root + offset;
  uint64_t exponent = above >> 52;
  double m = lbr_of_bits(bits - (above >> 52 << 52) + offset);
  double e = lbr_of_bits(exponent | 0x4330000000000000u) - (0x1p52 + 1024);
  double f = m - 1, s = f / (m + 1), z = s * s;
  double series =
      z * (1.0 / 3 +
           z * (1.0 / 5 +
                z * (1.0 / 7 +
                     z * (1.0 / 9 +
                          z * (1.0 / 11 +
                               z * (1.0 / 13 +
                                    z * (1.0 / 15 +
                                         z * (1.0 / 17 +
                                              z * (1.0 / 19)))))))));
  return e * 0x1.62e42fefa39efp-1 + (2 * s + 2 * s * series);
}

/* Groups of 16: eight cosine halves, then eight sine halves. */
__attribute__((target_clones("avx512f", "avx2", "default"))) static void
box_muller(const uint64_t *restrict low, const uint64_t *restrict up,
           double *restrict out, size_t groups) {
  for (size_t g = 0; g < groups; g++)
    for (size_t i = 0; i < 8; i++) {
      double c, s, radius = sqrt(-2 * log_unit(open_unit(low[8 * g + i])));
      lbr_cos_sin_cycles(open_unit(up[8 * g + i]), &c, &s);
      out[16 * g + i] = radius * c;
      out[16 * g + 8 + i] = radius * s;
    }
}

/* `groups` whole groups from group number g, at most BLOCKS / 8. */
static void whole_groups(const lbr_key *key, uint64_t g, double *out,
                         size_t groups) {
  uint64_t low[BLOCKS], up[BLOCKS];
  lbr_philox_run(key->key, key->stream, 8 * g, low, up,
                 round_up(8 * groups, 16));
  box_muller(low, up, out, groups);
}

void lbr_random_gaussian(const lbr_key *key, uint64_t first, double *out,
                         size_t n) {
  double edge[GROUP];
  for (size_t done = 0; done < n;) {
    uint64_t at = first + done;
    size_t left = n - done, skip = at % GROUP;
    if (skip == 0 && left >= GROUP) {
      size_t groups = at_most(left / GROUP, BLOCKS / 8);
      groups = at_most(groups, LAST_GROUP - at / GROUP);
      whole_groups(key, at / GROUP, out + done, groups);
      done += groups * GROUP;
    } else {
      size_t take = GROUP - skip < left ? GROUP - skip : left;
      whole_groups(key, at / GROUP, edge, 1);
      memcpy(out + done, edge + skip, take * sizeof *out);
      done += take;
    }
  }
}
