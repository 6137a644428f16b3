#include "samples/crossing.h"

#include <math.h>
#include <stdbool.h>

#define HALVINGS 50

/* Cubic through four values at -1, 0, 1, 2, at f. */
static double cubic_at(const double v[4], double f) {
  double a = (f + 1) * f, b = (f - 1) * (f - 2);
  return (v[1] * (f + 1) * b - v[2] * a * (f - 2)) / 2 +
         (v[3] * a * (f - 1) - v[0] * f * b) / 6;
}

/* Where the cubic reaches the level between 0 (below it) and 1 (not below). */
static double cubic_place(const double v[4], double level, bool falling) {
  double low = 0, high = 1;
  for (int i = 0; i < HALVINGS; i++) {
    double middle = 0.5 * (low + high), value = cubic_at(v, middle);
    if (falling ? value > level : value < level)
      low = middle;
    else
      high = middle;
  }
  return 0.5 * (low + high);
}

/* Place of the crossing between samples i - 1 and i. */
static double place_of(const double *x, size_t n, size_t i,
                       const lbr_crossing_rule *rule) {
  if (rule->cubic && i >= 2 && i + 1 < n && isfinite(x[i - 2] + x[i + 1]))
    return (double)(i - 1) + cubic_place(x + i - 2, rule->level,
                                         rule->falling);
  return (double)(i - 1) + (rule->level - x[i - 1]) / (x[i] - x[i - 1]);
}

size_t lbr_crossings(const double *x, size_t n, const lbr_crossing_rule *rule,
                     double *out, size_t most) {
  double sign = rule->falling ? -1 : 1, level = sign * rule->level;
  bool armed = false;
  size_t count = 0;
  for (size_t i = 0; i < n; i++) {
    double now = sign * x[i];
    if (armed && now >= level) {
      double before = sign * x[i - 1];
      if (before < level) {
        if (count < most) out[count] = place_of(x, n, i, rule);
        count++;
      }
      armed = false;
    } else if (now < level && now <= level - rule->hysteresis) {
      armed = true;
    }
  }
  return count;
}
