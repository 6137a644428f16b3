/* The median of many values.
 */
#ifndef LBR_SPECTRUM_MEDIAN_H
#define LBR_SPECTRUM_MEDIAN_H

#include <stddef.h>

/* Median of n >= 1 values, the mean of the two middle ones for even n; not a
 * number where one of them is none.  The values are put in another order. */
double lbr_median(double *x, size_t n);

#endif
