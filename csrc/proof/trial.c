#include "proof/trial.h"

#include <math.h>

#include "base/checked.h"

static lbr_status make_tracker(lbr_bench *b) {
  const lbr_proof *proof = b->proof;
  size_t count = proof->scene->n_lines;
  lbr_search *searches = lbr_alloc(count, sizeof *searches);
  if (!searches) return LBR_NO_MEMORY;
  for (size_t i = 0; i < count; i++) {
    searches[i].lo = proof->claims[i].f_lo / proof->rate;
    searches[i].hi = proof->claims[i].f_hi / proof->rate;
  }
  lbr_status status = lbr_tracker_new(proof->window, proof->n, searches, count,
                                      &b->tracker);
  free(searches);
  return status;
}

static lbr_status fill(lbr_bench *b) {
  const lbr_proof *proof = b->proof;
  b->tones = lbr_alloc(proof->scene->n_lines, sizeof *b->tones);
  b->clean = lbr_alloc(proof->n, sizeof *b->clean);
  b->noisy = lbr_alloc(proof->n, sizeof *b->noisy);
  if (!b->tones || !b->clean || !b->noisy) return LBR_NO_MEMORY;
  lbr_status status = lbr_particulars_new(proof->scene, &b->particulars);
  if (status == LBR_OK) status = lbr_front_new(proof, &b->front);
  return status == LBR_OK ? make_tracker(b) : status;
}

lbr_status lbr_bench_new(const lbr_proof *proof, lbr_bench **out) {
  lbr_bench *b = lbr_alloc(1, sizeof *b);
  if (!b) return LBR_NO_MEMORY;
  b->proof = proof;
  lbr_status status = fill(b);
  if (status == LBR_OK)
    *out = b;
  else
    lbr_bench_free(b);
  return status;
}

void lbr_bench_free(lbr_bench *b) {
  if (!b) return;
  lbr_tracker_free(b->tracker);
  lbr_particulars_free(b->particulars);
  lbr_front_free(b->front);
  free(b->tones);
  free(b->clean);
  free(b->noisy);
  free(b);
}

/* Deviation over what is allowed; a deviation within rounding counts as 0. */
static double ratio_of(double deviation, double allowed, double rounding) {
  double excess = fabs(deviation) - rounding;
  if (!(excess > 0)) return isnan(excess) ? INFINITY : 0;
  return excess / allowed;
}

static void judge(const lbr_bench *b, size_t line, double reach,
                  lbr_outcome *out) {
  const lbr_proof *proof = b->proof;
  const lbr_claim *claim = &proof->claims[line];
  const lbr_actual *actual = &b->particulars->actual[line];
  double rounding = LBR_PROOF_ROUNDING * reach / claim->gain;
  out->read = b->tones[line].amplitude / claim->gain;
  out->read_hz = b->tones[line].frequency * proof->rate;
  out->ratio = ratio_of(out->read - actual->amplitude,
                        claim->own * actual->amplitude + claim->others,
                        rounding);
  out->ratio_hz = claim->f_hi > claim->f_lo && isfinite(claim->hz)
                      ? ratio_of(out->read_hz - actual->hz, claim->hz,
                                 1e-12 * proof->rate)
                      : 0;
  out->deviation = 0;
}

void lbr_bench_read(lbr_bench *b, lbr_outcome *outcomes) {
  double reach = lbr_particulars_reach(b->proof, b->particulars);
  lbr_particulars_record(b->proof, b->particulars, b->clean);
  lbr_tracker_run(b->tracker, b->clean, b->tones);
  for (size_t i = 0; i < b->proof->scene->n_lines; i++)
    judge(b, i, reach, &outcomes[i]);
}

lbr_status lbr_trial_run(lbr_bench *b, uint64_t seed, uint64_t trial,
                         int noise, lbr_outcome *outcomes) {
  const lbr_proof *proof = b->proof;
  lbr_particulars_draw(proof, seed, trial, b->particulars);
  lbr_bench_read(b, outcomes);
  if (!noise) return LBR_OK;
  lbr_status status =
      lbr_front_record(b->front, b->particulars, seed, trial, b->noisy);
  if (status != LBR_OK) return status;
  lbr_tracker_run(b->tracker, b->noisy, b->tones);
  for (size_t i = 0; i < proof->scene->n_lines; i++) {
    const lbr_claim *claim = &proof->claims[i];
    double shift = b->tones[i].amplitude / claim->gain - outcomes[i].read;
    outcomes[i].deviation = claim->sigma > 0 ? shift / claim->sigma : 0;
  }
  return LBR_OK;
}
