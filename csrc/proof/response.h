/* A window's response as the adversary sees it: complex, anywhere, fast, and
 * owing nothing to the code that computes the bound.
 *
 *   G(x) = sum_n w[n] exp(2 pi i x t_n / N) / sum w,  t = n - (N - 1) / 2
 *
 * It comes from a padded transform by a local interpolation, good to about
 * 1e-7: enough to aim with; what is reported is always measured afterwards.
 */
#ifndef LBR_PROOF_RESPONSE_H
#define LBR_PROOF_RESPONSE_H

#include <complex.h>
#include <stddef.h>

#include "base/status.h"

#define LBR_RESPONSE_MOST ((size_t)1 << 22) /* longest window, samples */

typedef struct lbr_response lbr_response;

/* LBR_DOMAIN: n below 4 or beyond LBR_RESPONSE_MOST. */
LBR_CHECKED lbr_status lbr_response_new(const double *w, size_t n,
                                        lbr_response **out);
void lbr_response_free(lbr_response *response); /* NULL is fine */

/* G at x bins; any thread. */
double complex lbr_response_at(const lbr_response *response, double x);

#endif
