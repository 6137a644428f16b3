/* Keyed random numbers: value n of a stream depends only on (key, n).
 *
 * There is no state.  Any start, any block size and any number of threads
 * give the same bits, on every processor: the arithmetic is IEEE 754 with a
 * fixed order of operations and no fused steps.
 *
 * Generator: Philox4x32-10 of J. K. Salmon, M. A. Moraes, R. O. Dror and
 * D. E. Shaw, "Parallel random numbers: as easy as 1, 2, 3", SC11 (2011).
 * A block is Philox of the counter (c, key.stream) under key.key, c being 64
 * bits; it gives two 64-bit words.
 */
#ifndef LBR_BASE_RANDOM_H
#define LBR_BASE_RANDOM_H

#include <stddef.h>
#include <stdint.h>

typedef struct lbr_key {
  uint32_t key[2];    /* the generator's key */
  uint32_t stream[2]; /* upper half of the counter */
} lbr_key;

/* What a stream is for, so that no two uses share numbers.  These values are
 * part of what a seed means: never renumber. */
typedef enum lbr_purpose {
  LBR_PURPOSE_INPUT_NOISE = 1, /* noise before the analog filter */
  LBR_PURPOSE_OWN_NOISE = 2,   /* the digitizer's own noise */
  LBR_PURPOSE_JITTER = 3,      /* displacement of sampling instants */
  LBR_PURPOSE_TRIAL = 4,       /* amplitudes, phases, frequencies of a trial */
  LBR_PURPOSE_SEARCH = 5,      /* an adversary's own choices */
  LBR_PURPOSE_USER = 64        /* first number free for scripts */
} lbr_purpose;

/* A key from a seed and n words (case, channel, purpose, ...); the order and
 * the number of the words count. */
lbr_key lbr_key_make(uint64_t seed, const uint64_t *words, size_t n);

/* lbr_key_make(seed, {trial, channel, purpose}, 3). */
lbr_key lbr_key_of(uint64_t seed, uint64_t trial, uint64_t channel,
                   uint64_t purpose);

/* out[i] = word first + i of the stream: word n is half n mod 2 of block
 * n div 2.  Indices run modulo 2^64. */
void lbr_random_words(const lbr_key *key, uint64_t first, uint64_t *out,
                      size_t n);

/* Uniform in (0, 1): (2 (word div 2^12) + 1) / 2^53. */
void lbr_random_uniform(const lbr_key *key, uint64_t first, double *out,
                        size_t n);

/* Normal, mean 0, variance 1 (Box and Muller 1958): value n takes block
 * 8 (n div 16) + n mod 8 and is its cosine half when n mod 16 < 8, else its
 * sine half; |value| <= 8.58. */
void lbr_random_gaussian(const lbr_key *key, uint64_t first, double *out,
                         size_t n);

/* One uniform value. */
double lbr_random_uniform_at(const lbr_key *key, uint64_t n);

#endif
