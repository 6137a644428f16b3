/* Folding: where a true frequency shows in a record. */
#ifndef LBR_PLAN_FOLD_H
#define LBR_PLAN_FOLD_H

#include <stdbool.h>

typedef struct lbr_fold {
  double shown_hz; /* 0 .. rate / 2 */
  double zone;     /* 1: below rate/2, 2: rate/2 .. rate, ... */
  bool inverted;   /* rising frequency shows as falling (even zones) */
} lbr_fold;

/* hz >= 0, rate > 0, both finite. */
lbr_fold lbr_fold_at(double hz, double rate);

/* Least distance of any frequency in [low, high] from a multiple of rate. */
double lbr_fold_distance(double low, double high, double rate);

/* Deliberate undersampling of the band [low, high]: the rates
 *   2 high / n <= rate <= 2 low / (n - 1)
 * that fold it into one zone n (Vaughan, Scott & White 1991, eq. 4-5).
 * *most is INFINITY for n = 1; returns false where no such rate exists. */
bool lbr_fold_band(double low, double high, unsigned n, double *least,
                   double *most);

#endif
