#include "proof/draw.h"

#include <math.h>

/* The finaliser of SplitMix64 (Steele, Lea & Flood 2014, "Fast splittable
 * pseudorandom number generators", constants of Stafford's variant 13). */
static uint64_t mix(uint64_t z) {
  z = (z ^ (z >> 30)) * UINT64_C(0xbf58476d1ce4e5b9);
  z = (z ^ (z >> 27)) * UINT64_C(0x94d049bb133111eb);
  return z ^ (z >> 31);
}

#define GOLDEN UINT64_C(0x9e3779b97f4a7c15)

lbr_draw lbr_draw_start(uint64_t seed, uint64_t trial) {
  return (lbr_draw){mix(mix(seed + GOLDEN) ^ (trial * GOLDEN)), 0};
}

double lbr_draw_unit(lbr_draw *draw) {
  uint64_t bits = mix(draw->key + GOLDEN * ++draw->index);
  return (double)(bits >> 11) * 0x1p-53;
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
