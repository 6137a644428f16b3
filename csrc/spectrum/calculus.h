/* Integration and differentiation of a record in the frequency domain.
 *
 * Every bin is multiplied by (2 pi i f)^times, so that a tone with whole
 * periods in the record comes out exact.  The record is one period: ends that
 * do not meet are a step that is integrated, too.
 */
#ifndef LBR_SPECTRUM_CALCULUS_H
#define LBR_SPECTRUM_CALCULUS_H

#include "spectrum/transform.h"

typedef struct lbr_calculus {
  int times;   /* -4 .. 4: negative integrates, positive differentiates */
  double rate; /* S/s, > 0 */
  double low;  /* Hz: nothing at or below passes; -1: everything does (0 Hz
                  included, which only differentiation allows) */
  double full; /* Hz, >= low: from here on all passes, between the two by half
                  a period of a cosine */
  double high; /* Hz: nothing above passes; INFINITY: everything does */
} lbr_calculus;

/* bins are those of a transform of n points. For odd times the bin at half the
 * rate becomes 0: its derivative is 0 at every sample. */
void lbr_calculus_apply(const lbr_calculus *c, double complex *bins, size_t n);

#endif
