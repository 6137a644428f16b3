/* Rates: every sample rate a digitizer can make, from its description. */
#ifndef LBR_PLAN_RATES_H
#define LBR_PLAN_RATES_H

#include <stddef.h>

#include "base/status.h"

#define LBR_MOST_RATES ((size_t)1 << 19)

typedef struct lbr_rate {
  double value;        /* S/s */
  unsigned setting[3]; /* how it is made: divider and decimation; multiplier,
                          divider and post divider; or place in a list */
} lbr_rate;

typedef struct lbr_rates {
  lbr_rate *item; /* ascending, no value twice */
  size_t count, room;
} lbr_rates;

/* Limits a rate must respect, inclusive. */
typedef struct lbr_rate_limits {
  double least, most;
} lbr_rate_limits;

/* clock / (divider * decimation), divider = least, least + step .. most. */
typedef struct lbr_divider_clock {
  double clock; /* Hz */
  unsigned least, most, step;
  const unsigned *decimation; /* n_decimation >= 1 factors */
  size_t n_decimation;
} lbr_divider_clock;

/* clock * multiplier / divider / after, with the oscillator
 * clock * multiplier / divider between vco_least and vco_most. */
typedef struct lbr_pll_clock {
  double clock; /* Hz */
  unsigned multiply_least, multiply_most, multiply_step; /* step >= 1 */
  unsigned divide_least, divide_most, divide_step;
  double vco_least, vco_most; /* Hz; 0 and INFINITY when free */
  const unsigned *after;      /* n_after >= 1 post dividers */
  size_t n_after;
} lbr_pll_clock;

/* Each appends; LBR_OVERFLOW past LBR_MOST_RATES. */
LBR_CHECKED lbr_status lbr_rates_divide(lbr_rates *rates,
                                        const lbr_divider_clock *clock,
                                        lbr_rate_limits limits);
LBR_CHECKED lbr_status lbr_rates_pll(lbr_rates *rates,
                                     const lbr_pll_clock *clock,
                                     lbr_rate_limits limits);
LBR_CHECKED lbr_status lbr_rates_add(lbr_rates *rates, lbr_rate rate,
                                     lbr_rate_limits limits);

/* Sorts and leaves each value once (the first setting that makes it). */
void lbr_rates_settle(lbr_rates *rates);
void lbr_rates_free(lbr_rates *rates);

#endif
