/* Where a record crosses a level: pulses of a tacho, periods of a tone.
 */
#ifndef LBR_SAMPLES_CROSSING_H
#define LBR_SAMPLES_CROSSING_H

#include <stddef.h>

typedef struct lbr_crossing_rule {
  double level;      /* that is crossed, unit of the samples */
  double hysteresis; /* >= 0: before the next crossing counts, the record must
                        have been this far on the side that it comes from */
  int falling;       /* 0: upward crossings count, 1: downward ones */
  int cubic;         /* 0: place on the straight line between the neighbours,
                        1: on the cubic through the four nearest samples, where
                        there are four that are finite */
} lbr_crossing_rule;

/* Writes the places (in samples, from 0) to out, at most `most` of them, and
 * returns how many there are in all.  The record must first have been on the
 * other side: what it does before is not a crossing.  Samples that are not
 * numbers are on neither side. */
size_t lbr_crossings(const double *x, size_t n, const lbr_crossing_rule *rule,
                     double *out, size_t most);

#endif
