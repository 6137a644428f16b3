#include "plan/fold.h"

#include <math.h>

lbr_fold lbr_fold_at(double hz, double rate) {
  double zone = floor(hz / (rate / 2)) + 1;
  bool inverted = fmod(zone, 2) == 0;
  double rest = fmod(hz, rate);
  return (lbr_fold){inverted ? rate - rest : rest, zone, inverted};
}

double lbr_fold_distance(double low, double high, double rate) {
  if (high - low >= rate) return 0;
  double turns = rint((low + high) / 2 / rate);
  double a = low - turns * rate, b = high - turns * rate;
  if (a <= 0 && b >= 0) return 0;
  double near = fmin(fabs(a), fabs(b)), far = fmax(fabs(a), fabs(b));
  return far >= rate ? 0 : fmin(near, rate - far);
}

bool lbr_fold_band(double low, double high, unsigned n, double *least,
                   double *most) {
  *least = 2 * high / n;
  *most = n == 1 ? INFINITY : 2 * low / (n - 1);
  return *least <= *most;
}
