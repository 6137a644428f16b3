/* One trial: a record made, read and held against the claim. */
#ifndef LBR_PROOF_TRIAL_H
#define LBR_PROOF_TRIAL_H

#include "lines/tracker.h"
#include "proof/front.h"
#include "proof/particulars.h"

typedef struct lbr_outcome { /* one line of one trial */
  double read;      /* amplitude read from the noise-free record, over gain */
  double read_hz;   /* frequency read there, Hz at the nominal rate */
  double ratio;     /* |read - true| / claimed, rounding granted */
  double ratio_hz;  /* the same for the frequency; 0: no claim */
  double deviation; /* (amplitude with noise - read) / sigma; 0: no noise */
} lbr_outcome;

/* Workspace of one worker: a record, a tracker, room for particulars. */
typedef struct lbr_bench {
  const lbr_proof *proof;
  lbr_tracker *tracker;
  lbr_front *front;
  lbr_particulars *particulars;
  lbr_measured *tones;  /* n_lines */
  double *clean;    /* n: the record without noise */
  double *noisy;    /* n: the record as the digitizer gives it */
} lbr_bench;

LBR_CHECKED lbr_status lbr_bench_new(const lbr_proof *proof, lbr_bench **out);
void lbr_bench_free(lbr_bench *bench); /* NULL is fine */

/* Makes the record of the bench's particulars, reads it, and fills ratios;
 * deviations are 0.  outcomes: n_lines. */
void lbr_bench_read(lbr_bench *bench, lbr_outcome *outcomes);

/* Trial `trial` of `seed`: draws, makes, reads; with noise also the record as
 * the digitizer gives it. */
LBR_CHECKED lbr_status lbr_trial_run(lbr_bench *bench, uint64_t seed,
                                     uint64_t trial, int noise,
                                     lbr_outcome *outcomes);

#endif
