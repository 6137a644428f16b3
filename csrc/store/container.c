#include "store/container.h"

#include <stdbool.h>
#include <string.h>
#include <unistd.h>

#include "store/ogg.h"

#define MOST_CHUNKS 4096

typedef struct source {
  int fd;
  int64_t size; /* bytes in the file */
} source;

static bool read_at(source s, int64_t offset, void *out, size_t n) {
  return offset >= 0 && offset <= s.size - (int64_t)n &&
         pread(s.fd, out, n, (off_t)offset) == (ssize_t)n;
}

static uint64_t little(const unsigned char *bytes, int n) {
  uint64_t value = 0;
  for (int i = n; i-- > 0;) value = value << 8 | bytes[i];
  return value;
}

/* What a walk through the chunks has found so far. */
typedef struct walk {
  lbr_layout *layout;   /* filled when the data have been checked */
  uint64_t frame_bytes; /* from the fmt chunk, 0: not seen */
  uint64_t data_64;     /* from the ds64 chunk */
  bool has_64;
} walk;

static lbr_status check_data(source s, const walk *w, int64_t start,
                             uint64_t claimed, lbr_why *why) {
  uint64_t there = (uint64_t)(s.size - start);
  if (w->frame_bytes == 0)
    return lbr_because(why, LBR_FORMAT, "has no frame size before its data");
  if (claimed == UINT32_MAX && !w->has_64)
    return lbr_because(why, LBR_FORMAT, "does not state its length");
  if (claimed > there)
    return lbr_because(why, LBR_FORMAT,
                       "claims %llu bytes of samples, but only %llu are there",
                       (unsigned long long)claimed, (unsigned long long)there);
  if (claimed % w->frame_bytes)
    return lbr_because(why, LBR_FORMAT,
                       "claims %llu bytes of samples, which is no whole "
                       "number of frames of %llu bytes",
                       (unsigned long long)claimed,
                       (unsigned long long)w->frame_bytes);
  *w->layout = (lbr_layout){start, (int64_t)claimed, (int64_t)w->frame_bytes};
  return LBR_OK;
}

static lbr_status no_data(lbr_why *why) {
  return lbr_because(why, LBR_FORMAT, "ends before its samples begin");
}

/* RIFF and RF64: chunks of id, 32-bit size, data, padded to even length. */
static lbr_status check_riff(source s, bool wide, lbr_layout *layout,
                             lbr_why *why) {
  walk w = {layout, 0, 0, false};
  int64_t at = 12;
  for (int i = 0; i < MOST_CHUNKS; i++) {
    unsigned char head[8], body[24];
    if (!read_at(s, at, head, sizeof head)) return no_data(why);
    uint64_t length = little(head + 4, 4);
    at += 8;
    if (memcmp(head, "data", 4) == 0) {
      bool long_form = wide && w.has_64 && length == UINT32_MAX;
      return check_data(s, &w, at, long_form ? w.data_64 : length, why);
    }
    if (memcmp(head, "fmt ", 4) == 0 && read_at(s, at, body, 16))
      w.frame_bytes = little(body + 12, 2);
    if (memcmp(head, "ds64", 4) == 0 && read_at(s, at, body, 16)) {
      w.data_64 = little(body + 8, 8);
      w.has_64 = true;
    }
    at += (int64_t)(length + length % 2);
  }
  return no_data(why);
}

/* Wave64: 16-byte identifiers that begin with the RIFF names, 64-bit sizes
 * that count the 24 bytes of the chunk's own head, padded to 8 bytes. */
static lbr_status check_wave64(source s, lbr_layout *layout, lbr_why *why) {
  walk w = {layout, 0, 0, true};
  int64_t at = 40;
  for (int i = 0; i < MOST_CHUNKS; i++) {
    unsigned char head[24], body[16];
    if (!read_at(s, at, head, sizeof head)) return no_data(why);
    uint64_t length = little(head + 16, 8);
    if (length < 24) return no_data(why);
    if (memcmp(head, "data", 4) == 0)
      return check_data(s, &w, at + 24, length - 24, why);
    if (memcmp(head, "fmt ", 4) == 0 && read_at(s, at + 24, body, 16))
      w.frame_bytes = little(body + 12, 2);
    if (length > (uint64_t)s.size) return no_data(why);
    at += (int64_t)((length + 7) & ~(uint64_t)7);
  }
  return no_data(why);
}

lbr_status lbr_container_check(int fd, int64_t size, lbr_layout *layout,
                               lbr_why *why) {
  source s = {fd, size};
  unsigned char head[12];
  *layout = (lbr_layout){0, 0, 0};
  if (!read_at(s, 0, head, sizeof head))
    return lbr_because(why, LBR_FORMAT, "is too short for a sound file");
  if (memcmp(head, "RIFF", 4) == 0) return check_riff(s, false, layout, why);
  if (memcmp(head, "RF64", 4) == 0 || memcmp(head, "BW64", 4) == 0)
    return check_riff(s, true, layout, why);
  if (memcmp(head, "riff", 4) == 0) return check_wave64(s, layout, why);
  if (memcmp(head, "OggS", 4) == 0) return lbr_ogg_check(fd, size, why);
  return LBR_OK;
}
