/* The record as the digitizer gives it: noise, jitter, limits and codes upon
 * a record without them.
 *
 * Noise is made bin by bin with the density that the folded, filtered input
 * noise and the digitizer's own noise have there.  A sampling instant that is
 * off by d changes a value by d times its slope; what jitter takes from a tone
 * on average is already in the particulars' gain.
 */
#ifndef LBR_PROOF_FRONT_H
#define LBR_PROOF_FRONT_H

#include "proof/particulars.h"

typedef struct lbr_front lbr_front;

LBR_CHECKED lbr_status lbr_front_new(const lbr_proof *proof, lbr_front **out);
void lbr_front_free(lbr_front *front); /* NULL is fine */

/* noisy = what the digitizer makes of clean (n samples each), which is the
 * record of particulars p.  Random numbers are keyed by seed and trial. */
void lbr_front_record(lbr_front *front, const lbr_particulars *p,
                      uint64_t seed, uint64_t trial, const double *clean,
                      double *noisy);

#endif
