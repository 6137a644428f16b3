#include "base/decimal.h"

#include <float.h>
#include <math.h>
#include <stdint.h>
#include <string.h>

#define MOST_DIGITS 19 /* that any 64-bit integer holds */
#define MOST_POWER 27  /* 10^27 = 2^27 5^27, and 5^27 < 2^64 */

/* The number before its power of ten is applied. */
typedef struct parts {
  uint64_t digits;
  int count;     /* significant digits in `digits` */
  int64_t power; /* of ten */
  bool negative;
} parts;

static unsigned digit(const char *p) { return (unsigned)*p - (unsigned)'0'; }

/* Whether all of 8 characters are digits: adding 6 to those beyond '9' and
 * keeping the high half-bytes shows both sides of the range. */
static bool eight_digits(uint64_t x) {
  return ((x & (x + 0x0606060606060606u)) & 0xf0f0f0f0f0f0f0f0u) ==
         0x3030303030303030u;
}

/* Their value: pairs, then fours, then all eight, in one word each. */
static uint32_t eight_value(uint64_t x) {
  x -= 0x3030303030303030u;
  x = x * 10 + (x >> 8);
  x = ((x & 0x000000ff000000ffu) * 0x000f424000000064u +
       ((x >> 16) & 0x000000ff000000ffu) * 0x0000271000000001u) >> 32;
  return (uint32_t)x;
}

/* Digits of a number below 10^8; 0 has none. */
static int length(uint32_t value) {
  int count = 8;
  for (uint32_t top = 10000000; top > value; top /= 10) count--;
  return count;
}

static const char *take_digits(const char *p, const char *end, parts *n) {
#if __BYTE_ORDER__ == __ORDER_LITTLE_ENDIAN__
  for (uint64_t word; end - p >= 8 && n->count <= MOST_DIGITS; p += 8) {
    memcpy(&word, p, sizeof word);
    if (!eight_digits(word)) break;
    uint32_t value = eight_value(word);
    n->count += n->digits ? 8 : length(value);
    n->digits = n->digits * 100000000 + value;
  }
#endif
  for (; p < end && digit(p) < 10; p++) {
    n->digits = n->digits * 10 + digit(p);
    n->count += n->digits != 0;
  }
  return p;
}

static const char *take_power(const char *p, const char *end, parts *n) {
  const char *q = p + 1;
  bool negative = q < end && *q == '-';
  int64_t power = 0;
  if (q < end && (*q == '-' || *q == '+')) q++;
  if (q == end || digit(q) > 9) return p; /* an 'e' that is no exponent */
  for (; q < end && digit(q) < 10; q++)
    if (power < 100000) power = power * 10 + digit(q);
  n->power += negative ? -power : power;
  return q;
}

/* The end of the number, or NULL. */
static const char *split(const char *p, const char *end, parts *n) {
  *n = (parts){0};
  if (p < end && (*p == '-' || *p == '+')) n->negative = *p++ == '-';
  const char *from = p, *point;
  p = take_digits(p, end, n);
  point = p;
  if (p < end && *p == '.') {
    p = take_digits(p + 1, end, n);
    if (p - from == 1) return NULL;
    n->power = point + 1 - p;
  }
  if (p == from) return NULL;
  if (p < end && (*p == 'e' || *p == 'E')) p = take_power(p, end, n);
  return p;
}

/* Exact doubles all. */
static const double ten[] = {1e0,  1e1,  1e2,  1e3,  1e4,  1e5,  1e6,  1e7,
                             1e8,  1e9,  1e10, 1e11, 1e12, 1e13, 1e14, 1e15,
                             1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22};

/* Digits below 2^53 and powers to 10^22 are exact doubles, so that one
 * operation rounds once. */
static bool by_double(const parts *n, double *out) {
  if (n->digits > (uint64_t)1 << 53 || n->power < -22 || n->power > 22)
    return false;
  double x = (double)n->digits;
  *out = n->power < 0 ? x / ten[-n->power] : x * ten[n->power];
  return true;
}

#if LDBL_MANT_DIG == 64 && defined(__x86_64__)
static const long double ten_long[MOST_POWER + 1] = {
    1e0L,  1e1L,  1e2L,  1e3L,  1e4L,  1e5L,  1e6L,  1e7L,  1e8L,  1e9L,
    1e10L, 1e11L, 1e12L, 1e13L, 1e14L, 1e15L, 1e16L, 1e17L, 1e18L, 1e19L,
    1e20L, 1e21L, 1e22L, 1e23L, 1e24L, 1e25L, 1e26L, 1e27L};

static long double scaled(long double x, int64_t power) {
  return power < 0 ? x / ten_long[-power] : x * ten_long[power];
}

/* The same with 64 bits: the quotient or product is off by half of its last
 * bit at most, so rounding it on to 53 bits is right unless it stands on the
 * tie between two doubles. */
static bool by_long_double(const parts *n, double *out) {
  if (n->power < -MOST_POWER || n->power > MOST_POWER) return false;
  long double x = scaled((long double)n->digits, n->power);
  uint64_t bits;
  memcpy(&bits, &x, sizeof bits);
  *out = (double)x;
  return (bits & 0x7ff) != 0x400;
}

enum verdict { GIVE_UP, NO, YES };

/* Whether the `count` digits nearest to x read back as x; gives up where it
 * cannot be sure which they are. */
static enum verdict try_count(double x, int count, int above, lbr_digits *out) {
  parts n = {.power = above - count};
  double back;
  if (n.power < -MOST_POWER || n.power > MOST_POWER) return GIVE_UP;
  long double y = scaled((long double)x, -n.power), whole = rintl(y);
  if (y < ten_long[count - 1] || y >= ten_long[count]) return GIVE_UP;
  if (count > 15 && fabsl(fabsl(y - whole) - 0.5L) < 0.01L) return GIVE_UP;
  n.digits = (uint64_t)whole;
  if (!by_double(&n, &back) && !by_long_double(&n, &back)) return GIVE_UP;
  *out = (lbr_digits){n.digits, count, (int)n.power};
  return back == x ? YES : NO;
}

/* A number of 15 digits that reads back is the only one; of 16 or 17 digits
 * the nearest reads back if any does, but at powers of two, where the gap is
 * wider above than below. */
bool lbr_digits_quickly(double x, lbr_digits *out) {
  enum verdict found = NO;
  lbr_digits d;
  int two;
  if (!(x > 1e-10 && x < 1e25) || frexp(x, &two) == 0.5) return false;
  int above = (int)floor(log10(x)) + 1; /* digits before the point */
  for (int count = 15; count <= 17 && found == NO; count++)
    found = try_count(x, count, above, &d);
  if (found != YES) return false;
  for (; d.digits % 10 == 0; d.digits /= 10) {
    d.count--;
    d.exponent++;
  }
  if (d.count > 17) return false;
  *out = d;
  return true;
}
#else
bool lbr_digits_quickly(double x, lbr_digits *out) {
  (void)x, (void)out;
  return false;
}

static bool by_long_double(const parts *n, double *out) {
  (void)n, (void)out;
  return false;
}
#endif

/* Numbers of at most 15 digits without an exponent, which are most; NULL for
 * all others.  Both operands are exact, so that the quotient is right. */
static const char *take_short(const char *p, const char *end, double *out) {
  bool negative = p < end && *p == '-';
  uint64_t value = 0;
  const char *from = p += negative, *point = NULL;
  for (; p < end; p++) {
    unsigned d = digit(p);
    if (d < 10)
      value = value * 10 + d;
    else if (*p == '.' && !point)
      point = p;
    else
      break;
    if (p - from > 15) return NULL;
  }
  size_t digits = (size_t)(p - from) - (point != NULL);
  if (digits == 0 || digits > 15 || (p < end && (*p == 'e' || *p == 'E')))
    return NULL;
  double x = (double)value / (point ? ten[p - point - 1] : 1.0);
  *out = negative ? -x : x;
  return p;
}

const char *lbr_decimal(const char *p, const char *end, double *out) {
  const char *next = take_short(p, end, out);
  if (next) return next;
  parts n;
  double value;
  const char *behind = split(p, end, &n);
  if (!behind) return NULL;
  if (n.count > MOST_DIGITS || (!by_double(&n, &value) &&
                                !by_long_double(&n, &value))) {
    if (lbr_number_read(p, (size_t)(behind - p), out) != LBR_OK) return NULL;
    return behind;
  }
  *out = n.negative ? -value : value;
  return behind;
}
