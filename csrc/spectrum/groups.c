#include "spectrum/groups.h"

#define MOST_ORDERS 4096
#define MOST_CYCLES 4096

static double sum_of(const double *power, size_t first, size_t last) {
  double sum = 0;
  for (size_t k = first; k <= last; k++) sum += power[k];
  return sum;
}

lbr_status lbr_groups_of(const double *power, size_t bins, size_t cycles,
                         size_t orders, const lbr_groups *out) {
  size_t n = cycles, half = cycles / 2;
  if (n < 4 || n % 2 || n > MOST_CYCLES || orders < 1 || orders > MOST_ORDERS)
    return LBR_DOMAIN;
  if (bins < orders * n + half + 1) return LBR_DOMAIN;
  for (size_t i = 0; i < orders; i++) {
    size_t h = (i + 1) * n, below = i * n;
    out->group[i] = (power[h - half] + power[h + half]) / 2 +
                    sum_of(power, h - half + 1, h + half - 1);
    out->subgroup[i] = sum_of(power, h - 1, h + 1);
    out->inter[i] = sum_of(power, below + 1, below + n - 1);
    out->inter_centred[i] = sum_of(power, below + 2, below + n - 2);
  }
  return LBR_OK;
}
