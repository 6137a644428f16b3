/* Amplitudes and phases of many lines of known frequencies and an offset, in
 * one least squares fit:
 *
 *   x[n] = offset + sum_i a_i cos(2 pi f_i t) + b_i sin(2 pi f_i t)
 *
 * t counts samples from the record's centre, where cosines and sines are
 * orthogonal: the normal matrix falls into two blocks, both of closed sums.
 */
#ifndef LBR_LINES_JOINT_H
#define LBR_LINES_JOINT_H

#include <stddef.h>

#include "base/status.h"

#define LBR_JOINT_MOST 512 /* lines of one fit */

typedef struct lbr_joint_line {
  double amplitude;   /* peak, the samples' unit */
  double phase;       /* rad, of the cosine, at the centre of the record */
  double u_amplitude; /* standard uncertainties, from the residual */
  double u_phase;     /* rad */
} lbr_joint_line;

typedef struct lbr_joint_rest {
  double offset, u_offset; /* the samples' unit */
  double rms;              /* of the residual */
} lbr_joint_rest;

/* A fit for records of n samples; holds the workspace of one thread. */
typedef struct lbr_joint lbr_joint;

LBR_CHECKED lbr_status lbr_joint_new(size_t n, size_t count, lbr_joint **out);
void lbr_joint_free(lbr_joint *joint); /* NULL is fine */

/* The frequencies, cycles per sample, count of them.  LBR_DOMAIN: not finite,
 * or one is 0 or half the rate (but for aliasing), or two cannot be told apart
 * in n samples; *line (if not NULL) is then its number, from 0. */
LBR_CHECKED lbr_status lbr_joint_aim(lbr_joint *joint, const double *f,
                                     size_t *line);

/* Fits a record of n samples at the frequencies aimed at.  lines: count. */
void lbr_joint_run(lbr_joint *joint, const double *x, lbr_joint_line *lines,
                   lbr_joint_rest *rest);

/* records records of n samples, one after the other; f has count frequencies,
 * or records times count when each record has its own.  lines: records times
 * count; rests: records.  LBR_DOMAIN as lbr_joint_aim.  Results of a
 * record with samples that are not finite are not numbers.  workers 0: one per
 * core. */
LBR_CHECKED lbr_status lbr_joint_batch(const double *x, size_t n,
                                       size_t records, const double *f,
                                       size_t count, int own_frequencies,
                                       unsigned workers,
                                       lbr_joint_line *lines,
                                       lbr_joint_rest *rests);

#endif
