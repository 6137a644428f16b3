#include "proof/draw.h"

#include <math.h>

lbr_draw lbr_draw_start(uint64_t seed, uint64_t trial, lbr_purpose purpose) {
  return (lbr_draw){lbr_key_of(seed, trial, 0, purpose), 0};
}

double lbr_draw_unit(lbr_draw *draw) {
  return lbr_random_uniform_at(&draw->key, draw->index++);
}

double lbr_draw_spread(lbr_draw *draw) {
  double end = lbr_draw_unit(draw), place = lbr_draw_unit(draw);
  if (end < 0.125) return -1;
  if (end < 0.25) return 1;
  return 2 * place - 1;
}

double lbr_draw_range(lbr_draw *draw, double least, double most) {
  double place = 0.5 * (lbr_draw_spread(draw) + 1);
  if (place <= 0) return least;
  if (place >= 1) return most;
  if (least > 0 && most > least) return least * pow(most / least, place);
  return least + (most - least) * place;
}
