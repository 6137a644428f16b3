/* The adversary's model of a reading: which amplitude would be read if
 * everything stood at given places and all phases were chosen for the worst.
 *
 * At the frequency that is read, source j contributes
 *   A_j gain_j (G(x_j) exp(i phi_j) + G(x'_j) exp(-i phi_j)),
 * x_j and x'_j its distance and its image's in bins; the phase that adds most
 * along the line's own direction is known in closed form.
 */
#ifndef LBR_PROOF_AIM_H
#define LBR_PROOF_AIM_H

#include "proof/particulars.h"
#include "proof/response.h"

typedef struct lbr_aim {
  const lbr_proof *proof;
  const lbr_response *response;
  size_t line;
  int side;          /* +1: read too high, -1: too low */
  double read_bins;  /* tracked: where it is read, off the line, bins */
  lbr_particulars *p; /* places; amplitudes; the line's own phase */
} lbr_aim;

/* The excess over the line's claim as a ratio (1: the claim is reached) with
 * all other phases at their worst. */
double lbr_aim_ratio(const lbr_aim *aim);

/* What source `other` adds along the own direction at its worst phase. */
double lbr_aim_part(const lbr_aim *aim, size_t other);

/* Writes those phases, and the sign of the offset, into the particulars. */
void lbr_aim_phases(const lbr_aim *aim);

#endif
