/* A plan on trial out of the table that Lua describes it with. */
#ifndef LBR_BIND_PROOF_SETUP_H
#define LBR_BIND_PROOF_SETUP_H

#include "bind/bind.h"
#include "proof/claim.h"

/* The proof and everything it points to; lbr_setup_free frees it all. */
typedef struct lbr_setup {
  lbr_proof proof;
  lbr_scene scene;
  lbr_front_end front;
  lbr_source *sources;
  double *spread;
  lbr_claim *claims;
  double *window;
} lbr_setup;

/* Argument `arg`: a table with
 *   rate (S/s), coverage (default 3), window (samples), lines (how many of the
 *   sources are lines), spread = { numbers, one a driver },
 *   sources = { { hz, lock_hz, free_hz, wander, least, most, driver }, ... },
 *   offset, noise, front = { filter, flatness, accuracy, timebase, jitter_s,
 *   range, step, noise }, claims = { { own, others, sigma, hz, f_lo, f_hi,
 *   gain }, ... }; absent numbers are 0, an absent range or claim hz is
 *   unlimited.
 * Fills *setup, which must be zeroed and owned by a userdata already: errors
 * are raised with the path of the field. */
void lbr_check_setup(lua_State *L, int arg, lbr_setup *setup);
void lbr_setup_free(lbr_setup *setup);

#endif
