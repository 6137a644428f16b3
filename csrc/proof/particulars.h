/* The particulars of one trial: what is true in it, to the last number. */
#ifndef LBR_PROOF_PARTICULARS_H
#define LBR_PROOF_PARTICULARS_H

#include <stddef.h>
#include <stdint.h>

#include "base/status.h"
#include "proof/claim.h"

typedef struct lbr_actual { /* one source */
  double hz;           /* mean frequency over the record, Hz */
  double amplitude;    /* peak, before the filter, demand's unit */
  double phase;        /* rad, at the centre of the record */
  double gain;         /* what the record shows of the amplitude: filter,
                          flatness, accuracy and mean loss by jitter */
  double wander;       /* relative, peak to peak, one period per record */
  double wander_phase; /* rad, at the centre of the record */
} lbr_actual;

typedef struct lbr_particulars {
  double timebase;    /* relative error of the sample rate */
  double accuracy;    /* relative gain error */
  double offset;      /* mean, demand's unit */
  double *deviation;  /* n_drivers: relative deviations */
  double *free_hz;    /* n_sources: own movements, Hz */
  double *flatness;   /* n_sources: relative departures from the filter */
  lbr_actual *actual; /* n_sources */
} lbr_particulars;

LBR_CHECKED lbr_status lbr_particulars_new(const lbr_scene *scene,
                                           lbr_particulars **out);
void lbr_particulars_free(lbr_particulars *p); /* NULL is fine */

/* Everything drawn at random from what the scene allows: uniform, amplitudes
 * in the logarithm, every quantity one time in four at an end of its range. */
void lbr_particulars_draw(const lbr_proof *proof, uint64_t seed,
                          uint64_t trial, lbr_particulars *p);

/* Sets hz and gain of every source from deviation, free_hz, flatness and
 * accuracy. */
void lbr_particulars_settle(const lbr_proof *proof, lbr_particulars *p);

/* The sum of what all sources and the offset can reach in the record. */
double lbr_particulars_reach(const lbr_proof *proof, const lbr_particulars *p);

/* The record of n samples: no noise, no codes. */
void lbr_particulars_record(const lbr_proof *proof, const lbr_particulars *p,
                            double *x);

#endif
