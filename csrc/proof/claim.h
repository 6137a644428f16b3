/* What a plan claims, and everything needed to put the claim to the test. */
#ifndef LBR_PROOF_CLAIM_H
#define LBR_PROOF_CLAIM_H

#include <stdint.h>

#include "reading/scene.h"

/* The claim for one line: a reading a of a true amplitude A, divided by gain,
 * keeps |a - A| <= own A + others, and its frequency stays within hz; the
 * random part has standard deviation sigma. */
typedef struct lbr_claim {
  double own;        /* systematic, relative to the amplitude */
  double others;     /* systematic, demand's unit */
  double sigma;      /* of one record's amplitude, demand's unit */
  double hz;         /* of the frequency, systematic, Hz; INFINITY: none */
  double f_lo, f_hi; /* search interval, Hz at the nominal rate; equal: the
                        line is read at this one frequency */
  double gain;       /* nominal |F|, by which the reading is divided */
} lbr_claim;

/* A plan on trial.  Everything is the caller's and stays put. */
typedef struct lbr_proof {
  const lbr_scene *scene;
  const lbr_front_end *front;
  const lbr_claim *claims; /* scene->n_lines */
  const double *window;    /* n samples */
  size_t n;                /* samples in a record */
  double rate;             /* nominal, S/s */
  double coverage;         /* k: random deviations are held against k sigma */
} lbr_proof;

/* Share of the sum of all amplitudes granted to rounding when a deviation is
 * held against a claim: what a record of doubles cannot say better. */
#define LBR_PROOF_ROUNDING 1e-12

#endif
