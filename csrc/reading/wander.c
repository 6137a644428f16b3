#define _XOPEN_SOURCE 700 /* j0, jn */
#include "reading/wander.h"

#include <math.h>

#define DEEPEST 1e3 /* far more than the sidebands that are followed hold */
#define NEGLIGIBLE 1e-12 /* sidebands from here on are left out */
#define FIRST_ZERO 2.404825557695773 /* of J_0: DLMF 10.21, table */
#define FIRST_DIP 0.4027593958 /* |J_0| at its first minimum, 3.8317..., above
                                  which no later extremum comes */
#define PEAK 0.6748851         /* |J_k| <= PEAK k^(-1/3): Landau 2000, J. London
                                  Math. Soc. 61, 197-215 */

/* Upper bound of |J_0| from b on, decreasing in b. */
static double carrier_beyond(double b) {
  return b < FIRST_ZERO ? fmax(j0(b), FIRST_DIP) : FIRST_DIP;
}

/* Upper bound of |J_k| up to b, k >= 1, increasing in b: J_k rises up to its
 * first maximum, which lies beyond k + 0.8 k^(1/3) (DLMF 10.21.40). */
static double order_within(size_t k, double b) {
  double order = (double)k, root = cbrt(order);
  return b <= order + 0.8 * root ? jn((int)k, b) : PEAK / root;
}

static void fill_order(lbr_wander *w, size_t k, double index) {
  for (int part = 0; part < LBR_DEPTHS; part++) {
    double from = index * part / LBR_DEPTHS;
    double to = index * (part + 1) / LBR_DEPTHS;
    w->most[part][k] = k ? order_within(k, to) : carrier_beyond(from);
  }
}

void lbr_wander_of_index(double index, lbr_wander *w) {
  w->count = 1;
  w->whole = true;
  w->carrier = 1;
  for (int part = 0; part < LBR_DEPTHS; part++) w->most[part][0] = 1;
  if (!(index > 0)) return;
  w->whole = index < DEEPEST;
  if (!w->whole) {
    w->count = 2; /* not a steady one */
    w->carrier = 0;
    return;
  }
  w->carrier = index < FIRST_ZERO ? j0(index) : 0;
  fill_order(w, 0, index);
  for (; w->count < LBR_SIDEBANDS; w->count++) {
    fill_order(w, w->count, index);
    if ((double)w->count > index &&
        w->most[LBR_DEPTHS - 1][w->count] < NEGLIGIBLE)
      return;
  }
  w->whole = false;
}

double lbr_wander_order(const lbr_wander *w, size_t k) {
  return w->most[k ? LBR_DEPTHS - 1 : 0][k];
}

double lbr_wander_sum(const lbr_wander *w, const double *weight) {
  double most = 0;
  for (int part = 0; part < LBR_DEPTHS; part++) {
    double sum = 0;
    for (size_t k = 0; k < w->count; k++) sum += w->most[part][k] * weight[k];
    most = fmax(most, sum);
  }
  return most;
}
