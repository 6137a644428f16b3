/* Relaxation: lower bounds of a plan's error over a whole range of record
 * durations and a band of rates, so that the search may leave the range out.
 *
 * Only pairs (line, source) whose distance is at most half of every rate in
 * the band take part: for them folding changes nothing, and the kernel is that
 * of an endless record times a share that depends on distance / rate alone.
 */
#ifndef LBR_PLAN_RELAX_H
#define LBR_PLAN_RELAX_H

#include "plan/problem.h"

/* A line and something that may leak into it. */
typedef struct lbr_pair {
  size_t line;
  double low, high; /* distance, Hz; low = 0 where it may vanish */
  double hz, half;  /* where the source itself stands, and how far it moves */
  bool alone;       /* no other source shares its driver (the line apart) */
  bool locked;      /* it shares the driver of the line */
  double sign;      /* 1: difference, -1: sum of the frequencies */
  double weight;    /* least amplitude at the reading, unit */
  double swing;     /* half the source's wander, Hz: it keeps at least
                       1 - (swing t)^2 / 4 of itself (J0 of its index) */
} lbr_pair;

typedef struct lbr_relax {
  const lbr_problem *problem;
  double rate;         /* the lowest of the band, S/s */
  lbr_pair *pair;      /* sorted by line, then by weight, largest first */
  size_t n_pairs;
  size_t *first;       /* n_lines + 1: where the pairs of a line begin */
  double *allowed;     /* n_lines: error allowed at the least amplitude */
  double *noise;       /* n_lines: k^2 density / averages, least */
} lbr_relax;

LBR_CHECKED lbr_status lbr_relax_new(const lbr_problem *problem, double rate,
                                     lbr_relax *out);
void lbr_relax_free(lbr_relax *relax);

/* What a kernel of finite length keeps, at least, of the endless one at the
 * pairs' distances; kept: n_pairs.  Leaves `finite` at another length. */
LBR_CHECKED lbr_status lbr_relax_kept(const lbr_relax *relax,
                                      lbr_kernel *endless, lbr_kernel *finite,
                                      double *kept);

/* Sets to 0 what pairs keep that never matter from a duration on: less than
 * a small share of what their line is allowed. */
void lbr_relax_thin(const lbr_relax *relax, lbr_kernel *kernel, double least,
                    double *kept);

/* The shortest duration that a reading with this kernel (endless record)
 * could possibly hold the demand in. */
double lbr_relax_least(const lbr_relax *relax, lbr_reading reading,
                       lbr_kernel *kernel, const double *kept);

/* Whether some duration in [t1, t2] might do by bounds of this care; false
 * only when none can.  *stern is the line that failed last, tried first.
 * *work grows by the kernel evaluations made. */
bool lbr_relax_possible(const lbr_relax *relax, const lbr_mode *mode,
                        lbr_care care, lbr_kernel *kernel, const double *kept,
                        double t1, double t2, size_t *stern, double *work);

#endif
