#include "base/fraction.h"

#include <inttypes.h>
#include <math.h>
#include <stdio.h>

#include "base/text.h"

__extension__ typedef __int128 wide;
__extension__ typedef unsigned __int128 uwide;

#define MOST_DIGITS 38 /* decimal digits that fit 127 bits */

static uint64_t gcd64(uint64_t a, uint64_t b) {
  while (b) {
    uint64_t rest = a % b;
    a = b;
    b = rest;
  }
  return a;
}

static uwide gcd_wide(uwide a, uwide b) {
  while (b) {
    if (a <= UINT64_MAX && b <= UINT64_MAX)
      return gcd64((uint64_t)a, (uint64_t)b);
    uwide rest = a % b;
    a = b;
    b = rest;
  }
  return a;
}

static uwide magnitude(wide a) { return a < 0 ? -(uwide)a : (uwide)a; }

/* (negative ? -1 : 1) num / den in lowest terms, den > 0. */
static lbr_status reduced(int negative, uwide num, uwide den,
                          lbr_fraction *out) {
  uwide common = gcd_wide(num, den);
  num /= common;
  den /= common;
  if (den > INT64_MAX || num > (uwide)INT64_MAX + (negative ? 1 : 0))
    return LBR_OVERFLOW;
  out->num = negative ? (int64_t)-(wide)num : (int64_t)num;
  out->den = (int64_t)den;
  return LBR_OK;
}

static lbr_status quotient(wide num, wide den, lbr_fraction *out) {
  if (!den)
    return LBR_DOMAIN;
  return reduced((num < 0) != (den < 0) && num, magnitude(num), magnitude(den),
                 out);
}

lbr_status lbr_fraction_make(int64_t num, int64_t den, lbr_fraction *out) {
  return quotient(num, den, out);
}

lbr_status lbr_fraction_add(lbr_fraction a, lbr_fraction b,
                            lbr_fraction *out) {
  return quotient((wide)a.num * b.den + (wide)b.num * a.den,
                  (wide)a.den * b.den, out);
}

lbr_status lbr_fraction_sub(lbr_fraction a, lbr_fraction b,
                            lbr_fraction *out) {
  return quotient((wide)a.num * b.den - (wide)b.num * a.den,
                  (wide)a.den * b.den, out);
}

lbr_status lbr_fraction_mul(lbr_fraction a, lbr_fraction b,
                            lbr_fraction *out) {
  return quotient((wide)a.num * b.num, (wide)a.den * b.den, out);
}

lbr_status lbr_fraction_div(lbr_fraction a, lbr_fraction b,
                            lbr_fraction *out) {
  return quotient((wide)a.num * b.den, (wide)a.den * b.num, out);
}

lbr_status lbr_fraction_gcd(lbr_fraction a, lbr_fraction b,
                            lbr_fraction *out) {
  uwide common = gcd_wide(magnitude((wide)a.num * b.den),
                          magnitude((wide)b.num * a.den));
  return reduced(0, common, (uwide)a.den * (uwide)b.den, out);
}

int lbr_fraction_compare(lbr_fraction a, lbr_fraction b) {
  wide left = (wide)a.num * b.den, right = (wide)b.num * a.den;
  return (left > right) - (left < right);
}

int64_t lbr_fraction_floor(lbr_fraction a) {
  int64_t whole = a.num / a.den;
  return whole - (a.num % a.den < 0);
}

int64_t lbr_fraction_round(lbr_fraction a) {
  uint64_t rest = (uint64_t)(a.num % a.den < 0 ? -(a.num % a.den)
                                               : a.num % a.den);
  int up = rest >= (uint64_t)a.den - rest && rest;
  return a.num / a.den + (up ? (a.num < 0 ? -1 : 1) : 0);
}

static int bits(uint64_t a) { return 64 - __builtin_clzll(a); }

double lbr_fraction_to_double(lbr_fraction a) {
  if (!a.num)
    return 0;
  uint64_t num = (uint64_t)magnitude(a.num), den = (uint64_t)a.den;
  /* a quotient of 63 or 64 bits whose last bit also stands for all that
   * follows: the one rounding is the conversion to double */
  int shift = 63 - bits(num) + bits(den);
  uwide scaled = (uwide)num << shift;
  uint64_t whole = (uint64_t)(scaled / den);
  if (scaled % den)
    whole |= 1;
  double size = ldexp((double)whole, -shift);
  return a.num < 0 ? -size : size;
}

/* An unreduced decimal: digits * 10^exponent. */
typedef struct decimal {
  uwide digits;   /* at most MOST_DIGITS digits */
  long exponent;  /* power of ten */
  int negative;
} decimal;

static uwide power_of_ten(long exponent) {
  uwide power = 1;
  while (exponent-- > 0)
    power *= 10;
  return power;
}

/* digits / 10^places: every factor of ten cancels in the digits or goes below
 * the bar, so the loop ends within a few hundred turns whatever places is. */
static lbr_status below_point(decimal d, lbr_fraction *out) {
  uwide den = 1;
  for (long places = -d.exponent; places > 0; places--) {
    if (d.digits % 5 == 0)
      d.digits /= 5;
    else
      den *= 5;
    if (d.digits % 2 == 0)
      d.digits /= 2;
    else
      den *= 2;
    if (den > INT64_MAX)
      return LBR_OVERFLOW;
  }
  return reduced(d.negative, d.digits, den, out);
}

static lbr_status from_decimal(decimal d, lbr_fraction *out) {
  const uwide most = (uwide)INT64_MAX + 1;
  if (!d.digits)
    return quotient(0, 1, out);
  if (d.exponent < 0)
    return below_point(d, out);
  for (; d.exponent > 0 && d.digits <= most; d.exponent--)
    d.digits *= 10;
  return d.exponent ? LBR_OVERFLOW : reduced(d.negative, d.digits, 1, out);
}

lbr_status lbr_fraction_from_double_shortest(double x, lbr_fraction *out) {
  if (!isfinite(x))
    return LBR_DOMAIN;
  lbr_digits shortest = lbr_shortest_digits(x);
  decimal d = {shortest.digits, shortest.exponent, x < 0};
  return from_decimal(d, out);
}

/* Appends one digit; zeros wait until a digit that is not follows them. */
static lbr_status take_digit(decimal *d, int *count, long *zeros, int digit) {
  if (!digit) {
    *zeros += d->digits != 0;
    return LBR_OK;
  }
  if (*count + *zeros + 1 > MOST_DIGITS)
    return LBR_OVERFLOW;
  *count += (int)*zeros + 1;
  d->digits = d->digits * power_of_ten(*zeros + 1) + (uwide)digit;
  *zeros = 0;
  return LBR_OK;
}

static long read_exponent(const char *text, size_t n) {
  size_t i = n && (text[0] == '-' || text[0] == '+');
  long value = 0;
  for (; i < n && value < 100000; i++)
    value = value * 10 + (text[i] - '0');
  return text[0] == '-' ? -value : value;
}

/* text[0 .. n) is known to be a decimal number. */
static lbr_status read_decimal(const char *text, size_t n, decimal *d) {
  size_t i = text[0] == '-' || text[0] == '+';
  int count = 0, after_point = 0;
  long zeros = 0, places = 0;
  *d = (decimal){0, 0, text[0] == '-'};
  for (; i < n && text[i] != 'e' && text[i] != 'E'; i++) {
    if (text[i] == '.') {
      after_point = 1;
      continue;
    }
    places += after_point;
    lbr_status status = take_digit(d, &count, &zeros, text[i] - '0');
    if (status)
      return status;
  }
  d->exponent = zeros - places;
  if (i < n)
    d->exponent += read_exponent(text + i + 1, n - i - 1);
  return LBR_OK;
}

static lbr_status read_part(const char *text, size_t n, lbr_fraction *out) {
  decimal d;
  lbr_status status = read_decimal(text, n, &d);
  return status ? status : from_decimal(d, out);
}

lbr_status lbr_fraction_parse(const char *text, size_t n, lbr_fraction *out) {
  lbr_fraction above, below;
  size_t length = lbr_decimal_length(text, n);
  if (!length)
    return LBR_FORMAT;
  if (length < n) {
    const char *rest = text + length + 1;
    size_t left = n - length - 1;
    if (text[length] != '/' || !left || lbr_decimal_length(rest, left) != left)
      return LBR_FORMAT;
    lbr_status status = read_part(rest, left, &below);
    if (status)
      return status;
  } else {
    below = (lbr_fraction){1, 1};
  }
  lbr_status status = read_part(text, length, &above);
  return status ? status : lbr_fraction_div(above, below, out);
}

void lbr_fraction_text(lbr_fraction a, char text[LBR_FRACTION_TEXT]) {
  if (a.den == 1)
    snprintf(text, LBR_FRACTION_TEXT, "%" PRId64, a.num);
  else
    snprintf(text, LBR_FRACTION_TEXT, "%" PRId64 "/%" PRId64, a.num, a.den);
}
