/* Decimal numbers in long texts: fast, right to the last bit, in any locale.
 */
#ifndef LBR_BASE_DECIMAL_H
#define LBR_BASE_DECIMAL_H

#include <stdbool.h>
#include <stddef.h>

#include "base/text.h"

/* Reads the decimal number at the start of the characters p .. end - 1, as
 * lbr_decimal_length sees it, to the nearest double (ties to even).  Returns
 * the character behind it; NULL where none starts there or it is beyond the
 * largest double. */
const char *lbr_decimal(const char *p, const char *end, double *out);

/* What lbr_shortest_digits gives, several times faster, for most finite x > 0;
 * false where it has to be found the long way. */
bool lbr_digits_quickly(double x, lbr_digits *out);

#endif
