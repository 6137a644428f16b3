/* Leak: how much the other sources, with their images and folds, can add to
 * the reading of one line; suprema over all that moves, source by source of
 * one driver jointly.
 */
#ifndef LBR_READING_LEAK_H
#define LBR_READING_LEAK_H

#include <stdbool.h>

#include "reading/bound.h"
#include "reading/wander.h"

typedef struct lbr_leak {
  const lbr_case *c;
  size_t line;
  double duration; /* T, s */
  double read_hz;  /* bin: where the line is read, Hz */
  double steer;    /* tracked: most distance between the line and the place
                      where it is read, bins */
  double from_hz;  /* tracked: the interval that is searched, as the record */
  double to_hz;    /* sees it, Hz */
  size_t *asked;   /* kernel enclosures asked for, counted up */
} lbr_leak;

/* `steer` may be INFINITY: the line may be read anywhere in its interval. */
lbr_leak lbr_leak_of_case(const lbr_case *c, size_t line, double steer,
                          size_t *asked);

/* The wander of a source at the highest frequency the record may see it. */
void lbr_leak_wander(const lbr_leak *leak, size_t source, lbr_wander *out);

/* Upper bounds of the kernel and of its slope (per bin) over distances
 * [from, to], bins, with the source's wander spread over its sidebands. */
double lbr_leak_spread(const lbr_leak *leak, size_t source, double from,
                       double to);
double lbr_leak_spread_slope(const lbr_leak *leak, size_t source, double from,
                             double to);

/* Upper bound of the normalised response to source j and its image, with the
 * line's driver in [e1, e2] and the source's own in [d1, d2] (relative
 * deviations); `locked`: both are the same deviation. */
double lbr_leak_gain(const lbr_leak *leak, size_t j, double e1, double e2,
                     double d1, double d2, bool locked);

/* Contribution of source j in the demand's unit with everything free. */
double lbr_leak_of(const lbr_leak *leak, size_t j);

/* Sum of lbr_leak_of over all other sources: never less than the supremum. */
double lbr_leak_crude(const lbr_leak *leak);

/* The same with sources of the line's own driver moving as it does; every
 * source at its own worst place.  Stops above `high`. */
double lbr_leak_plain(const lbr_leak *leak, double high);

/* Supremum of the sum, drivers moved jointly; refined until it is within
 * `slack` (unit), or known to be at most `low`, or known to exceed `high`, or
 * cutting gains nothing more.  Always an upper bound of the true supremum. */
double lbr_leak_joint(const lbr_leak *leak, double low, double high,
                      double slack);

/* The sum with everything at its nominal place; stops above `high`. */
double lbr_leak_nominal(const lbr_leak *leak, double high);

/* A sum that can be reached, up to what enclosures are looser: the line at
 * its nominal place, each driver where its sources together leak most among
 * a few deviations.  Stops above `high`. */
double lbr_leak_reached(const lbr_leak *leak, double high);

/* Upper bound of |dL/dx| (per bin) of the sum at the line, unit. */
double lbr_leak_slope(const lbr_leak *leak);

#endif
