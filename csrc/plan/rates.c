#include "plan/rates.h"

#include <math.h>
#include <stdint.h>
#include <stdlib.h>

#define SAME 1e-15             /* relative: settings that make one rate */
#define MOST_TRIES (1 << 26) /* settings of a PLL that are looked through */

lbr_status lbr_rates_add(lbr_rates *rates, lbr_rate rate,
                         lbr_rate_limits limits) {
  if (!(rate.value >= limits.least && rate.value <= limits.most))
    return LBR_OK;
  if (rates->count == rates->room) {
    if (rates->room >= LBR_MOST_RATES) return LBR_OVERFLOW;
    size_t room = rates->room ? 2 * rates->room : 1024;
    lbr_rate *item = realloc(rates->item, room * sizeof *item);
    if (!item) return LBR_NO_MEMORY;
    rates->item = item;
    rates->room = room;
  }
  rates->item[rates->count++] = rate;
  return LBR_OK;
}

/* The dividers whose rates can lie within the limits. */
static double first_divider(const lbr_divider_clock *c, double clock,
                            double most_rate) {
  double from = fmax(c->least, ceil(clock / most_rate) - 1);
  return c->least + ceil((from - c->least) / c->step) * c->step;
}

lbr_status lbr_rates_divide(lbr_rates *rates, const lbr_divider_clock *c,
                            lbr_rate_limits limits) {
  for (size_t k = 0; k < c->n_decimation; k++) {
    double clock = c->clock / c->decimation[k];
    double to = fmin(c->most, floor(clock / limits.least) + 1);
    for (double d = first_divider(c, clock, limits.most); d <= to;
         d += c->step) {
      lbr_rate rate = {clock / d, {(unsigned)d, c->decimation[k], 0}};
      lbr_status status = lbr_rates_add(rates, rate, limits);
      if (status != LBR_OK) return status;
    }
  }
  return LBR_OK;
}

lbr_status lbr_rates_pll(lbr_rates *rates, const lbr_pll_clock *c,
                         lbr_rate_limits limits) {
  double tries = ((double)c->multiply_most - c->multiply_least + 1) *
                 ((double)c->divide_most - c->divide_least + 1) *
                 (double)c->n_after;
  if (tries > MOST_TRIES) return LBR_OVERFLOW;
  for (uint64_t m = c->multiply_least; m <= c->multiply_most;
       m += c->multiply_step)
    for (uint64_t d = c->divide_least; d <= c->divide_most;
         d += c->divide_step) {
      double vco = c->clock * (double)m / (double)d;
      if (vco < c->vco_least || vco > c->vco_most) continue;
      for (size_t k = 0; k < c->n_after; k++) {
        lbr_rate rate = {vco / c->after[k],
                         {(unsigned)m, (unsigned)d, c->after[k]}};
        lbr_status status = lbr_rates_add(rates, rate, limits);
        if (status != LBR_OK) return status;
      }
    }
  return LBR_OK;
}

static int by_value(const void *left, const void *right) {
  const lbr_rate *a = left, *b = right;
  if (a->value != b->value) return a->value < b->value ? -1 : 1;
  for (int k = 0; k < 3; k++)
    if (a->setting[k] != b->setting[k])
      return a->setting[k] < b->setting[k] ? -1 : 1;
  return 0;
}

void lbr_rates_settle(lbr_rates *rates) {
  size_t kept = 0;
  if (rates->count == 0) return;
  qsort(rates->item, rates->count, sizeof *rates->item, by_value);
  for (size_t i = 1; i < rates->count; i++) {
    double before = rates->item[kept].value, value = rates->item[i].value;
    if (value - before > SAME * value) rates->item[++kept] = rates->item[i];
  }
  rates->count = kept + 1;
}

void lbr_rates_free(lbr_rates *rates) {
  free(rates->item);
  *rates = (lbr_rates){NULL, 0, 0};
}
