#include "base/text.h"

#include <inttypes.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/decimal.h"

#define LONGEST 400

static int is_digit(char c) { return c >= '0' && c <= '9'; }

/* Digits and exponent out of "d?ddd...e+xx" with whatever point the locale
 * puts in: only digits before the 'e' count. */
static lbr_digits from_scientific(const char *text) {
  lbr_digits out = {0, 0, 0};
  const char *c = text;
  for (; *c && *c != 'e'; c++)
    if (is_digit(*c)) {
      out.digits = out.digits * 10 + (uint64_t)(*c - '0');
      out.count++;
    }
  out.exponent = (*c ? (int)strtol(c + 1, NULL, 10) : 0) - (out.count - 1);
  return out;
}

static lbr_digits without_zeros(lbr_digits d) {
  while (d.count > 1 && d.digits % 10 == 0) {
    d.digits /= 10;
    d.count--;
    d.exponent++;
  }
  return d;
}

static int reads_back(lbr_digits d, double x) {
  char text[48];
  /* no point in it, so no locale either */
  snprintf(text, sizeof text, "%" PRIu64 "e%d", d.digits, d.exponent);
  return strtod(text, NULL) == x;
}

lbr_digits lbr_shortest_digits(double x) {
  char text[64];
  lbr_digits d = {0, 1, 0};
  x = fabs(x);
  if (x == 0 || !isfinite(x))
    return d;
  if (lbr_digits_quickly(x, &d))
    return d;
  for (int count = x < 2.3e-308 ? 1 : 15; count <= 17; count++) {
    snprintf(text, sizeof text, "%.*e", count - 1, x);
    d = from_scientific(text);
    if (reads_back(d, x))
      break;
    /* Just above a power of two the gap is wider than below it: the next
     * decimal up may read back although the nearest one does not. */
    lbr_digits up = d;
    up.digits++;
    if (count < 17 && reads_back(up, x)) {
      d = up;
      break;
    }
  }
  return without_zeros(d);
}

static char *put_zeros(char *to, int count) {
  while (count-- > 0)
    *to++ = '0';
  return to;
}

/* Digits with the point `before` digits in (0 < before, or leading zeros). */
static char *put_fixed(char *to, const char *digits, int count, int before) {
  if (before <= 0) {
    *to++ = '0';
    *to++ = '.';
    to = put_zeros(to, -before);
    memcpy(to, digits, (size_t)count);
    return to + count;
  }
  int whole = before < count ? before : count;
  memcpy(to, digits, (size_t)whole);
  to = put_zeros(to + whole, before - whole);
  if (count > whole) {
    *to++ = '.';
    memcpy(to, digits + whole, (size_t)(count - whole));
    to += count - whole;
  }
  return to;
}

void lbr_number_text(double x, char text[LBR_NUMBER_TEXT]) {
  char digits[24];
  char *to = text;
  if (isnan(x)) {
    memcpy(text, "nan", 4);
    return;
  }
  if (signbit(x))
    *to++ = '-';
  if (isinf(x)) {
    memcpy(to, "inf", 4);
    return;
  }
  lbr_digits d = lbr_shortest_digits(x);
  snprintf(digits, sizeof digits, "%" PRIu64, d.digits);
  int before = d.count + d.exponent;
  if (before > -5 && before <= 15) {
    to = put_fixed(to, digits, d.count, before);
  } else {
    to = put_fixed(to, digits, d.count, 1);
    to += snprintf(to, 8, "e%+03d", before - 1);
  }
  *to = '\0';
}

static size_t digits_at(const char *text, size_t n, size_t i) {
  size_t start = i;
  while (i < n && is_digit(text[i]))
    i++;
  return i - start;
}

size_t lbr_decimal_length(const char *text, size_t n) {
  size_t i = n && (text[0] == '-' || text[0] == '+');
  size_t whole = digits_at(text, n, i), part = 0;
  i += whole;
  if (i < n && text[i] == '.') {
    part = digits_at(text, n, i + 1);
    if (part || whole)
      i += 1 + part;
  }
  if (!whole && !part)
    return 0;
  if (i < n && (text[i] == 'e' || text[i] == 'E')) {
    size_t sign = i + 1 < n && (text[i + 1] == '-' || text[i + 1] == '+');
    size_t power = digits_at(text, n, i + 1 + sign);
    if (power)
      i += 1 + sign + power;
  }
  return i;
}

lbr_status lbr_number_read(const char *text, size_t n, double *out) {
  char copy[LONGEST + 16], point[16];
  if (!n || lbr_decimal_length(text, n) != n)
    return LBR_FORMAT;
  if (n > LONGEST)
    return LBR_OVERFLOW;
  /* what the running locale writes between the digits of 0.5 */
  int length = snprintf(point, sizeof point, "%.1f", 0.5) - 2;
  size_t width = length > 0 && length < 8 ? (size_t)length : 1;
  const char *dot = memchr(text, '.', n);
  size_t head = dot ? (size_t)(dot - text) : n;
  memcpy(copy, text, head);
  char *to = copy + head;
  if (dot) {
    memcpy(to, point + 1, width);
    memcpy(to + width, dot + 1, n - head - 1);
    to += width + n - head - 1;
  }
  *to = '\0';
  double value = strtod(copy, NULL);
  if (isinf(value))
    return LBR_OVERFLOW;
  *out = value;
  return LBR_OK;
}
