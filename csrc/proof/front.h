/* The record as the digitizer gives it: the model of synth/ fed with the
 * particulars of a trial.
 */
#ifndef LBR_PROOF_FRONT_H
#define LBR_PROOF_FRONT_H

#include "proof/particulars.h"

typedef struct lbr_front lbr_front;

/* LBR_DOMAIN: range and step that make no whole number of bits. */
LBR_CHECKED lbr_status lbr_front_new(const lbr_proof *proof, lbr_front **out);
void lbr_front_free(lbr_front *front); /* NULL is fine */

/* The record of particulars p (n samples) with noise, jitter, limits and
 * codes.  Random numbers are keyed by seed and trial. */
LBR_CHECKED lbr_status lbr_front_record(lbr_front *front,
                                        const lbr_particulars *p,
                                        uint64_t seed, uint64_t trial,
                                        double *noisy);

#endif
