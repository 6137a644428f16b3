/* Content hash: SHA-256 (FIPS PUB 180-4). */
#ifndef LBR_BASE_HASH_H
#define LBR_BASE_HASH_H

#include <stddef.h>
#include <stdint.h>

#define LBR_HASH_BYTES 32
#define LBR_HASH_TEXT (2 * LBR_HASH_BYTES + 1)

/* A digest in the making: begun, given bytes any number of times, finished. */
typedef struct lbr_sha256_work {
  uint32_t state[8];
  uint64_t bytes;      /* taken so far */
  uint8_t rest[64];    /* bytes % 64 of them, not yet mixed in */
} lbr_sha256_work;

void lbr_sha256_begin(lbr_sha256_work *work);
void lbr_sha256_update(lbr_sha256_work *work, const void *data, size_t n);
void lbr_sha256_finish(lbr_sha256_work *work, uint8_t digest[LBR_HASH_BYTES]);

/* The same finish as lower-case hexadecimal with a NUL behind. */
void lbr_sha256_finish_text(lbr_sha256_work *work, char text[LBR_HASH_TEXT]);

/* Digest of n bytes. */
void lbr_sha256(const void *data, size_t n, uint8_t digest[LBR_HASH_BYTES]);

/* The same as lower-case hexadecimal with a NUL behind. */
void lbr_sha256_text(const void *data, size_t n, char text[LBR_HASH_TEXT]);

#endif
