/* The planning problem: a scene, a digitizer, the ways to read, the limits. */
#ifndef LBR_PLAN_PROBLEM_H
#define LBR_PLAN_PROBLEM_H

#include <stdbool.h>

#include "plan/rates.h"
#include "reading/bound.h"

/* One way to read the lines. */
typedef struct lbr_mode {
  lbr_window window;
  lbr_reading reading;
} lbr_mode;

typedef struct lbr_problem {
  const lbr_scene *scene;
  const lbr_front_end *front;
  const lbr_rates *rates;      /* admissible rates, ascending */
  const lbr_mode *modes;
  size_t n_modes;
  size_t least_samples;        /* record length per channel, inclusive */
  size_t most_samples;
  size_t block;                /* record lengths are multiples of this */
  double most_duration;        /* of one record, s; may be INFINITY */
  unsigned averages;
  double coverage;             /* k of the random terms */
  double share;                /* errors may take this share of tolerances */
  double least_duration;       /* shorter records are not looked at, s */
  double most_work;            /* units of work (about a microsecond each)
                                  after which the search gives up */
  double care_work;            /* work on top, for joint bounds of plans
                                  shorter than plain bounds allow */
} lbr_problem;

/* The shortest record a window may be used with: its kernel must fit. */
size_t lbr_mode_least_samples(const lbr_mode *mode);

#endif
