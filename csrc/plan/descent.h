/* The descent: one thread's search for the shortest record, best first over
 * record durations.
 *
 * Ranges of durations are left out when the relaxation shows that none of
 * them can do, halved while they are long, and brought onto the hardware
 * (rate, length) when they are short.
 */
#ifndef LBR_PLAN_DESCENT_H
#define LBR_PLAN_DESCENT_H

#include <stdatomic.h>
#include <stdint.h>

#include "base/status.h"
#include "plan/problem.h"

typedef struct lbr_choice {
  size_t rate; /* index into problem->rates->item */
  size_t mode; /* index into problem->modes */
  size_t n;    /* samples of the record, per channel */
} lbr_choice;

typedef struct lbr_search_count {
  size_t ranges;     /* ranges of durations looked at */
  size_t candidates; /* (rate, length, mode) brought onto the hardware */
  size_t bounds;     /* full bounds evaluated */
  double work;       /* about microseconds */
  double open;       /* records from here on were not all looked at, s;
                        INFINITY where the search came to its end */
} lbr_search_count;

/* The shortest record by bounds of this care.  *best holds the bits of the
 * shortest duration that anybody found so far (at first UINT64_MAX), and the
 * search ends where only longer ones are left: LBR_INFEASIBLE then, too. */
LBR_CHECKED lbr_status lbr_descent_run(const lbr_problem *problem,
                                       lbr_care care, _Atomic uint64_t *best,
                                       lbr_choice *choice,
                                       lbr_search_count *count);

#endif
