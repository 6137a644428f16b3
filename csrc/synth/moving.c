/* Tones evaluated sample by sample: those that move, and displaced instants. */
#include <math.h>

#include "base/cycles.h"
#include "synth/bank.h"

/* One tone around an anchor sample, everything reduced. */
typedef struct local {
  double amplitude;
  double start;       /* phase at the anchor, cycles */
  double cycles;      /* frequency at the anchor modulo 1, cycles per sample */
  double true_cycles; /* the same, not reduced: what a displacement sees */
  double bend;        /* ramp / 2 */
  double beat_start, beat; /* of the swing */
  double depth, depth_start; /* phase of the swing, and its value at 0 */
} local;

static local at_anchor(const lbr_ready *r, uint64_t anchor) {
  lbr_turn n = anchor, frequency = 2 * r->step + 2 * r->bend * n;
  double swing_phase = r->depth != 0 ? lbr_turn_cycles(r->beat_start) : 0;
  local l = {.amplitude = r->tone.amplitude, .bend = r->tone.ramp / 2,
             .beat = r->tone.beat, .depth = r->depth};
  double unused;
  l.start = lbr_turn_cycles(r->start + 2 * r->step * n + r->bend * n * n);
  l.cycles = lbr_turn_cycles(frequency);
  l.true_cycles = r->tone.cycles + r->tone.ramp * (double)anchor;
  l.beat_start = lbr_turn_cycles(r->beat_start + r->beat * n);
  lbr_cos_sin_cycles(swing_phase, &l.depth_start, &unused);
  return l;
}

__attribute__((target_clones("avx512f", "avx2", "default"))) static void
add_plain(const local *l, int from, double *restrict out, int n) {
  for (int i = 0; i < n; i++) {
    double j = from + i, c, s;
    lbr_cos_sin_cycles(l->start + j * l->cycles + l->bend * j * j, &c, &s);
    out[i] += l->amplitude * c;
  }
}

__attribute__((target_clones("avx512f", "avx2", "default"))) static void
add_shifted(const local *l, int from, const double *restrict shift,
            double *restrict out, int n) {
  for (int i = 0; i < n; i++) {
    double j = from + i, d = shift[i], c, s;
    double base = lbr_fraction_part(l->start + j * l->cycles);
    double moved = l->true_cycles * d + l->bend * (j + d) * (j + d);
    lbr_cos_sin_cycles(base + lbr_fraction_part(moved), &c, &s);
    out[i] += l->amplitude * c;
  }
}

__attribute__((target_clones("avx512f", "avx2", "default"))) static void
add_swinging(const local *l, int from, const double *restrict shift,
             double *restrict out, int n) {
  for (int i = 0; i < n; i++) {
    double j = from + i, d = shift[i], c, s, b;
    lbr_cos_sin_cycles(l->beat_start + l->beat * (j + d), &b, &s);
    double base = lbr_fraction_part(l->start + j * l->cycles);
    double moved = l->true_cycles * d + l->bend * (j + d) * (j + d) +
                   l->depth * (l->depth_start - b);
    lbr_cos_sin_cycles(base + lbr_fraction_part(moved), &c, &s);
    out[i] += l->amplitude * c;
  }
}

static const double no_shift[LBR_TONE_BLOCK];

void lbr_ready_add(const lbr_ready *ready, uint64_t first, const double *shift,
                   double *out, size_t n) {
  for (size_t done = 0; done < n;) {
    uint64_t at = first + done;
    int from = (int)(at % LBR_TONE_BLOCK);
    size_t room = LBR_TONE_BLOCK - (size_t)from;
    int take = (int)(n - done < room ? n - done : room);
    local l = at_anchor(ready, at - (uint64_t)from);
    const double *d = shift ? shift + done : no_shift;
    if (l.depth != 0)
      add_swinging(&l, from, d, out + done, take);
    else if (shift)
      add_shifted(&l, from, d, out + done, take);
    else
      add_plain(&l, from, out + done, take);
    done += (size_t)take;
  }
}

void lbr_bank_add_shifted(const lbr_bank *bank, uint64_t first,
                          const double *shift, double *out, size_t n,
                          int moving_only) {
  for (size_t t = moving_only ? bank->steady : 0; t < bank->count; t++)
    lbr_ready_add(&bank->ready[t], first, shift, out, n);
}
