#include "proof/particulars.h"

#include <math.h>

#include "base/checked.h"
#include "proof/draw.h"
#include "proof/tone.h"

#define TAU 6.283185307179586476925286766559

static lbr_status fill(lbr_particulars *p, const lbr_scene *scene) {
  p->deviation = lbr_alloc(scene->n_drivers, sizeof *p->deviation);
  p->free_hz = lbr_alloc(scene->n_sources, sizeof *p->free_hz);
  p->flatness = lbr_alloc(scene->n_sources, sizeof *p->flatness);
  p->actual = lbr_alloc(scene->n_sources, sizeof *p->actual);
  return p->deviation && p->free_hz && p->flatness && p->actual
             ? LBR_OK : LBR_NO_MEMORY;
}

lbr_status lbr_particulars_new(const lbr_scene *scene, lbr_particulars **out) {
  lbr_particulars *p = lbr_alloc(1, sizeof *p);
  if (!p) return LBR_NO_MEMORY;
  lbr_status status = fill(p, scene);
  if (status == LBR_OK)
    *out = p;
  else
    lbr_particulars_free(p);
  return status;
}

void lbr_particulars_free(lbr_particulars *p) {
  if (!p) return;
  free(p->deviation);
  free(p->free_hz);
  free(p->flatness);
  free(p->actual);
  free(p);
}

#define WANDER_NUMBERS ((uint64_t)1 << 32) /* where theirs begin */

/* Sources of one driver wander together: depth and phase are the driver's. */
static void draw_wander(const lbr_proof *proof, uint64_t seed, uint64_t trial,
                        lbr_particulars *p) {
  for (size_t i = 0; i < proof->scene->n_sources; i++) {
    const lbr_source *s = &proof->scene->sources[i];
    lbr_draw d = lbr_draw_start(seed, trial, LBR_PURPOSE_TRIAL);
    d.index = WANDER_NUMBERS + 4 * (uint64_t)s->driver;
    double depth = fabs(lbr_draw_spread(&d));
    p->actual[i].wander = depth * s->wander;
    p->actual[i].wander_phase = TAU * lbr_draw_unit(&d);
  }
}

void lbr_particulars_draw(const lbr_proof *proof, uint64_t seed,
                          uint64_t trial, lbr_particulars *p) {
  const lbr_scene *scene = proof->scene;
  const lbr_front_end *front = proof->front;
  lbr_draw d = lbr_draw_start(seed, trial, LBR_PURPOSE_TRIAL);
  p->timebase = front->timebase * lbr_draw_spread(&d);
  p->accuracy = front->accuracy * lbr_draw_spread(&d);
  p->offset = scene->offset * lbr_draw_spread(&d);
  for (size_t i = 0; i < scene->n_drivers; i++)
    p->deviation[i] = scene->spread[i] * lbr_draw_spread(&d);
  for (size_t i = 0; i < scene->n_sources; i++) {
    const lbr_source *s = &scene->sources[i];
    p->free_hz[i] = s->free_hz * lbr_draw_spread(&d);
    p->flatness[i] = front->flatness * lbr_draw_spread(&d);
    p->actual[i].amplitude = lbr_draw_range(&d, s->least, s->most);
    p->actual[i].phase = TAU * lbr_draw_unit(&d);
  }
  draw_wander(proof, seed, trial, p);
  lbr_particulars_settle(proof, p);
}

/* What jitter leaves of a tone on average (characteristic function of the
 * normal distribution at 2 pi f). */
static double jitter_loss(const lbr_front_end *front, double hz) {
  double angle = TAU * hz * front->jitter_s;
  return exp(-0.5 * angle * angle);
}

void lbr_particulars_settle(const lbr_proof *proof, lbr_particulars *p) {
  const lbr_front_end *front = proof->front;
  for (size_t i = 0; i < proof->scene->n_sources; i++) {
    const lbr_source *s = &proof->scene->sources[i];
    lbr_actual *a = &p->actual[i];
    a->hz = s->hz + s->lock_hz * p->deviation[s->driver] + p->free_hz[i];
    a->gain = lbr_filter_gain(&front->filter, fabs(a->hz), proof->rate) *
              (1 + p->flatness[i]) * (1 + p->accuracy) *
              jitter_loss(front, a->hz);
  }
}

/* The mean of the record, through filter and gain. */
static double offset_shown(const lbr_proof *proof, const lbr_particulars *p) {
  return p->offset * (1 + p->accuracy) *
         lbr_filter_gain(&proof->front->filter, 0, proof->rate);
}

double lbr_particulars_reach(const lbr_proof *proof,
                             const lbr_particulars *p) {
  double reach = fabs(offset_shown(proof, p));
  for (size_t i = 0; i < proof->scene->n_sources; i++)
    reach += p->actual[i].amplitude * p->actual[i].gain;
  return reach;
}

void lbr_particulars_record(const lbr_proof *proof, const lbr_particulars *p,
                            double *x) {
  double true_rate = proof->rate * (1 + p->timebase);
  double mean = offset_shown(proof, p);
  for (size_t n = 0; n < proof->n; n++) x[n] = mean;
  for (size_t i = 0; i < proof->scene->n_sources; i++) {
    const lbr_actual *a = &p->actual[i];
    double cycles = a->hz * (double)proof->n / true_rate;
    lbr_proof_tone tone = {
        .frequency = a->hz / true_rate,
        .amplitude = a->amplitude * a->gain,
        .phase = a->phase,
        .index = 0.5 * cycles * a->wander,
        .wander_phase = a->wander_phase};
    lbr_proof_tone_add(&tone, x, proof->n);
  }
}
