#include "synth/modes.h"

#include <complex.h>
#include <math.h>
#include <string.h>

#include "base/cycles.h"

#define BLOCK LBR_SPREAD_BLOCK
#define FORGOTTEN 40 /* nepers */
#define PER_TURN 0.15915494309189533577

lbr_status lbr_struck_check(const lbr_struck *s) {
  for (size_t i = 0; i < s->n_modes; i++) {
    const lbr_mode *m = &s->modes[i];
    if (!isfinite(m->amplitude) || !isfinite(m->cycles) || m->cycles < 0 ||
        !isfinite(m->decay) || !(m->decay > 0) || !(fabs(m->phase) < 1e9))
      return LBR_DOMAIN;
  }
  for (size_t i = 0; i < s->n_hits; i++) {
    if (!isfinite(s->at[i]) || !isfinite(s->strength[i])) return LBR_DOMAIN;
    if (i > 0 && s->at[i] < s->at[i - 1]) return LBR_DOMAIN;
  }
  return LBR_OK;
}

/* The first hit that is later than t. */
static size_t hits_until(const lbr_struck *s, double t) {
  size_t low = 0, high = s->n_hits;
  while (low < high) {
    size_t middle = low + (high - low) / 2;
    if (s->at[middle] <= t)
      low = middle + 1;
    else
      high = middle;
  }
  return low;
}

/* strength exp((-decay + 2 pi i cycles) d + i phase) */
static double complex ring_of(const lbr_mode *m, double strength, double d) {
  double c, s, level = strength * exp(-m->decay * d);
  double cycles = lbr_fraction_part(m->cycles * d) + m->phase * PER_TURN;
  lbr_cos_sin_cycles(lbr_fraction_part(cycles), &c, &s);
  return CMPLX(level * c, level * s);
}

/* State at sample t of all hits not later. */
static double complex state_at(const lbr_struck *s, const lbr_mode *m,
                               double t, size_t *next) {
  double complex state = 0;
  size_t end = hits_until(s, t);
  for (size_t i = hits_until(s, t - FORGOTTEN / m->decay); i < end; i++)
    state += ring_of(m, s->strength[i], t - s->at[i]);
  *next = end;
  return state;
}

static void add_mode(const lbr_struck *s, const lbr_mode *m, int64_t first,
                     double *block) {
  size_t next;
  double complex state = state_at(s, m, (double)first, &next);
  double complex step = ring_of(&(lbr_mode){.cycles = m->cycles,
                                            .decay = m->decay}, 1, 1);
  double a = creal(step), b = cimag(step);
  double re = creal(state), im = cimag(state);
  for (size_t k = 0; k < BLOCK; k++) {
    double t = (double)first + (double)k, turned = a * re - b * im;
    if (k > 0) {
      im = a * im + b * re;
      re = turned;
    }
    for (; next < s->n_hits && s->at[next] <= t; next++) {
      double complex hit = ring_of(m, s->strength[next], t - s->at[next]);
      re += creal(hit), im += cimag(hit);
    }
    block[k] += m->amplitude * im;
  }
}

static void make_block(const void *struck, int64_t first, double *block) {
  const lbr_struck *s = struck;
  memset(block, 0, BLOCK * sizeof *block);
  for (size_t k = 0; k < s->n_modes; k++)
    add_mode(s, &s->modes[k], first, block);
}

void lbr_struck_add(const void *struck, int64_t first, double *out, size_t n) {
  lbr_add_blocks(make_block, struck, first, out, n);
}
