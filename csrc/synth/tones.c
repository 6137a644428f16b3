#include "synth/tones.h"

#include <math.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>

#include "base/checked.h"
#include "base/cycles.h"
#include "synth/bank.h"

#define BATCH 64     /* tones whose phases are held at once */
#define ABREAST 4    /* blocks computed together */
#define HALF (LBR_TONE_BLOCK / 2)
#define ALIGNMENT 64

typedef double vec __attribute__((vector_size(LBR_TILE * sizeof(double))));

lbr_status lbr_bank_make(size_t most_tones, lbr_bank **bank) {
  size_t row = LBR_TONE_BLOCK * sizeof(double), bytes;
  if (most_tones > LBR_MOST_TONES) return LBR_DOMAIN;
  if (lbr_size(most_tones, row, &bytes) != LBR_OK) return LBR_OVERFLOW;
  lbr_bank *b = lbr_alloc(1, sizeof *b);
  if (!b) return LBR_NO_MEMORY;
  b->most = most_tones;
  b->ready = lbr_alloc(most_tones, sizeof *b->ready);
  b->memory = lbr_alloc(1, bytes + ALIGNMENT);
  if (!b->ready || !b->memory) {
    lbr_bank_free(b);
    return LBR_NO_MEMORY;
  }
  uintptr_t address = (uintptr_t)b->memory + ALIGNMENT - 1;
  b->table = (double *)(address & ~(uintptr_t)(ALIGNMENT - 1));
  *bank = b;
  return LBR_OK;
}

void lbr_bank_free(lbr_bank *bank) {
  if (!bank) return;
  free(bank->memory);
  free(bank->ready);
  free(bank);
}

static bool is_moving(const lbr_tone *t) {
  return t->ramp != 0 || t->swing != 0;
}

static bool is_good(const lbr_tone *t) {
  bool finite = isfinite(t->amplitude) && isfinite(t->cycles) &&
                isfinite(t->ramp) && isfinite(t->swing) && isfinite(t->beat);
  bool phases = fabs(t->phase) < 1e9 && fabs(t->swing_phase) < 1e9;
  return finite && phases && (t->swing == 0 || t->beat != 0);
}

static lbr_ready make_ready(const lbr_tone *t) {
  lbr_ready r = {.tone = *t};
  r.step = lbr_turn_of(t->cycles / 2);
  r.start = lbr_turn_of_radians(t->phase);
  r.bend = lbr_turn_of(t->ramp / 2);
  r.beat = lbr_turn_of(t->beat);
  r.beat_start = lbr_turn_of_radians(t->swing_phase);
  if (t->swing != 0)
    r.depth = t->swing / (6.283185307179586476925 * t->beat);
  return r;
}

/* cos and sin of 2 pi f k for k = i + 1/2: f modulo 2, since k is half whole,
 * as high + low with so few bits in high that high * k is exact. */
__attribute__((target_clones("avx512f", "avx2", "default"))) static void
fill_table(double cycles, double *restrict c, double *restrict s) {
  double f = 2 * lbr_fraction_part(cycles / 2);
  double high = (f + 0x1.8p10) - 0x1.8p10, low = f - high;
  for (int i = 0; i < HALF; i++) {
    double k = i + 0.5;
    lbr_cos_sin_cycles(lbr_fraction_part(high * k) + low * k, &c[i], &s[i]);
  }
}

static void tabulate(lbr_bank *bank) {
  double c[HALF], s[HALF];
  for (size_t t = 0; t < bank->steady; t++) {
    double cycles = bank->ready[t].tone.cycles;
    fill_table(fabs(cycles) < 2 ? cycles : fmod(cycles, 2), c, s);
    for (size_t tile = 0; tile < LBR_TILES; tile++) {
      double *row = bank->table + (tile * bank->steady + t) * 2 * LBR_TILE;
      memcpy(row, c + tile * LBR_TILE, LBR_TILE * sizeof *row);
      memcpy(row + LBR_TILE, s + tile * LBR_TILE, LBR_TILE * sizeof *row);
    }
  }
}

lbr_status lbr_bank_set(lbr_bank *bank, const lbr_tone *tones, size_t n) {
  size_t steady = 0;
  if (n > bank->most) return LBR_DOMAIN;
  for (size_t t = 0; t < n; t++) {
    if (!is_good(&tones[t])) return LBR_DOMAIN;
    steady += !is_moving(&tones[t]);
  }
  size_t next[2] = {0, steady};
  for (size_t t = 0; t < n; t++)
    bank->ready[next[is_moving(&tones[t])]++] = make_ready(&tones[t]);
  bank->steady = steady;
  bank->count = n;
  tabulate(bank);
  return LBR_OK;
}

/* Amplitude times cosine and sine of the phases at the centres of `blocks`
 * blocks from sample `start`, tone by tone; k quarter cycles ahead. */
static void centre_phases(const lbr_ready *ready, size_t tones, int k,
                          uint64_t start, int blocks, double *restrict phase) {
  for (size_t t = 0; t < tones; t++) {
    const lbr_ready *r = &ready[t];
    lbr_turn halves = 2 * (lbr_turn)start + LBR_TONE_BLOCK - 1;
    lbr_turn at = r->start + r->step * halves + ((lbr_turn)(unsigned)k << 126);
    for (int b = 0; b < blocks; b++) {
      phase[(int)t * blocks + b] = lbr_turn_cycles(at);
      at += r->step * (2 * LBR_TONE_BLOCK);
    }
  }
}

__attribute__((target_clones("avx512f", "avx2", "default"))) static void
cosines(double *restrict c, double *restrict s, const double *restrict weight,
        size_t n) {
  for (size_t i = 0; i < n; i++) {
    double x, y;
    lbr_cos_sin_cycles(c[i], &x, &y);
    c[i] = weight[i] * x;
    s[i] = weight[i] * y;
  }
}

/* The k-th derivative multiplies amplitudes by (2 pi f)^k. */
static void spread_weights(const lbr_ready *ready, size_t tones, int k,
                           int blocks, double *weight) {
  for (size_t t = 0; t < tones; t++) {
    double w = ready[t].tone.amplitude;
    for (int d = 0; d < k; d++)
      w *= 6.283185307179586 * ready[t].tone.cycles;
    for (int b = 0; b < blocks; b++) weight[(int)t * blocks + b] = w;
  }
}

/* even, odd: [tile][block][8]; adds `tones` tones to them.  row: their part
 * of the table for tile 0; stride: doubles from tile to tile. */
__attribute__((target_clones("avx512f", "avx2", "default"))) static void
add_four(const double *row, size_t stride, size_t tones, const double *c,
         const double *s, vec *restrict even, vec *restrict odd) {
  for (int tile = 0; tile < LBR_TILES; tile++, even += 4, odd += 4) {
    vec e0 = even[0], e1 = even[1], e2 = even[2], e3 = even[3];
    vec o0 = odd[0], o1 = odd[1], o2 = odd[2], o3 = odd[3];
    const vec *table = (const vec *)(const void *)(row + (size_t)tile * stride);
    for (size_t t = 0; t < tones; t++) {
      vec tc = table[2 * t], ts = table[2 * t + 1];
      e0 += c[4 * t] * tc, o0 += s[4 * t] * ts;
      e1 += c[4 * t + 1] * tc, o1 += s[4 * t + 1] * ts;
      e2 += c[4 * t + 2] * tc, o2 += s[4 * t + 2] * ts;
      e3 += c[4 * t + 3] * tc, o3 += s[4 * t + 3] * ts;
    }
    even[0] = e0, even[1] = e1, even[2] = e2, even[3] = e3;
    odd[0] = o0, odd[1] = o1, odd[2] = o2, odd[3] = o3;
  }
}

__attribute__((target_clones("avx512f", "avx2", "default"))) static void
add_one(const double *row, size_t stride, size_t tones, const double *c,
        const double *s, vec *restrict even, vec *restrict odd) {
  for (int tile = 0; tile < LBR_TILES; tile++) {
    vec e = even[tile], o = odd[tile];
    const vec *table = (const vec *)(const void *)(row + (size_t)tile * stride);
    for (size_t t = 0; t < tones; t++) {
      e += c[t] * table[2 * t];
      o += s[t] * table[2 * t + 1];
    }
    even[tile] = e, odd[tile] = o;
  }
}

/* Both halves of each block from E and O. */
__attribute__((target_clones("avx512f", "avx2", "default"))) static void
unfold(const double *restrict even, const double *restrict odd, int blocks,
       int block, double *restrict out) {
  for (int tile = 0; tile < LBR_TILES; tile++) {
    const double *e = even + (tile * blocks + block) * LBR_TILE;
    const double *o = odd + (tile * blocks + block) * LBR_TILE;
    double *up = out + HALF + tile * LBR_TILE;
    double *down = out + HALF - (tile + 1) * LBR_TILE;
    for (int i = 0; i < LBR_TILE; i++) up[i] += e[i] - o[i];
    for (int i = 0; i < LBR_TILE; i++)
      down[i] += e[LBR_TILE - 1 - i] + o[LBR_TILE - 1 - i];
  }
}

/* One or four whole blocks from sample `start`, a multiple of the block. */
static void add_blocks(const lbr_bank *bank, int k, uint64_t start, int blocks,
                       double *out) {
  vec even[LBR_TILES * ABREAST] = {{0}}, odd[LBR_TILES * ABREAST] = {{0}};
  double c[BATCH * ABREAST], s[BATCH * ABREAST], weight[BATCH * ABREAST];
  size_t stride = bank->steady * 2 * LBR_TILE;
  for (size_t t = 0; t < bank->steady; t += BATCH) {
    size_t tones = bank->steady - t < BATCH ? bank->steady - t : BATCH;
    const double *row = bank->table + t * 2 * LBR_TILE;
    centre_phases(bank->ready + t, tones, k, start, blocks, c);
    spread_weights(bank->ready + t, tones, k, blocks, weight);
    cosines(c, s, weight, tones * (size_t)blocks);
    if (blocks == ABREAST)
      add_four(row, stride, tones, c, s, even, odd);
    else
      add_one(row, stride, tones, c, s, even, odd);
  }
  for (int b = 0; b < blocks; b++)
    unfold((const double *)even, (const double *)odd, blocks, b,
           out + b * LBR_TONE_BLOCK);
}

/* Samples first .. first + n - 1 of one block through a scratch block. */
static void add_part(const lbr_bank *bank, int k, uint64_t first, double *out,
                     size_t n) {
  double scratch[LBR_TONE_BLOCK] = {0};
  size_t skip = first % LBR_TONE_BLOCK;
  add_blocks(bank, k, first - skip, 1, scratch);
  for (size_t i = 0; i < n; i++) out[i] += scratch[skip + i];
}

void lbr_bank_add_derivative(const lbr_bank *bank, int k, uint64_t first,
                             double *out, size_t n) {
  if (bank->steady == 0) return;
  for (size_t done = 0; done < n;) {
    uint64_t at = first + done;
    size_t room = LBR_TONE_BLOCK - at % LBR_TONE_BLOCK, left = n - done;
    size_t take = left < room ? left : room;
    if (take == LBR_TONE_BLOCK && left >= ABREAST * LBR_TONE_BLOCK) {
      take = ABREAST * LBR_TONE_BLOCK;
      add_blocks(bank, k, at, ABREAST, out + done);
    } else if (take == LBR_TONE_BLOCK) {
      add_blocks(bank, k, at, 1, out + done);
    } else {
      add_part(bank, k, at, out + done, take);
    }
    done += take;
  }
}

void lbr_bank_add(const lbr_bank *bank, uint64_t first, double *out,
                  size_t n) {
  lbr_bank_add_derivative(bank, 0, first, out, n);
  for (size_t t = bank->steady; t < bank->count; t++)
    lbr_ready_add(&bank->ready[t], first, NULL, out, n);
}
