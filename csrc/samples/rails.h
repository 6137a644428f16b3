/* Samples that stand at the rails of their converter.
 */
#ifndef LBR_SAMPLES_RAILS_H
#define LBR_SAMPLES_RAILS_H

#include <stddef.h>

typedef struct lbr_rails {
  size_t low, high;         /* samples <= the low, >= the high rail */
  size_t low_run, high_run; /* longest run of such samples in a row */
  size_t first;             /* index of the first such sample; n: none */
  double least, most;       /* smallest and largest sample; 0 when n is 0 */
  size_t bad;               /* samples that are not finite, counted only */
} lbr_rails;

/* Looks through n samples for rails at `low` and `high` (in the samples' own
 * unit; for 16-bit codes -32768 and 32767). */
void lbr_rails_scan(const double *x, size_t n, double low, double high,
                    lbr_rails *out);

#endif
