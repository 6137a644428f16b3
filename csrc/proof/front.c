#include "proof/front.h"

#include <math.h>

#include "base/checked.h"
#include "synth/digitizer.h"

#define TAU 6.283185307179586476925286766559
#define HALF_TAPS 64 /* of the filter that shapes the input noise */

struct lbr_front {
  const lbr_proof *proof;
  lbr_record_work *work;
  lbr_input_tone *tones; /* n_sources */
  lbr_shape shape;
  double tap[HALF_TAPS + 1];
  lbr_record_model model; /* what does not change from trial to trial */
};

/* Codes that a range and a step make; LBR_DOMAIN when it is no power of 2. */
static lbr_status set_codes(const lbr_front_end *front,
                            lbr_record_model *model) {
  model->range = front->range;
  if (!(front->step > 0)) return LBR_OK;
  double bits = log2(2 * front->range / front->step);
  if (!(bits >= 1 && bits <= 32) || fabs(bits - rint(bits)) > 1e-9)
    return LBR_DOMAIN;
  model->bits = (int)rint(bits);
  return LBR_OK;
}

/* Input noise is shaped by the filter, folds and all. */
static lbr_status set_shape(lbr_front *f) {
  const lbr_filter *filter = &f->proof->front->filter;
  if (!(f->proof->scene->noise > 0) || filter->shape == LBR_FILTER_NONE)
    return LBR_OK;
  f->shape = (lbr_shape){HALF_TAPS, f->tap};
  f->model.input_shape = &f->shape;
  return lbr_input_shape(filter, f->proof->rate, HALF_TAPS, f->tap);
}

static lbr_status fill(lbr_front *f) {
  const lbr_proof *proof = f->proof;
  f->tones = lbr_alloc(proof->scene->n_sources, sizeof *f->tones);
  if (!f->tones) return LBR_NO_MEMORY;
  f->model = (lbr_record_model){.tones = f->tones,
                                .n_tones = proof->scene->n_sources,
                                .rate = proof->rate,
                                .filter = &proof->front->filter,
                                .jitter_s = proof->front->jitter_s,
                                .input_noise = proof->scene->noise,
                                .own_noise = proof->front->noise};
  lbr_status status = set_codes(proof->front, &f->model);
  if (status == LBR_OK) status = set_shape(f);
  if (status != LBR_OK) return status;
  return lbr_record_work_make(proof->scene->n_sources, &f->work);
}

lbr_status lbr_front_new(const lbr_proof *proof, lbr_front **out) {
  lbr_front *f = lbr_alloc(1, sizeof *f);
  if (!f) return LBR_NO_MEMORY;
  f->proof = proof;
  lbr_status status = fill(f);
  if (status == LBR_OK)
    *out = f;
  else
    lbr_front_free(f);
  return status;
}

void lbr_front_free(lbr_front *f) {
  if (!f) return;
  lbr_record_work_free(f->work);
  free(f->tones);
  free(f);
}

/* A source as the model wants it: told from sample 0 rather than from the
 * centre, and before the filter, whose phase it therefore anticipates. */
static lbr_input_tone input_tone(const lbr_proof *proof,
                                 const lbr_particulars *p, size_t i) {
  const lbr_actual *a = &p->actual[i];
  double true_rate = proof->rate * (1 + p->timebase);
  double duration = (double)proof->n / true_rate;
  double centre = 0.5 * ((double)proof->n - 1) / true_rate;
  double turns = fmod(a->hz * centre, 1.0);
  double swing_phase = a->wander_phase - TAU * centre / duration;
  double index = 0.5 * a->hz * duration * a->wander;
  double complex response =
      lbr_filter_response(&proof->front->filter, fabs(a->hz), proof->rate);
  return (lbr_input_tone){
      .hz = a->hz,
      .amplitude = a->amplitude * (1 + p->flatness[i]),
      .phase = a->phase - TAU * turns - index * cos(swing_phase) -
               carg(response),
      .swing_hz = 0.5 * a->hz * a->wander,
      .swing_s = duration,
      .swing_phase = swing_phase};
}

lbr_status lbr_front_record(lbr_front *f, const lbr_particulars *p,
                            uint64_t seed, uint64_t trial, double *noisy) {
  lbr_record_facts facts;
  for (size_t i = 0; i < f->proof->scene->n_sources; i++)
    f->tones[i] = input_tone(f->proof, p, i);
  f->model.offset = p->offset;
  f->model.timebase = p->timebase;
  f->model.gain_error = p->accuracy;
  f->model.seed = seed;
  f->model.trial = trial;
  return lbr_synth_record(&f->model, 0, noisy, NULL, f->proof->n, f->work,
                          &facts);
}
