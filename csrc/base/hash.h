/* Content hash: SHA-256 (FIPS PUB 180-4). */
#ifndef LBR_BASE_HASH_H
#define LBR_BASE_HASH_H

#include <stddef.h>
#include <stdint.h>

#define LBR_HASH_BYTES 32
#define LBR_HASH_TEXT (2 * LBR_HASH_BYTES + 1)

/* Digest of n bytes. */
void lbr_sha256(const void *data, size_t n, uint8_t digest[LBR_HASH_BYTES]);

/* The same as lower-case hexadecimal with a NUL behind. */
void lbr_sha256_text(const void *data, size_t n, char text[LBR_HASH_TEXT]);

#endif
