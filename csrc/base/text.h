/* Numbers as text, the same in every locale. */
#ifndef LBR_BASE_TEXT_H
#define LBR_BASE_TEXT_H

#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

/* Room for any number written by lbr_number_text, NUL included. */
#define LBR_NUMBER_TEXT 40

/* The shortest significant digits of a finite x != 0 that read back as x. */
typedef struct lbr_digits {
  uint64_t digits; /* significant digits as an integer, no trailing zero */
  int count;       /* how many digits, 1 .. 17 */
  int exponent;    /* |x| = digits * 10^exponent */
} lbr_digits;

/* Takes a finite x; x = 0 gives digits 0, count 1, exponent 0. */
lbr_digits lbr_shortest_digits(double x);

/* Shortest decimal text that reads back bit for bit, with '.' as the point and
 * an exponent where an integer of more than 15 digits would mislead; "inf",
 * "-inf" and "nan" for what is not finite. */
void lbr_number_text(double x, char text[LBR_NUMBER_TEXT]);

/* Reads n characters, all of them, as a decimal number with '.' as the point
 * (no hexadecimal, no "inf", no blanks).  LBR_FORMAT when it is none,
 * LBR_OVERFLOW when it is beyond the largest double or longer than 400
 * characters. */
LBR_CHECKED lbr_status lbr_number_read(const char *text, size_t n,
                                       double *out);

/* Characters of the decimal number at the start of text, 0 when none:
 * [+-] digits [. digits] [e [+-] digits], digits on at
 * least one side of the point. */
size_t lbr_decimal_length(const char *text, size_t n);

#endif
