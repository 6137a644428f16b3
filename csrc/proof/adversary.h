/* The adversary: climbs towards the worst case of one line, one side, then
 * makes that record and reads it as the plan would. */
#ifndef LBR_PROOF_ADVERSARY_H
#define LBR_PROOF_ADVERSARY_H

#include "proof/response.h"
#include "proof/trial.h"

typedef struct lbr_attack {
  size_t line;
  int side;         /* +1: reads too high, -1: too low */
  double predicted; /* ratio by the model that was climbed */
  double reached;   /* ratio |read - true| / claimed of the record */
  double true_amplitude, read; /* demand's unit */
} lbr_attack;

/* Attacks `line` from `side` and leaves the particulars and the record of the
 * worst case in the bench.  Depends on the proof and the seed alone. */
LBR_CHECKED lbr_status lbr_attack_run(lbr_bench *bench,
                                      const lbr_response *response,
                                      size_t line, int side, uint64_t seed,
                                      lbr_attack *out);

/* All lines, both sides, on `workers` threads (0: one per core); attacks:
 * 2 n_lines, high then low of each line. */
LBR_CHECKED lbr_status lbr_attack_all(const lbr_proof *proof, uint64_t seed,
                                      unsigned workers, lbr_attack *attacks);

#endif
