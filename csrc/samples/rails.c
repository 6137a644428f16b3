#include "samples/rails.h"

#include <math.h>
#include <stdbool.h>

#define BLOCK 1024

/* Smallest and largest finite sample of a block, and how many are not finite;
 * the common case, and the one that vectorises. */
static size_t block_range(const double *x, size_t n, double *least,
                          double *most) {
  double low = INFINITY, high = -INFINITY;
  size_t bad = 0;
  for (size_t i = 0; i < n; i++) {
    bool finite = fabs(x[i]) < INFINITY;
    low = finite && x[i] < low ? x[i] : low;
    high = finite && x[i] > high ? x[i] : high;
    bad += !finite;
  }
  if (low < *least) *least = low;
  if (high > *most) *most = high;
  return bad;
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
    double least = INFINITY, most = -INFINITY;
    size_t bad = block_range(x + from, length, &least, &most);
    r.bad += bad;
    if (least < r.least) r.least = least;
    if (most > r.most) r.most = most;
    if (bad == 0 && least > low && most < high) {
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
