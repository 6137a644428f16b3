/* Many trials on all cores, added up in the order of their numbers. */
#ifndef LBR_PROOF_TALLY_H
#define LBR_PROOF_TALLY_H

#include "proof/trial.h"

#define LBR_TALLY_CHUNK 4096 /* most trials in one call */

typedef struct lbr_tally { /* one line, over all trials so far */
  uint64_t trials;
  uint64_t violations;    /* systematic bound of the amplitude passed */
  uint64_t violations_hz; /* that of the frequency */
  double worst;           /* largest ratio of the amplitude */
  double worst_hz;        /* largest ratio of the frequency */
  uint64_t worst_trial;   /* where they were met */
  uint64_t worst_hz_trial;
  uint64_t beyond;        /* random deviations of more than coverage sigma */
  double squares;         /* sum of the squared deviations, in sigma^2 */
} lbr_tally;

typedef struct lbr_tallier lbr_tallier;

/* Workspace for `workers` threads (0: one per core). */
LBR_CHECKED lbr_status lbr_tallier_new(const lbr_proof *proof,
                                       unsigned workers, lbr_tallier **out);
void lbr_tallier_free(lbr_tallier *tallier); /* NULL is fine */

/* Runs trials first .. first + count - 1 (count <= LBR_TALLY_CHUNK) and adds
 * them to tallies (n_lines).  The sums depend neither on the number of
 * workers nor on how the trials are cut into calls. */
LBR_CHECKED lbr_status lbr_tallier_run(lbr_tallier *tallier, uint64_t seed,
                                       uint64_t first, size_t count, int noise,
                                       lbr_tally *tallies);

#endif
