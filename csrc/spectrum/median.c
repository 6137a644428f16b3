#include "spectrum/median.h"

#include <math.h>

static void swap(double *a, double *b) {
  double kept = *a;
  *a = *b;
  *b = kept;
}

/* The middle one of the ends and the middle: a pivot that sorted runs do not
 * spoil. */
static double pivot_of(double *x, size_t low, size_t high) {
  size_t mid = low + (high - low) / 2;
  if (x[mid] < x[low]) swap(&x[mid], &x[low]);
  if (x[high] < x[low]) swap(&x[high], &x[low]);
  if (x[high] < x[mid]) swap(&x[high], &x[mid]);
  return x[mid];
}

/* Puts the value of rank r at x[r], smaller ones before it. */
static void select_rank(double *x, size_t n, size_t r) {
  size_t low = 0, high = n - 1;
  while (low < high) {
    double pivot = pivot_of(x, low, high);
    size_t i = low, j = high;
    for (;;) {
      while (x[i] < pivot) i++;
      while (x[j] > pivot) j--;
      if (i >= j) break;
      swap(&x[i++], &x[j--]);
    }
    /* x[low .. j] <= pivot <= x[j + 1 .. high] */
    if (i == j && r == j) return;
    if (r <= j) high = j; else low = j + 1;
  }
}

double lbr_median(double *x, size_t n) {
  for (size_t i = 0; i < n; i++)
    if (isnan(x[i])) return x[i];
  size_t r = n / 2;
  select_rank(x, n, r);
  if (n % 2) return x[r];
  double below = x[0];
  for (size_t i = 1; i < r; i++)
    if (x[i] > below) below = x[i];
  return below + (x[r] - below) / 2;
}
