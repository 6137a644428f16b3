#include "plan/problem.h"

#define FEWEST 16 /* samples of the shortest record anybody reads lines in */

size_t lbr_mode_least_samples(const lbr_mode *mode) {
  size_t lobe = 4 * (mode->window.shape->terms + 1);
  return lobe > FEWEST ? lobe : FEWEST;
}
