#include "filter/polyphase.h"

#include <string.h>

#include "base/checked.h"

#define LANES 8
#define CLONES __attribute__((target_clones("avx512f", "avx2", "default")))

lbr_status lbr_polyphase_make(const double *h, size_t taps, size_t up,
                              size_t down, size_t centre,
                              lbr_polyphase *out) {
  if (up < 1 || up > LBR_POLYPHASE_MOST_FACTOR || down < 1 ||
      down > LBR_POLYPHASE_MOST_FACTOR || taps < 1 || centre >= taps)
    return LBR_DOMAIN;
  size_t span = (taps + up - 1) / up;
  double *phase = lbr_alloc(up, span * sizeof *phase);
  if (!phase) return LBR_NO_MEMORY;
  for (size_t i = 0; i < taps; i++)
    phase[(i % up) * span + (span - 1 - i / up)] = h[i];
  *out = (lbr_polyphase){up, down, taps, centre, span, phase};
  return LBR_OK;
}

/* Every output by the same additions: LANES sums, then these. */
static inline double product(const double *h, const double *x, size_t n) {
  double lane[LANES] = {0};
  size_t i = 0;
  for (; i + LANES <= n; i += LANES)
    for (size_t j = 0; j < LANES; j++) lane[j] += h[i + j] * x[i + j];
  for (size_t j = 0; i + j < n; j++) lane[j] += h[i + j] * x[i + j];
  return ((lane[0] + lane[4]) + (lane[2] + lane[6])) +
         ((lane[1] + lane[5]) + (lane[3] + lane[7]));
}

/* Outputs for which place (in up-sampled steps from x[0]) / up, the last
 * sample looked at, is below n. */
CLONES static size_t run_inside(const lbr_polyphase *p, const double *x,
                                uint64_t *place, size_t n, double *y) {
  size_t made = 0, up = p->up, at = (size_t)(*place / up);
  size_t row = (size_t)(*place % up);
  size_t skip = p->down / up, rest = p->down % up;
  while (at < n) {
    y[made++] = product(p->phase + row * p->span, x + at, p->span);
    at += skip;
    row += rest;
    if (row >= up) {
      row -= up;
      at++;
    }
  }
  *place = (uint64_t)at * up + row;
  return made;
}

size_t lbr_polyphase_count(const lbr_polyphase *p,
                           const lbr_polyphase_state *state, size_t n) {
  uint64_t reach = (state->seen + n) * p->up;
  if (reach <= p->centre) return 0;
  return (size_t)((reach - p->centre - 1) / p->down + 1 - state->made);
}

/* The last span - 1 samples seen move to the front of the seam. */
static void keep(double *seam, size_t back, const double *x, size_t n) {
  if (n >= back) {
    memcpy(seam, x + (n - back), back * sizeof *seam);
  } else {
    memmove(seam, seam + n, (back - n) * sizeof *seam);
    memcpy(seam + (back - n), x, n * sizeof *seam);
  }
}

void lbr_polyphase_run(const lbr_polyphase *p, lbr_polyphase_state *state,
                       const double *x, size_t n, double *y) {
  size_t back = p->span - 1, head = n < back ? n : back;
  if (n == 0) return;
  uint64_t place = p->centre + state->made * p->down - state->seen * p->up;
  size_t made = 0;
  if (back) {
    memcpy(state->seam + back, x, head * sizeof *x);
    made = run_inside(p, state->seam, &place, head, y);
  }
  if (n > head) {
    uint64_t from = place - (uint64_t)head * p->up;
    made += run_inside(p, x, &from, n - head, y + made);
  }
  state->seen += n;
  state->made += made;
  if (back) keep(state->seam, back, x, n);
}

size_t lbr_polyphase_total(const lbr_polyphase *p, uint64_t n) {
  return (size_t)((n * p->up + p->down - 1) / p->down);
}

size_t lbr_polyphase_beyond(const lbr_polyphase *p) {
  return p->centre / p->up + 1;
}
