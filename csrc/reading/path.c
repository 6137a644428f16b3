#include "reading/path.h"

#include <math.h>

/* Noise folds are summed until the filter's gain stays below this. */
#define FOLD_LEVEL 1e-4
#define MOST_FOLDS 4096.0

size_t lbr_path_doubles(const lbr_scene *scene) {
  return scene->n_sources + 3 * scene->n_lines;
}

/* Sum of |F|^2 over all frequencies that show where `hz` shows. */
static double folded_power(const lbr_filter *filter, double hz, double rate) {
  double own = lbr_filter_gain(filter, hz, rate);
  double edge = lbr_filter_edge(filter, FOLD_LEVEL, rate);
  if (filter->shape == LBR_FILTER_NONE || !isfinite(edge)) return own * own;
  double place = fmod(hz, rate);
  double folds = fmin(ceil(edge / rate) + 1, MOST_FOLDS), sum = 0;
  for (double k = 0; k <= folds; k++) {
    double up = lbr_filter_gain(filter, k * rate + place, rate);
    double down = lbr_filter_gain(filter, (k + 1) * rate - place, rate);
    sum += up * up + down * down;
  }
  return sum;
}

static void fill_line(lbr_path *path, const lbr_scene *scene,
                      const lbr_front_end *front, size_t i, double low,
                      double high) {
  double hz = scene->sources[i].hz;
  double nominal = lbr_filter_gain(&front->filter, hz, path->rate);
  double slope = fmax(high / nominal - 1, 1 - low / nominal);
  path->nominal[i] = nominal;
  path->droop[i] = (1 + slope) * (1 + front->flatness) - 1;
  path->density[i] =
      scene->noise * scene->noise *
          folded_power(&front->filter, hz, path->rate) +
      front->noise * front->noise;
}

void lbr_path_fill(lbr_path *path, const lbr_scene *scene,
                   const lbr_front_end *front, double rate, double *memory) {
  path->rate = rate;
  path->high = memory;
  path->nominal = path->high + scene->n_sources;
  path->droop = path->nominal + scene->n_lines;
  path->density = path->droop + scene->n_lines;
  for (size_t j = 0; j < scene->n_sources; j++) {
    double from = lbr_seen_low(scene, front, j), low, high;
    double to = lbr_seen_high(scene, front, j);
    lbr_filter_range(&front->filter, fmax(from, 0), to, rate, &low, &high);
    path->high[j] = high;
    if (j < scene->n_lines) fill_line(path, scene, front, j, low, high);
  }
}
