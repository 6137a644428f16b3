#include "synth/digitizer.h"

#include <complex.h>
#include <math.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>

#include "base/checked.h"
#include "base/cycles.h"

#define TURN 6.283185307179586476925
#define CHUNK 1024         /* samples made at once */
#define SMALL_ANGLE 1e-3   /* 2 pi f jitter up to which the series serves */
#define FOLD_LEVEL 1e-4    /* folds are summed until the gain stays below */
#define MOST_FOLDS 4096.0

struct lbr_record_work {
  lbr_bank *bank;
  lbr_tone *tones;
  size_t most;
  double shift[CHUNK], slope[CHUNK], bend[CHUNK];
};

lbr_status lbr_record_work_make(size_t most_tones, lbr_record_work **work) {
  lbr_record_work *w = lbr_alloc(1, sizeof *w);
  if (!w) return LBR_NO_MEMORY;
  lbr_status status = lbr_bank_make(most_tones, &w->bank);
  if (status == LBR_OK && !(w->tones = lbr_alloc(most_tones, sizeof *w->tones)))
    status = LBR_NO_MEMORY;
  if (status != LBR_OK) {
    lbr_record_work_free(w);
    return status;
  }
  w->most = most_tones;
  *work = w;
  return LBR_OK;
}

void lbr_record_work_free(lbr_record_work *work) {
  if (!work) return;
  lbr_bank_free(work->bank);
  free(work->tones);
  free(work);
}

static bool is_level(double x) { return isfinite(x) && x >= 0; }

static bool is_good(const lbr_record_model *m) {
  bool clock = isfinite(m->rate) && m->rate > 0 && isfinite(m->timebase) &&
               m->timebase > -1 && isfinite(m->delay_s) &&
               is_level(m->jitter_s);
  bool levels = isfinite(m->offset) && isfinite(m->gain_error) &&
                is_level(m->input_noise) && is_level(m->own_noise);
  bool shape = !m->input_shape || m->input_shape->half <= LBR_MOST_HALF_TAPS;
  bool rails = m->range > 0 && m->bits >= 0 && m->bits <= 32 &&
               (m->bits == 0 || isfinite(m->range));
  return clock && levels && shape && rails;
}

static double whole_turns_off(double cycles) { return cycles - rint(cycles); }

/* The tone behind the filter, on the true sampling grid. */
static lbr_tone at_converter(const lbr_record_model *m,
                             const lbr_input_tone *t, double true_rate) {
  double late = m->delay_s, turns = whole_turns_off(t->hz * late) +
                                    whole_turns_off(t->ramp * late * late / 2);
  lbr_tone out = {.amplitude = t->amplitude,
                  .cycles = (t->hz + t->ramp * late) / true_rate,
                  .phase = t->phase,
                  .ramp = t->ramp / true_rate / true_rate};
  if (t->swing_hz != 0) {
    double c0 = cos(t->swing_phase);
    out.swing = t->swing_hz / true_rate;
    out.beat = 1 / (t->swing_s * true_rate);
    out.swing_phase =
        t->swing_phase + TURN * whole_turns_off(late / t->swing_s);
    turns += t->swing_hz * t->swing_s / TURN * (c0 - cos(out.swing_phase));
  }
  if (m->filter && m->filter->shape != LBR_FILTER_NONE) {
    double complex f = lbr_filter_response(m->filter, t->hz, m->rate);
    out.amplitude *= cabs(f);
    out.phase += carg(f);
  }
  out.phase += TURN * turns;
  return out;
}

static bool tone_is_good(const lbr_input_tone *t) {
  return is_level(t->hz) && isfinite(t->swing_s) &&
         (t->swing_hz == 0 || t->swing_s > 0);
}

/* Fills the bank; *widest gets the highest frequency among steady tones. */
static lbr_status set_tones(const lbr_record_model *m, double true_rate,
                            lbr_record_work *w, double *widest) {
  if (m->n_tones > w->most) return LBR_DOMAIN;
  *widest = 0;
  for (size_t t = 0; t < m->n_tones; t++) {
    if (!tone_is_good(&m->tones[t])) return LBR_DOMAIN;
    w->tones[t] = at_converter(m, &m->tones[t], true_rate);
    *widest = fmax(*widest, m->tones[t].hz);
  }
  return lbr_bank_set(w->bank, w->tones, m->n_tones);
}

/* Everything a chunk needs, worked out once a call. */
typedef struct prepared {
  const lbr_record_model *model;
  lbr_record_work *work;
  lbr_key jitter, input, own;
  double offset, displacement; /* behind the filter; samples */
  double input_sigma, own_sigma;
  bool series; /* jitter by derivatives */
} prepared;

static lbr_status prepare(const lbr_record_model *m, lbr_record_work *w,
                          prepared *p) {
  double widest, rate = m->rate * (1 + m->timebase);
  lbr_status status = set_tones(m, rate, w, &widest);
  if (status != LBR_OK) return status;
  *p = (prepared){.model = m, .work = w, .offset = m->offset};
  if (m->filter && m->filter->shape != LBR_FILTER_NONE)
    p->offset *= lbr_filter_gain(m->filter, 0, m->rate);
  p->displacement = m->jitter_s * rate;
  p->series = TURN * widest * m->jitter_s <= SMALL_ANGLE;
  p->input_sigma = m->input_noise * sqrt(rate / 2);
  p->own_sigma = m->own_noise * sqrt(rate / 2);
  p->jitter = lbr_key_of(m->seed, m->trial, m->channel, LBR_PURPOSE_JITTER);
  p->input = lbr_key_of(m->seed, m->trial, m->channel,
                        LBR_PURPOSE_INPUT_NOISE);
  p->own = lbr_key_of(m->seed, m->trial, m->channel, LBR_PURPOSE_OWN_NOISE);
  return LBR_OK;
}

/* Steady tones at displaced instants: x + d x' + d^2 x'' / 2. */
static void add_series(const prepared *p, uint64_t first, double *out,
                       size_t n) {
  lbr_record_work *w = p->work;
  memset(w->slope, 0, n * sizeof *w->slope);
  memset(w->bend, 0, n * sizeof *w->bend);
  lbr_bank_add_derivative(w->bank, 0, first, out, n);
  lbr_bank_add_derivative(w->bank, 1, first, w->slope, n);
  lbr_bank_add_derivative(w->bank, 2, first, w->bend, n);
  for (size_t i = 0; i < n; i++)
    out[i] += w->shift[i] * (w->slope[i] + 0.5 * w->shift[i] * w->bend[i]);
}

static void add_tones(const prepared *p, uint64_t first, double *out,
                      size_t n) {
  lbr_record_work *w = p->work;
  if (p->displacement == 0) {
    lbr_bank_add(w->bank, first, out, n);
    return;
  }
  lbr_random_gaussian(&p->jitter, first, w->shift, n);
  for (size_t i = 0; i < n; i++) w->shift[i] *= p->displacement;
  if (p->series) add_series(p, first, out, n);
  lbr_bank_add_shifted(w->bank, first, w->shift, out, n, p->series);
}

static void add_noise(const prepared *p, uint64_t first, double *out,
                      size_t n) {
  const lbr_shape *shape = p->model->input_shape;
  if (shape)
    lbr_noise_add_shaped(&p->input, p->input_sigma, shape, first, out, n);
  else
    lbr_noise_add_white(&p->input, p->input_sigma, first, out, n);
  lbr_noise_add_white(&p->own, p->own_sigma, first, out, n);
}

/* Rails without codes; what is not a number goes to the lower rail. */
static size_t clip(double gain, double range, double *out, size_t n) {
  size_t clipped = 0;
  for (size_t i = 0; i < n; i++) {
    double v = gain * out[i], low = v > -range ? v : -range;
    out[i] = low < range ? low : range;
    clipped += out[i] != v;
  }
  return clipped;
}

__attribute__((target_clones("avx512f", "avx2", "default"))) static size_t
quantise(double gain, double step, double most, double *restrict out,
         size_t n) {
  const double far = 0x1p40;
  size_t clipped = 0;
  for (size_t i = 0; i < n; i++) {
    double v = gain * out[i] / step;
    v = v > -far ? v : -far;
    v = v < far ? v : far;
    double code = (v + LBR_ROUNDER) - LBR_ROUNDER;
    double low = code > -most ? code : -most;
    double held = low < most - 1 ? low : most - 1;
    clipped += held != code;
    out[i] = held;
  }
  return clipped;
}

static size_t convert(const lbr_record_model *m, double *out, int32_t *codes,
                      size_t n) {
  if (m->bits == 0) return clip(1 + m->gain_error, m->range, out, n);
  double most = ldexp(1, m->bits - 1), step = m->range / most;
  size_t clipped = quantise(1 + m->gain_error, step, most, out, n);
  for (size_t i = 0; codes && i < n; i++) codes[i] = (int32_t)out[i];
  for (size_t i = 0; i < n; i++) out[i] *= step;
  return clipped;
}

lbr_status lbr_synth_record(const lbr_record_model *model, uint64_t first,
                            double *out, int32_t *codes, size_t n,
                            lbr_record_work *work, lbr_record_facts *facts) {
  prepared p;
  if (!is_good(model) || (codes && model->bits == 0)) return LBR_DOMAIN;
  lbr_status status = prepare(model, work, &p);
  if (status != LBR_OK) return status;
  facts->clipped = 0;
  for (size_t done = 0; done < n;) {
    size_t room = CHUNK - (first + done) % CHUNK;
    size_t take = n - done < room ? n - done : room;
    double *to = out + done;
    for (size_t i = 0; i < take; i++) to[i] = p.offset;
    add_tones(&p, first + done, to, take);
    add_noise(&p, first + done, to, take);
    facts->clipped += convert(model, to, codes ? codes + done : NULL, take);
    done += take;
  }
  return LBR_OK;
}

typedef struct folding {
  const lbr_filter *filter;
  double rate, folds;
} folding;

static double folded(void *context, double f) {
  const folding *a = context;
  double place = f * a->rate, sum = 0;
  if (a->folds < 0) return lbr_filter_gain(a->filter, place, a->rate);
  for (double k = 0; k <= a->folds; k++) {
    double up = lbr_filter_gain(a->filter, k * a->rate + place, a->rate);
    double down = lbr_filter_gain(a->filter, (k + 1) * a->rate - place,
                                  a->rate);
    sum += up * up + down * down;
  }
  return sqrt(sum);
}

lbr_status lbr_input_shape(const lbr_filter *filter, double rate, size_t half,
                           double *tap) {
  if (!isfinite(rate) || rate <= 0) return LBR_DOMAIN;
  folding a = {filter, rate, -1};
  double edge = lbr_filter_edge(filter, FOLD_LEVEL, rate);
  if (filter->shape != LBR_FILTER_NONE && isfinite(edge))
    a.folds = fmin(ceil(edge / rate) + 1, MOST_FOLDS);
  return lbr_shape_design(folded, &a, half, tap);
}
