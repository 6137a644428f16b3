#include "synth/modulated.h"

#include <math.h>
#include <stdbool.h>
#include <string.h>

#include "base/cycles.h"
#include "synth/phase.h"

#define BLOCK LBR_SPREAD_BLOCK
#define PER_TURN 0.15915494309189533577

static bool sways_good(const lbr_sway *s, size_t n) {
  bool good = n <= LBR_MOST_SWAYS;
  for (size_t i = 0; good && i < n; i++)
    good = isfinite(s[i].depth) && isfinite(s[i].cycles) &&
           fabs(s[i].phase) < 1e9;
  return good;
}

lbr_status lbr_modulated_check(const lbr_modulated *m) {
  bool good = isfinite(m->amplitude) && isfinite(m->cycles) &&
              fabs(m->phase) < 1e9 && sways_good(m->am, m->n_am) &&
              sways_good(m->pm, m->n_pm);
  return good ? LBR_OK : LBR_DOMAIN;
}

/* out[i] += depth cos (or sin) of the modulator at first + i. */
static void sway_add(const lbr_sway *s, bool sine, int64_t first, double *out,
                     size_t n) {
  lbr_turn step = lbr_turn_of(s->cycles);
  lbr_turn at = lbr_turn_of_radians(s->phase) + step * (lbr_turn)first;
  for (size_t i = 0; i < n; i++, at += step) {
    double c, v;
    lbr_cos_sin_cycles(lbr_turn_cycles(at), &c, &v);
    out[i] += s->depth * (sine ? v : c);
  }
}

static void add_block(const lbr_modulated *m, int64_t first, double *out,
                      size_t n) {
  double level[BLOCK], turn[BLOCK];
  memset(turn, 0, sizeof turn);
  for (size_t i = 0; i < n; i++) level[i] = 1;
  for (size_t k = 0; k < m->n_am; k++)
    sway_add(&m->am[k], false, first, level, n);
  for (size_t k = 0; k < m->n_pm; k++)
    sway_add(&m->pm[k], true, first, turn, n);
  lbr_turn step = lbr_turn_of(m->cycles);
  lbr_turn at = lbr_turn_of_radians(m->phase) + step * (lbr_turn)first;
  for (size_t i = 0; i < n; i++, at += step) {
    double c, s, cycles = lbr_turn_cycles(at) + turn[i] * PER_TURN;
    lbr_cos_sin_cycles(lbr_fraction_part(cycles), &c, &s);
    out[i] += m->amplitude * level[i] * c;
  }
}

void lbr_modulated_add(const void *modulated, int64_t first, double *out,
                       size_t n) {
  for (size_t done = 0; done < n; done += BLOCK)
    add_block(modulated, first + (int64_t)done, out + done,
              n - done < BLOCK ? n - done : BLOCK);
}
