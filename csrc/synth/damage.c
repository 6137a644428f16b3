#include "synth/damage.h"

#include <math.h>

#define PI 3.14159265358979323846

size_t lbr_clip(double *x, size_t n, double low, double high) {
  size_t count = 0;
  for (size_t i = 0; i < n; i++) {
    count += x[i] < low || x[i] > high;
    x[i] = fmax(low, fmin(high, x[i]));
  }
  return count;
}

void lbr_soften(double *x, size_t n, double low, double high, double knee) {
  for (size_t i = 0; i < n; i++) {
    double level = x[i] < 0 ? low : high, share = fabs(x[i]) / level;
    double past = (share - 1 + knee) / knee;
    if (past > 0)
      x[i] = copysign(level * (1 - knee + knee * tanh(past)), x[i]);
  }
}

void lbr_bend(double *x, size_t n, double second, double third) {
  for (size_t i = 0; i < n; i++)
    x[i] += x[i] * x[i] * (second + third * x[i]);
}

void lbr_coarsen(double *x, size_t n, double step) {
  for (size_t i = 0; i < n; i++) x[i] = step * rint(x[i] / step);
}

/* The low bits of a word as a two's-complement number. */
static int64_t signed_of(uint64_t word, int bits) {
  int64_t half = (int64_t)1 << (bits - 1), whole = half * 2;
  int64_t value = (int64_t)(word & (uint64_t)(whole - 1));
  return value >= half ? value - whole : value;
}

static int64_t damaged(int64_t code, const lbr_code_damage *d) {
  uint64_t word = ((uint64_t)code & d->keep) | d->force;
  int64_t value = signed_of(word, d->bits);
  if (d->skip > 0) {
    int64_t place = value % d->skip;
    if (place < 0) place += d->skip;
    if (place == d->skip / 2) value++;
  }
  return value;
}

lbr_status lbr_damage_codes(double *x, size_t n, const lbr_code_damage *d,
                            size_t *changed) {
  size_t count = 0;
  if (d->bits < 1 || d->bits > 32) return LBR_DOMAIN;
  for (size_t i = 0; i < n; i++) {
    if (!(fabs(x[i]) <= 0x1p31) || x[i] != rint(x[i])) return LBR_DOMAIN;
    double code = (double)damaged((int64_t)x[i], d);
    count += code != x[i];
    x[i] = code;
  }
  *changed = count;
  return LBR_OK;
}

void lbr_section_run(const lbr_section *s, double *x, size_t n) {
  if (n == 0) return;
  double x1 = x[0], x2 = x[0], y1 = x[0], y2 = x[0];
  for (size_t i = 0; i < n; i++) {
    double y = s->b[0] * x[i] + s->b[1] * x1 + s->b[2] * x2 - s->a[0] * y1 -
               s->a[1] * y2;
    x2 = x1, x1 = x[i];
    y2 = y1, y1 = y;
    x[i] = y;
  }
}

lbr_section lbr_low_pass(double corner) {
  double w = tan(PI * corner);
  return (lbr_section){{w / (1 + w), w / (1 + w), 0}, {(w - 1) / (w + 1), 0}};
}

lbr_section lbr_resonance(double cycles, double q) {
  double w = tan(PI * cycles), w2 = w * w, scale = 1 / (1 + w / q + w2);
  return (lbr_section){{w2 * scale, 2 * w2 * scale, w2 * scale},
                       {2 * (w2 - 1) * scale, (1 - w / q + w2) * scale}};
}
