#include "samples/rails.h"

#include <float.h>
#include <math.h>
#include <stdbool.h>
#include <stdint.h>
#include <string.h>

#define BLOCK 1024 /* samples looked through at once */

typedef struct range {
  double low, high;
  size_t bad; /* samples that are not finite, which take no part */
} range;

static range finite_range(const double *x, size_t n) {
  range r = {INFINITY, -INFINITY, 0};
  for (size_t i = 0; i < n; i++) {
    bool finite = fabs(x[i]) < INFINITY;
    if (finite && x[i] < r.low) r.low = x[i];
    if (finite && x[i] > r.high) r.high = x[i];
    r.bad += !finite;
  }
  return r;
}

/* The bits of a double as an integer with the same order (IEEE 754), in which
 * infinities and what is not a number lie beyond every finite value: so one
 * pass of integer minima and maxima, which become vector instructions, finds
 * the range and whether it is to be believed. */
static int64_t to_order(double x) {
  int64_t bits;
  memcpy(&bits, &x, sizeof bits);
  return bits ^ (bits >> 63 & INT64_MAX);
}

static double from_order(int64_t order) {
  double x;
  order ^= order >> 63 & INT64_MAX;
  memcpy(&x, &order, sizeof x);
  return x;
}

__attribute__((target_clones("avx512f", "avx2", "default"))) static void
order_range(const double *x, size_t n, int64_t *low, int64_t *high) {
  int64_t least = INT64_MAX, most = INT64_MIN;
  for (size_t i = 0; i < n; i++) {
    int64_t order;
    memcpy(&order, &x[i], sizeof order);
    order ^= order >> 63 & INT64_MAX;
    least = order < least ? order : least;
    most = order > most ? order : most;
  }
  *low = least;
  *high = most;
}

static range block_range(const double *x, size_t n) {
  int64_t low, high;
  order_range(x, n, &low, &high);
  if (low < to_order(-DBL_MAX) || high > to_order(DBL_MAX))
    return finite_range(x, n);
  return (range){from_order(low), from_order(high), 0};
}

static void count(bool at_rail, size_t *total, size_t *run, size_t *longest) {
  *run = at_rail ? *run + 1 : 0;
  *total += at_rail;
  if (*run > *longest) *longest = *run;
}

void lbr_rails_scan(const double *x, size_t n, double low, double high,
                    lbr_rails *out) {
  lbr_rails r = {.first = n, .least = INFINITY, .most = -INFINITY};
  size_t run_low = 0, run_high = 0;
  for (size_t from = 0; from < n; from += BLOCK) {
    size_t length = n - from < BLOCK ? n - from : BLOCK;
    range block = block_range(x + from, length);
    r.bad += block.bad;
    if (block.low < r.least) r.least = block.low;
    if (block.high > r.most) r.most = block.high;
    if (block.bad == 0 && block.low > low && block.high < high) {
      run_low = run_high = 0;
      continue;
    }
    for (size_t i = from; i < from + length; i++) {
      bool is_low = x[i] <= low, is_high = x[i] >= high;
      if ((is_low || is_high) && r.first == n) r.first = i;
      count(is_low, &r.low, &run_low, &r.low_run);
      count(is_high, &r.high, &run_high, &r.high_run);
    }
  }
  if (r.least > r.most) r.least = r.most = 0.0;
  *out = r;
}
