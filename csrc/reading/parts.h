/* Parts: the single terms of a bound before they are put together; shared by
 * the bound and its budget, not meant for other rooms.
 */
#ifndef LBR_READING_PARTS_H
#define LBR_READING_PARTS_H

#include "reading/bound.h"

/* What a line's own wander does, relative to its amplitude. */
typedef struct lbr_smear {
  double carrier; /* most the carrier loses */
  double loss;    /* most the highest point can lose */
  double excess;  /* most it can gain */
  double flanks;  /* sum of the sidebands as they show at the line */
} lbr_smear;

/* Systematic terms; relative to the amplitude unless said. */
typedef struct lbr_parts {
  double steer;       /* the steering radius they hold for, bins */
  double lobe, image, smear, flanks, droop, accuracy, jitter_loss;
  double carrier;     /* most that own wander takes from the carrier */
  double offset;      /* unit */
} lbr_parts;

/* Variances of one record's amplitude, unit squared. */
typedef struct lbr_variance {
  double noise, quantisation, jitter;
} lbr_variance;

double lbr_duration(const lbr_case *c); /* T, s */
lbr_parts lbr_bound_parts(const lbr_case *c, size_t line, double steer);
lbr_variance lbr_bound_variance(const lbr_case *c, size_t line);

/* Factor by which flatness and accuracy can enlarge what others add. */
double lbr_parts_scale(const lbr_case *c);

#endif
