/* Limits: for each rate and mode, the shortest duration that could do, from
 * where every source folds to.  Filled when first asked for.
 */
#ifndef LBR_PLAN_LIMITS_H
#define LBR_PLAN_LIMITS_H

#include "plan/problem.h"

typedef struct lbr_limits lbr_limits;

LBR_CHECKED lbr_status lbr_limits_new(const lbr_problem *problem,
                                      lbr_limits **out);
void lbr_limits_free(lbr_limits *limits);

/* The path of a rate, from a cache: valid until the next call. */
const lbr_path *lbr_limits_path(lbr_limits *limits, size_t rate);

/* Shortest duration that could do at this rate, INFINITY when none can.
 * `kernel`: the mode's window, endless record; one and the same at each call
 * for a mode. */
LBR_CHECKED lbr_status lbr_limits_least(lbr_limits *limits, size_t rate,
                                        size_t mode, lbr_kernel *kernel,
                                        double *least);

#endif
