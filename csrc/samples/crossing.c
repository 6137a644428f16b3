#include "samples/crossing.h"

#include <stdbool.h>

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
        if (count < most)
          out[count] = (double)(i - 1) + (level - before) / (now - before);
        count++;
      }
      armed = false;
    } else if (now < level && now <= level - rule->hysteresis) {
      armed = true;
    }
  }
  return count;
}
