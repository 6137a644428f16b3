#include "base/hash.h"

#include <string.h>

#define BLOCK 64

/* FIPS PUB 180-4, 4.2.2: first 32 bits of the fractional parts of the cube
 * roots of the first 64 primes. */
static const uint32_t rounds[64] = {
    0x428a2f98, 0x71374491, 0xb5c0fbcf, 0xe9b5dba5, 0x3956c25b, 0x59f111f1,
    0x923f82a4, 0xab1c5ed5, 0xd807aa98, 0x12835b01, 0x243185be, 0x550c7dc3,
    0x72be5d74, 0x80deb1fe, 0x9bdc06a7, 0xc19bf174, 0xe49b69c1, 0xefbe4786,
    0x0fc19dc6, 0x240ca1cc, 0x2de92c6f, 0x4a7484aa, 0x5cb0a9dc, 0x76f988da,
    0x983e5152, 0xa831c66d, 0xb00327c8, 0xbf597fc7, 0xc6e00bf3, 0xd5a79147,
    0x06ca6351, 0x14292967, 0x27b70a85, 0x2e1b2138, 0x4d2c6dfc, 0x53380d13,
    0x650a7354, 0x766a0abb, 0x81c2c92e, 0x92722c85, 0xa2bfe8a1, 0xa81a664b,
    0xc24b8b70, 0xc76c51a3, 0xd192e819, 0xd6990624, 0xf40e3585, 0x106aa070,
    0x19a4c116, 0x1e376c08, 0x2748774c, 0x34b0bcb5, 0x391c0cb3, 0x4ed8aa4a,
    0x5b9cca4f, 0x682e6ff3, 0x748f82ee, 0x78a5636f, 0x84c87814, 0x8cc70208,
    0x90befffa, 0xa4506ceb, 0xbef9a3f7, 0xc67178f2};

/* 5.3.3: the same of the square roots of the first 8 primes. */
static const uint32_t start[8] = {
    0x6a09e667, 0xbb67ae85, 0x3c6ef372, 0xa54ff53a, 0x510e527f, 0x9b05688c,
    0x1f83d9ab, 0x5be0cd19};

static uint32_t turn(uint32_t x, int by) { return x >> by | x << (32 - by); }

static void schedule(const uint8_t block[BLOCK], uint32_t w[64]) {
  for (int t = 0; t < 16; t++)
    w[t] = (uint32_t)block[4 * t] << 24 | (uint32_t)block[4 * t + 1] << 16 |
           (uint32_t)block[4 * t + 2] << 8 | block[4 * t + 3];
  for (int t = 16; t < 64; t++) {
    uint32_t a = w[t - 15], b = w[t - 2];
    w[t] = w[t - 16] + (turn(a, 7) ^ turn(a, 18) ^ a >> 3) + w[t - 7] +
           (turn(b, 17) ^ turn(b, 19) ^ b >> 10);
  }
}

/* 6.2.2, with the working variables a .. h in v[0] .. v[7]. */
static void take_block(uint32_t state[8], const uint8_t block[BLOCK]) {
  uint32_t w[64], v[8];
  schedule(block, w);
  memcpy(v, state, sizeof v);
  for (int t = 0; t < 64; t++) {
    uint32_t a = v[0], e = v[4];
    uint32_t one = v[7] + (turn(e, 6) ^ turn(e, 11) ^ turn(e, 25)) +
                   ((e & v[5]) ^ (~e & v[6])) + rounds[t] + w[t];
    uint32_t two = (turn(a, 2) ^ turn(a, 13) ^ turn(a, 22)) +
                   ((a & v[1]) ^ (a & v[2]) ^ (v[1] & v[2]));
    memmove(v + 1, v, 7 * sizeof v[0]);
    v[4] += one;
    v[0] = one + two;
  }
  for (int i = 0; i < 8; i++)
    state[i] += v[i];
}

/* The last bytes, a 1 bit, zeros, and the length in bits: one or two blocks. */
static void take_rest(uint32_t state[8], const uint8_t *rest, size_t left,
                      uint64_t bytes) {
  uint8_t tail[2 * BLOCK] = {0};
  size_t blocks = left + 9 > BLOCK ? 2 : 1;
  if (left)
    memcpy(tail, rest, left);
  tail[left] = 0x80;
  for (int i = 0; i < 8; i++)
    tail[blocks * BLOCK - 1 - (size_t)i] = (uint8_t)(bytes * 8 >> 8 * i);
  for (size_t b = 0; b < blocks; b++)
    take_block(state, tail + b * BLOCK);
}

void lbr_sha256_begin(lbr_sha256_work *work) {
  memset(work, 0, sizeof *work);
  memcpy(work->state, start, sizeof start);
}

void lbr_sha256_update(lbr_sha256_work *work, const void *data, size_t n) {
  const uint8_t *bytes = data;
  size_t kept = work->bytes % BLOCK;
  work->bytes += n;
  if (kept + n < BLOCK) {
    if (n) memcpy(work->rest + kept, bytes, n);
    return;
  }
  if (kept) {
    memcpy(work->rest + kept, bytes, BLOCK - kept);
    take_block(work->state, work->rest);
    bytes += BLOCK - kept;
    n -= BLOCK - kept;
  }
  for (; n >= BLOCK; bytes += BLOCK, n -= BLOCK) take_block(work->state, bytes);
  if (n) memcpy(work->rest, bytes, n);
}

void lbr_sha256_finish(lbr_sha256_work *work, uint8_t digest[LBR_HASH_BYTES]) {
  take_rest(work->state, work->rest, work->bytes % BLOCK, work->bytes);
  for (int i = 0; i < LBR_HASH_BYTES; i++)
    digest[i] = (uint8_t)(work->state[i / 4] >> (24 - 8 * (i % 4)));
}

void lbr_sha256(const void *data, size_t n, uint8_t digest[LBR_HASH_BYTES]) {
  lbr_sha256_work work;
  lbr_sha256_begin(&work);
  lbr_sha256_update(&work, data, n);
  lbr_sha256_finish(&work, digest);
}

static void hexadecimal(const uint8_t digest[LBR_HASH_BYTES],
                        char text[LBR_HASH_TEXT]) {
  static const char hex[] = "0123456789abcdef";
  for (int i = 0; i < LBR_HASH_BYTES; i++) {
    text[2 * i] = hex[digest[i] >> 4];
    text[2 * i + 1] = hex[digest[i] & 15];
  }
  text[2 * LBR_HASH_BYTES] = '\0';
}

void lbr_sha256_finish_text(lbr_sha256_work *work, char text[LBR_HASH_TEXT]) {
  uint8_t digest[LBR_HASH_BYTES];
  lbr_sha256_finish(work, digest);
  hexadecimal(digest, text);
}

void lbr_sha256_text(const void *data, size_t n, char text[LBR_HASH_TEXT]) {
  uint8_t digest[LBR_HASH_BYTES];
  lbr_sha256(data, n, digest);
  hexadecimal(digest, text);
}
