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

/* The middle one of three, as the value to split at. */
static double middle(double a, double b, double c) {
  double low = a < b ? a : b, high = a < b ? b : a;
  return c < low ? low : c > high ? high : c;
}

/* A value to split at that no order of the samples makes bad for long. */
static double split_at(const double *x, size_t from, size_t to,
                       unsigned *state) {
  size_t n = to - from, pick[3];
  for (int i = 0; i < 3; i++) {
    *state = *state * 1664525u + 1013904223u;
    pick[i] = from + (size_t)(*state) % n;
  }
  return middle(x[pick[0]], x[pick[1]], x[pick[2]]);
}

/* Hoare's selection with a split in three: less, equal, more. */
double lbr_select(double *x, size_t n, size_t rank) {
  size_t from = 0, to = n;
  unsigned state = 12345;
  while (to - from > 1) {
    double at = split_at(x, from, to, &state);
    size_t less = from, i = from, more = to;
    while (i < more) {
      if (x[i] < at)
        swap(&x[i++], &x[less++]);
      else if (x[i] > at)
        swap(&x[i], &x[--more]);
      else
        i++;
    }
    if (rank < less)
      to = less;
    else if (rank >= more)
      from = more;
    else
      return at;
  }
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
