/* Frequency from the bins around a peak: one table row per estimator.
 *
 * For a record x[0 .. n-1] and the bin k of its highest power an estimator
 * gives the line's distance from k in bins.  They differ in bias (the image of
 * a real tone, the formula's own) and in what noise does to them; a fit
 * (sine.h) has neither bias and costs more.
 */
#ifndef LBR_LINES_ESTIMATOR_H
#define LBR_LINES_ESTIMATOR_H

#include <complex.h>
#include <stddef.h>

#include "base/status.h"

typedef struct lbr_peak {
  double complex below, at, above; /* bins k - 1, k, k + 1 of the transform */
  size_t n;                        /* samples */
} lbr_peak;

typedef struct lbr_estimator {
  const char *name;   /* "candan2013" */
  const char *source; /* publication of the formula */
  int hann;           /* the record is Hann-windowed first */
  double (*offset)(const lbr_peak *peak); /* NULL: reads between the bins */
} lbr_estimator;

/* Number of rows, and row i from 0. */
size_t lbr_estimators(void);
const lbr_estimator *lbr_estimator_at(size_t i);

/* The row of a name, or LBR_UNKNOWN. */
LBR_CHECKED lbr_status lbr_estimator_find(const char *name,
                                          const lbr_estimator **out);

/* Bins from k.  im NULL: the record is real.  LBR_DOMAIN: fewer than 8
 * samples, or k beyond n, or a result that is not a number. */
LBR_CHECKED lbr_status lbr_estimate(const lbr_estimator *row, const double *re,
                                    const double *im, size_t n, size_t k,
                                    double *offset);

#endif
