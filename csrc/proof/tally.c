#include "proof/tally.h"

#include <math.h>

#include "base/checked.h"
#include "base/workers.h"

#define MOST_WORKERS 256

struct lbr_tallier {
  const lbr_proof *proof;
  unsigned workers;
  lbr_bench **benches;   /* workers */
  lbr_outcome *outcomes; /* LBR_TALLY_CHUNK x n_lines, by trial */
  uint64_t seed, first;  /* of the call that runs */
  int noise;
};

lbr_status lbr_tallier_new(const lbr_proof *proof, unsigned workers,
                           lbr_tallier **out) {
  size_t outcomes;
  if (lbr_size(LBR_TALLY_CHUNK, proof->scene->n_lines, &outcomes) != LBR_OK)
    return LBR_OVERFLOW;
  lbr_tallier *t = lbr_alloc(1, sizeof *t);
  if (!t) return LBR_NO_MEMORY;
  t->proof = proof;
  t->workers = workers ? workers : lbr_cores();
  if (t->workers > MOST_WORKERS) t->workers = MOST_WORKERS;
  t->benches = lbr_alloc(t->workers, sizeof *t->benches);
  t->outcomes = lbr_alloc(outcomes, sizeof *t->outcomes);
  lbr_status status = t->benches && t->outcomes ? LBR_OK : LBR_NO_MEMORY;
  for (unsigned i = 0; i < t->workers && status == LBR_OK; i++)
    status = lbr_bench_new(proof, &t->benches[i]);
  if (status == LBR_OK)
    *out = t;
  else
    lbr_tallier_free(t);
  return status;
}

void lbr_tallier_free(lbr_tallier *t) {
  if (!t) return;
  for (unsigned i = 0; t->benches && i < t->workers; i++)
    lbr_bench_free(t->benches[i]);
  free(t->benches);
  free(t->outcomes);
  free(t);
}

static lbr_status run_one(void *context, size_t task, unsigned worker) {
  lbr_tallier *t = context;
  return lbr_trial_run(t->benches[worker], t->seed, t->first + task, t->noise,
                       t->outcomes + task * t->proof->scene->n_lines);
}

static void add(lbr_tally *tally, const lbr_outcome *o, uint64_t trial,
                double coverage) {
  tally->trials++;
  tally->violations += !(o->ratio <= 1);
  tally->violations_hz += !(o->ratio_hz <= 1);
  if (o->ratio > tally->worst) {
    tally->worst = o->ratio;
    tally->worst_trial = trial;
  }
  if (o->ratio_hz > tally->worst_hz) {
    tally->worst_hz = o->ratio_hz;
    tally->worst_hz_trial = trial;
  }
  tally->beyond += fabs(o->deviation) > coverage;
  tally->squares += o->deviation * o->deviation;
}

lbr_status lbr_tallier_run(lbr_tallier *t, uint64_t seed, uint64_t first,
                           size_t count, int noise, lbr_tally *tallies) {
  size_t lines = t->proof->scene->n_lines;
  if (count > LBR_TALLY_CHUNK) return LBR_DOMAIN;
  t->seed = seed;
  t->first = first;
  t->noise = noise;
  lbr_status status = lbr_workers_run(run_one, t, count, t->workers);
  if (status != LBR_OK) return status;
  for (size_t k = 0; k < count; k++)
    for (size_t i = 0; i < lines; i++)
      add(&tallies[i], &t->outcomes[k * lines + i], first + k,
          t->proof->coverage);
  return LBR_OK;
}
