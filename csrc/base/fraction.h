/* Exact fractions of 64-bit integers.
 *
 * Every operation is carried out in 128 bits and reduced before it is judged,
 * so LBR_OVERFLOW means that the reduced result itself does not fit, never
 * that an intermediate product was too long.
 */
#ifndef LBR_BASE_FRACTION_H
#define LBR_BASE_FRACTION_H

#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

typedef struct lbr_fraction {
  int64_t num; /* numerator, carries the sign */
  int64_t den; /* denominator, > 0, no factor in common with num */
} lbr_fraction;

/* Longest text of a fraction: two signed 64-bit integers, a bar, a NUL. */
#define LBR_FRACTION_TEXT 44

/* num / den in lowest terms; LBR_DOMAIN when den is 0. */
LBR_CHECKED lbr_status lbr_fraction_make(int64_t num, int64_t den,
                                         lbr_fraction *out);

LBR_CHECKED lbr_status lbr_fraction_add(lbr_fraction a, lbr_fraction b,
                                        lbr_fraction *out);
LBR_CHECKED lbr_status lbr_fraction_sub(lbr_fraction a, lbr_fraction b,
                                        lbr_fraction *out);
LBR_CHECKED lbr_status lbr_fraction_mul(lbr_fraction a, lbr_fraction b,
                                        lbr_fraction *out);

/* a / b; LBR_DOMAIN when b is 0. */
LBR_CHECKED lbr_status lbr_fraction_div(lbr_fraction a, lbr_fraction b,
                                        lbr_fraction *out);

/* Largest fraction of which a and b are both whole multiples, >= 0; the gcd of
 * 0 and x is |x|. */
LBR_CHECKED lbr_status lbr_fraction_gcd(lbr_fraction a, lbr_fraction b,
                                        lbr_fraction *out);

/* -1, 0 or 1 as a is less than, equal to or greater than b. */
int lbr_fraction_compare(lbr_fraction a, lbr_fraction b);

/* Largest integer <= a. */
int64_t lbr_fraction_floor(lbr_fraction a);

/* Nearest integer, halves away from zero. */
int64_t lbr_fraction_round(lbr_fraction a);

/* Nearest double, correctly rounded (ties to even). */
double lbr_fraction_to_double(lbr_fraction a);

/* The shortest decimal that reads back as x: 0.3 is 3/10.  LBR_DOMAIN for
 * infinities and NaN, LBR_OVERFLOW when the decimal does not fit. */
LBR_CHECKED lbr_status lbr_fraction_from_double_shortest(double x,
                                                         lbr_fraction *out);

/* Exact value of n characters: a decimal ("12.288e6", "-.5") or a quotient of
 * two ("7/2", "1.5/3").  The point is always '.', whatever the locale.
 * LBR_FORMAT, LBR_DOMAIN (divided by 0) or LBR_OVERFLOW, which here also means
 * a part of a quotient that does not fit or more than 38 significant digits. */
LBR_CHECKED lbr_status lbr_fraction_parse(const char *text, size_t n,
                                          lbr_fraction *out);

/* "num/den", or "num" when den is 1. */
void lbr_fraction_text(lbr_fraction a, char text[LBR_FRACTION_TEXT]);

#endif
