/* Relaxation: lower bounds of a plan's error over a whole range of record
 * durations and whatever rate, so that the search may leave the range out.
 *
 * Only pairs (line, source) whose distance is small against every admissible
 * rate take part: for them folding changes nothing and the kernel is that of
 * an endless record, up to the factor that is taken off.
 */
#ifndef LBR_PLAN_RELAX_H
#define LBR_PLAN_RELAX_H

#include "plan/problem.h"

/* A line and something that may leak into it. */
typedef struct lbr_pair {
  size_t line;
  double low, high; /* distance, Hz; low = 0 where it may vanish */
  double hz, half;  /* where the source itself stands, and how far it moves */
  double sign;      /* 1: difference, -1: sum of the frequencies */
  double weight;    /* least amplitude at the reading, unit */
} lbr_pair;

typedef struct lbr_relax {
  const lbr_problem *problem;
  lbr_pair *pair;      /* sorted by line, then by weight, largest first */
  size_t n_pairs;
  double *allowed;     /* n_lines: error allowed at the least amplitude */
  double *noise;       /* n_lines: k^2 density / averages, least */
} lbr_relax;

LBR_CHECKED lbr_status lbr_relax_new(const lbr_problem *problem,
                                     lbr_relax *out);
void lbr_relax_free(lbr_relax *relax);

/* The shortest duration that a reading with this kernel (endless record)
 * could possibly hold the demand in. */
double lbr_relax_least(const lbr_relax *relax, lbr_kernel *kernel);

/* Whether some duration in [t1, t2] might do; false only when none can.
 * *work grows by the kernel evaluations made. */
bool lbr_relax_possible(const lbr_relax *relax, const lbr_mode *mode,
                        lbr_kernel *kernel, double t1, double t2,
                        double *work);

#endif
