#include "samples/moments.h"

#include <math.h>

#include "samples/measure.h"

#define LANES 8
#define RUN 128
#define CLONES __attribute__((target_clones("avx512f", "avx2", "default")))

typedef struct powers {
  double p1, p2, p3, p4; /* sums of powers of the deviations */
} powers;

static double lanes_sum(const double *lane) {
  return ((lane[0] + lane[4]) + (lane[2] + lane[6])) +
         ((lane[1] + lane[5]) + (lane[3] + lane[7]));
}

CLONES static powers run_powers(const double *x, size_t n, double mean) {
  double a[LANES] = {0}, b[LANES] = {0}, c[LANES] = {0}, e[LANES] = {0};
  for (size_t i = 0; i < n; i += LANES) {
    size_t lanes = n - i < LANES ? n - i : LANES;
    for (size_t j = 0; j < lanes; j++) {
      double d = x[i + j] - mean, s = d * d;
      a[j] += d;
      b[j] += s;
      c[j] += s * d;
      e[j] += s * s;
    }
  }
  return (powers){lanes_sum(a), lanes_sum(b), lanes_sum(c), lanes_sum(e)};
}

static powers sum_powers(const double *x, size_t n, double mean) {
  if (n <= RUN) return run_powers(x, n, mean);
  size_t half = (n / RUN + 1) / 2 * RUN;
  powers p = sum_powers(x, half, mean);
  powers q = sum_powers(x + half, n - half, mean);
  return (powers){p.p1 + q.p1, p.p2 + q.p2, p.p3 + q.p3, p.p4 + q.p4};
}

lbr_moments lbr_moments_of(const double *x, size_t n) {
  double count = (double)n, mean = lbr_sum(x, n) / count;
  powers p = sum_powers(x, n, mean);
  double r = p.p1 / count, m2 = p.p2 / count, m3 = p.p3 / count;
  return (lbr_moments){mean + r, m2 - r * r, m3 - 3 * r * m2 + 2 * r * r * r,
                       p.p4 / count - 4 * r * m3 + 6 * r * r * m2 -
                           3 * r * r * r * r};
}

static void swap(double *a, double *b) {
  double t = *a;
  *a = *b;
  *b = t;
}

/* Splits x[left .. right] about x[rank]; *low and *high are left where the two
 * walks met: all up to *high are not more, all from *low on not less. */
static void split(double *x, ptrdiff_t left, ptrdiff_t right, ptrdiff_t rank,
                  ptrdiff_t *low, ptrdiff_t *high) {
  double at = x[rank];
  ptrdiff_t i = left, j = right;
  while (i <= j) {
    while (x[i] < at) i++;
    while (x[j] > at) j--;
    if (i <= j) swap(&x[i++], &x[j--]);
  }
  *low = i;
  *high = j;
}

/* Floyd and Rivest, Algorithm 489, Comm. ACM 18 (1975) 173: a long run is
 * split about a sample that is near the rank, found by selecting in a small
 * part around it. */
static void narrow(double *x, ptrdiff_t left, ptrdiff_t right,
                   ptrdiff_t rank) {
  while (right > left) {
    if (right - left > 600) {
      double n = (double)(right - left + 1), i = (double)(rank - left + 1);
      double z = log(n), s = 0.5 * exp(2 * z / 3);
      double sd = 0.5 * sqrt(z * s * (n - s) / n) * (i < n / 2 ? -1 : 1);
      double from = (double)rank - i * s / n + sd, to = from + s;
      narrow(x, from > (double)left ? (ptrdiff_t)from : left,
             to < (double)right ? (ptrdiff_t)to : right, rank);
    }
    ptrdiff_t low, high;
    split(x, left, right, rank, &low, &high);
    if (high < rank) left = low;
    if (rank < low) right = high;
  }
}

double lbr_select(double *x, size_t n, size_t rank) {
  narrow(x, 0, (ptrdiff_t)n - 1, (ptrdiff_t)rank);
  return x[rank];
}

double lbr_percentile(double *x, size_t n, double percent) {
  if (isnan(lbr_extremes_of(x, n).peak)) return NAN;
  double place = percent / 100.0 * (double)(n - 1);
  size_t rank = (size_t)place;
  if (rank >= n) rank = n - 1;
  double low = lbr_select(x, n, rank), share = place - (double)rank;
  if (share <= 0 || rank + 1 >= n) return low;
  double high = lbr_extremes_of(x + rank + 1, n - rank - 1).least;
  return low == high ? low : low + share * (high - low);
}

void lbr_histogram(const double *x, size_t n, double low, double high,
                   double *count, size_t bins, lbr_tails *tails) {
  double per = (double)bins / (high - low);
  for (size_t i = 0; i < n; i++) {
    if (isnan(x[i])) {
      tails->odd++;
    } else if (x[i] < low) {
      tails->below++;
    } else if (x[i] > high) {
      tails->above++;
    } else {
      size_t bin = (size_t)((x[i] - low) * per);
      count[bin < bins ? bin : bins - 1] += 1.0;
    }
  }
}
