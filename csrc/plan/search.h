/* The search: the shortest record that holds every tolerance.
 *
 * Best first over record durations: ranges of durations are left out when the
 * relaxation shows that none of them can do, halved while they are long, and
 * brought onto the hardware (rate, length) when they are short; the first
 * combination that passes the full bound, in order of duration, is the best.
 * The work grows with what nearly fits, not with rates x lengths.
 *
 * It is done twice: with plain bounds, which are quick, and then, within
 * problem->care_work, with joint ones for what may be shorter still.
 */
#ifndef LBR_PLAN_SEARCH_H
#define LBR_PLAN_SEARCH_H

#include "base/status.h"
#include "plan/descent.h"

/* LBR_OK: *choice is the shortest by plain bounds, or shorter still by joint
 * ones; among equal durations the one of fewest samples.  Where count->open is
 * finite a part of the search gave up, and it may not be the shortest.
 * LBR_INFEASIBLE: nothing fits.  LBR_STOPPED: gave up at problem->most_work. */
LBR_CHECKED lbr_status lbr_search_run(const lbr_problem *problem,
                                      lbr_choice *choice,
                                      lbr_search_count *count);

#endif
