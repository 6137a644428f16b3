/* Peaks of an averaged power spectrum above the noise around them.
 *
 * The noise floor of a bin is the median of the `width` nearest bins that are
 * not part of a peak, divided by the median of the chi-square law: a few lines
 * among them hardly move it.  A bin is a peak where its power exceeds the
 * floor by a factor that noise exceeds in a whole spectrum with the chance
 * stated: the chance of one bin is the stated one divided by the number of
 * bins (so it holds however bins depend on each other).
 */
#ifndef LBR_LINES_LIST_H
#define LBR_LINES_LIST_H

#include <stddef.h>

#include "base/status.h"

typedef struct lbr_list_setup {
  size_t step;        /* samples from one segment to the next, >= 1 */
  size_t width;       /* bins that make a floor, odd, 5 or more */
  size_t guard;       /* bins either side that belong to a peak: the half
                         width of the window's main lobe */
  double false_alarm; /* chance of any peak in noise alone, 0 .. 0.5 */
} lbr_list_setup;

typedef struct lbr_list_facts {
  size_t segments;        /* averaged */
  size_t first, last;     /* bins tested: guard + 1 from both ends */
  double freedom;         /* degrees of freedom of a bin's power */
  double cells;           /* independent ones among width bins */
  double factor;          /* power over the floor that makes a peak */
  size_t peaks;
  /* of the window, t from its centre: sums of w, w^2, w t^2, (w t)^2 */
  double sum, square, bend, tilt;
} lbr_list_facts;

typedef struct lbr_list lbr_list;

/* The averaged power |sum w x exp|^2 of the segments of record x (n samples)
 * under window w (m samples), its floor, and its peaks.  LBR_DOMAIN: fewer
 * samples than a segment, fewer bins to test than width, or samples that are
 * not finite. */
LBR_CHECKED lbr_status lbr_list_new(const double *x, size_t n, const double *w,
                                    size_t m, const lbr_list_setup *setup,
                                    lbr_list **out);
void lbr_list_free(lbr_list *list); /* NULL is fine */

const lbr_list_facts *lbr_list_about(const lbr_list *list);
const double *lbr_list_power(const lbr_list *list); /* m / 2 + 1 */
const double *lbr_list_floor(const lbr_list *list); /* m / 2 + 1 */
const size_t *lbr_list_peaks(const lbr_list *list); /* bins, rising */

#endif
