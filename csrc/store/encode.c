#include "store/encode.h"

#include <float.h>
#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <string.h>

#include "base/text.h"

/* Whole numbers, which codes are, without the search for digits. */
static size_t number(double x, char text[LBR_NUMBER_TEXT]) {
  if (x == rint(x) && fabs(x) < 1e9 && !(x == 0 && signbit(x))) {
    char digits[12];
    unsigned long whole = (unsigned long)fabs(x);
    size_t n = 0, at = 0;
    do digits[n++] = (char)('0' + whole % 10);
    while ((whole /= 10) > 0);
    if (x < 0) text[at++] = '-';
    while (n > 0) text[at++] = digits[--n];
    return at;
  }
  lbr_number_text(x, text);
  return strlen(text);
}

lbr_status lbr_draft_rows(lbr_draft *d, const lbr_rows_out *o, lbr_why *why) {
  char text[LBR_NUMBER_TEXT + 1];
  size_t start = o->rate_over > 0 ? 0 : 1;
  for (size_t i = 0; i < o->rows; i++) {
    double time = ((double)o->first + (double)i) * (double)o->rate_under /
                  (double)(o->rate_over > 0 ? o->rate_over : 1);
    for (size_t k = start; k <= o->columns; k++) {
      size_t n = number(k == 0 ? time : o->column[k - 1][i], text);
      text[n++] = k == o->columns ? '\n' : o->separator;
      lbr_status status = lbr_draft_put(d, text, n, why);
      if (status != LBR_OK) return status;
    }
  }
  return LBR_OK;
}

/* "-1.95313e-05" right-aligned, 'E', and a point whatever the locale says. */
static bool column(double x, int width, int digits, char *text) {
  char plain[64];
  int n = snprintf(plain, sizeof plain, "%.*e", digits, x);
  char *point = plain + (plain[0] == '-') + 1;
  char *end = strchr(plain, 'e');
  if (!isfinite(x) || !end) return false;
  /* the locale's point may be several bytes */
  char *part = end - digits;
  *point = '.';
  memmove(point + 1, part, (size_t)(plain + n - part) + 1);
  n = (int)strlen(plain);
  *strchr(plain, 'e') = 'E';
  if (n >= width) return false; /* a blank must stand before the next */
  memset(text, ' ', (size_t)(width - n));
  memcpy(text + width - n, plain, (size_t)n);
  return true;
}

lbr_status lbr_draft_columns(lbr_draft *d, const double *x, size_t n, int width,
                             int digits, size_t per_line, lbr_why *why) {
  char text[64];
  for (size_t i = 0; i < n; i++) {
    if (width > 60 || !column(x[i], width, digits, text))
      return lbr_because(why, LBR_DOMAIN, "cannot hold %g in %d columns", x[i],
                         width);
    size_t length = (size_t)width;
    if ((i + 1) % per_line == 0 || i + 1 == n) text[length++] = '\n';
    lbr_status status = lbr_draft_put(d, text, length, why);
    if (status != LBR_OK) return status;
  }
  return LBR_OK;
}

static void put_bytes(unsigned char *to, uint64_t bits, int bytes, bool big) {
  for (int b = 0; b < bytes; b++)
    to[big ? bytes - 1 - b : b] = (unsigned char)(bits >> 8 * b);
}

static bool fits(const lbr_coding *c, double x) {
  double top = ldexp(1.0, c->is_unsigned ? c->bits : c->bits - 1);
  if (!c->is_integer)
    return c->bits == 64 || !isfinite(x) || fabs(x) <= (double)FLT_MAX;
  return x == rint(x) && x >= (c->is_unsigned ? 0.0 : -top) && x < top;
}

static uint64_t code(const lbr_coding *c, double x) {
  uint64_t bits = 0;
  uint32_t half = 0;
  if (c->is_integer) return (uint64_t)(int64_t)x;
  if (c->bits == 64) {
    memcpy(&bits, &x, sizeof bits);
    return bits;
  }
  float small = (float)x;
  memcpy(&half, &small, sizeof half);
  return half;
}

lbr_status lbr_draft_frames(lbr_draft *d, const lbr_coding *coding,
                            const double *const *channel, const double *scale,
                            size_t channels, size_t frames, lbr_why *why) {
  unsigned char bytes[8];
  int size = coding->bits / 8;
  for (size_t i = 0; i < frames; i++)
    for (size_t k = 0; k < channels; k++) {
      double x = channel[k][i] * scale[k] + coding->zero;
      if (!fits(coding, x))
        return lbr_because(why, LBR_DOMAIN, "cannot hold %g, of channel %zu, "
                           "in %s of %d bits", channel[k][i] * scale[k], k + 1,
                           coding->is_integer ? "integers" : "floats",
                           coding->bits);
      put_bytes(bytes, code(coding, x), size, coding->is_big);
      lbr_status status = lbr_draft_put(d, bytes, (size_t)size, why);
      if (status != LBR_OK) return status;
    }
  return LBR_OK;
}
