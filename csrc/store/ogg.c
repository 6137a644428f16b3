#include "store/ogg.h"

#include <stdbool.h>
#include <string.h>
#include <unistd.h>

#define HEAD 27
#define MOST_PAGE (HEAD + 255 + 255 * 255)
#define LAST_PAGE 4 /* bit of the page's flags */

typedef struct page {
  unsigned char bytes[MOST_PAGE];
  size_t length;
} page;

static uint32_t little(const unsigned char *bytes) {
  return (uint32_t)bytes[0] | (uint32_t)bytes[1] << 8 |
         (uint32_t)bytes[2] << 16 | (uint32_t)bytes[3] << 24;
}

/* The polynomial 04C11DB7, high bit first, starting from 0 (RFC 3533). */
static void make_table(uint32_t table[256]) {
  for (uint32_t i = 0; i < 256; i++) {
    uint32_t r = i << 24;
    for (int bit = 0; bit < 8; bit++)
      r = r << 1 ^ (r & 0x80000000u ? 0x04c11db7u : 0u);
    table[i] = r;
  }
}

/* Over the page with its checksum field taken as zero. */
static uint32_t checksum(const uint32_t table[256], const page *p) {
  uint32_t r = 0;
  for (size_t i = 0; i < p->length; i++) {
    unsigned char byte = i >= 22 && i < 26 ? 0 : p->bytes[i];
    r = r << 8 ^ table[(r >> 24 ^ byte) & 255u];
  }
  return r;
}

/* Reads the page at an offset; false where there is no whole page. */
static bool read_page(int fd, int64_t at, int64_t size, page *p) {
  int64_t left = size - at;
  size_t most = left < MOST_PAGE ? (size_t)left : MOST_PAGE;
  ssize_t got = pread(fd, p->bytes, most, (off_t)at);
  if (got < HEAD || memcmp(p->bytes, "OggS", 4) != 0) return false;
  size_t there = (size_t)got, segments = p->bytes[26];
  p->length = HEAD + segments;
  if (p->length > there) return false;
  for (size_t i = 0; i < segments; i++) p->length += p->bytes[HEAD + i];
  return p->length <= there;
}

lbr_status lbr_ogg_check(int fd, int64_t size, lbr_why *why) {
  uint32_t table[256], serial = 0;
  page p;
  bool ended = false;
  make_table(table);
  int64_t at = 0;
  for (uint32_t number = 0; at < size; number++, at += (int64_t)p.length) {
    if (ended)
      return lbr_because(why, LBR_FORMAT, "goes on after its last page");
    if (!read_page(fd, at, size, &p) ||
        checksum(table, &p) != little(p.bytes + 22))
      return lbr_because(why, LBR_FORMAT,
                         "is damaged or cut off in the page at byte %lld",
                         (long long)at);
    if (number == 0) serial = little(p.bytes + 14);
    if (little(p.bytes + 14) != serial)
      return lbr_because(why, LBR_FORMAT, "holds more than one stream");
    if (little(p.bytes + 18) != number)
      return lbr_because(why, LBR_FORMAT, "lacks the page before byte %lld",
                         (long long)at);
    ended = p.bytes[5] & LAST_PAGE;
  }
  return ended ? LBR_OK
               : lbr_because(why, LBR_FORMAT,
                             "is cut off: its last page is not marked so");
}
