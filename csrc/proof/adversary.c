#include "proof/adversary.h"

#include <math.h>

#include "base/checked.h"
#include "base/workers.h"
#include "proof/aim.h"
#include "proof/draw.h"

#define TAU 6.283185307179586476925286766559
#define STARTS 5
#define SWEEPS 6
#define GOLDEN_STEPS 24
#define MOST_WORKERS 256

/* One number that may be turned, within [-reach, reach]. */
typedef struct knob {
  double *value;
  double reach;
  size_t grid;  /* points of the first search */
  size_t source; /* SIZE_MAX: turns everything; else this source only */
} knob;

typedef struct climb {
  lbr_aim aim;
  double *scratch;  /* best values of all knobs of the best start */
  knob *knobs;
  size_t n_knobs;
} climb;

static double score(climb *c, const knob *k) {
  lbr_particulars_settle(c->aim.proof, c->aim.p);
  return k->source == SIZE_MAX ? lbr_aim_ratio(&c->aim)
                               : lbr_aim_part(&c->aim, k->source);
}

static double score_at(climb *c, const knob *k, double value) {
  *k->value = value;
  return score(c, k);
}

/* Golden section between a and b for the highest score. */
static double section(climb *c, const knob *k, double a, double b,
                      double *best) {
  const double share = 0.61803398874989485;
  double u = b - share * (b - a), v = a + share * (b - a);
  double su = score_at(c, k, u), sv = score_at(c, k, v);
  for (int i = 0; i < GOLDEN_STEPS; i++) {
    if (su > sv) {
      b = v;
      v = u;
      sv = su;
      u = b - share * (b - a);
      su = score_at(c, k, u);
    } else {
      a = u;
      u = v;
      su = sv;
      v = a + share * (b - a);
      sv = score_at(c, k, v);
    }
  }
  *best = su > sv ? su : sv;
  return su > sv ? u : v;
}

/* Turns one knob to its best place; never to a worse one than it had. */
static void turn(climb *c, const knob *k) {
  double at = *k->value, top = score(c, k), here = at;
  double step = 2 * k->reach / (double)(k->grid - 1);
  for (size_t i = 0; i < k->grid; i++) {
    double value = i + 1 < k->grid ? -k->reach + step * (double)i : k->reach;
    double s = score_at(c, k, value);
    if (s > top) {
      top = s;
      here = value;
    }
  }
  double best, place = section(c, k, fmax(here - step, -k->reach),
                               fmin(here + step, k->reach), &best);
  *k->value = best > top ? place : here;
  lbr_particulars_settle(c->aim.proof, c->aim.p);
}

static size_t grid_for(const lbr_proof *proof, double reach_hz) {
  double bins = 2 * reach_hz * (double)proof->n / proof->rate;
  return (size_t)fmin(fmax(4 * bins + 1, 9), 201);
}

static void add_knob(climb *c, double *value, double reach, size_t grid,
                     size_t source) {
  if (reach > 0) c->knobs[c->n_knobs++] = (knob){value, reach, grid, source};
}

static void list_knobs(climb *c) {
  const lbr_proof *proof = c->aim.proof;
  const lbr_scene *scene = proof->scene;
  const lbr_claim *claim = &proof->claims[c->aim.line];
  lbr_particulars *p = c->aim.p;
  double farthest = 0;
  c->n_knobs = 0;
  add_knob(c, &p->actual[c->aim.line].phase, TAU / 2, 17, SIZE_MAX);
  for (size_t d = 0; d < scene->n_drivers; d++) {
    double lock = 0;
    for (size_t j = 0; j < scene->n_sources; j++)
      if (scene->sources[j].driver == d)
        lock = fmax(lock, fabs(scene->sources[j].lock_hz));
    add_knob(c, &p->deviation[d], scene->spread[d],
             grid_for(proof, lock * scene->spread[d]), SIZE_MAX);
  }
  for (size_t j = 0; j < scene->n_sources; j++) {
    const lbr_source *s = &scene->sources[j];
    farthest = fmax(farthest, s->hz);
    add_knob(c, &p->free_hz[j], s->free_hz, grid_for(proof, s->free_hz),
             j == c->aim.line ? SIZE_MAX : j);
  }
  double timebase = proof->front->timebase;
  add_knob(c, &p->timebase, timebase, grid_for(proof, timebase * farthest),
           SIZE_MAX);
  if (claim->f_hi > claim->f_lo && c->aim.side > 0)
    add_knob(c, &c->aim.read_bins, 0.75, 13, SIZE_MAX);
}

/* Everything that need not be searched: ends of ranges by the side. */
static void set_ends(climb *c, double own_amplitude) {
  const lbr_proof *proof = c->aim.proof;
  const lbr_front_end *front = proof->front;
  lbr_particulars *p = c->aim.p;
  p->accuracy = c->aim.side * front->accuracy;
  for (size_t j = 0; j < proof->scene->n_sources; j++) {
    lbr_actual *a = &p->actual[j];
    a->amplitude = proof->scene->sources[j].most;
    a->wander = a->wander_phase = 0;
    p->flatness[j] = front->flatness;
  }
  p->actual[c->aim.line].amplitude = own_amplitude;
  p->flatness[c->aim.line] = c->aim.side * front->flatness;
}

/* Start 0: all in the middle; 1 and 2: all at one end; then random. */
static void set_start(climb *c, size_t start, uint64_t seed) {
  uint64_t attack = 2 * c->aim.line + (c->aim.side > 0);
  lbr_draw d = lbr_draw_start(seed, STARTS * attack + start,
                              LBR_PURPOSE_SEARCH);
  for (size_t i = 0; i < c->n_knobs; i++) {
    double place = start == 0 ? 0 : start == 1 ? 1 : start == 2 ? -1 : 0;
    if (start > 2) place = lbr_draw_spread(&d);
    *c->knobs[i].value = place * c->knobs[i].reach;
  }
  lbr_particulars_settle(c->aim.proof, c->aim.p);
}

static double climb_once(climb *c) {
  double before = lbr_aim_ratio(&c->aim);
  for (int sweep = 0; sweep < SWEEPS; sweep++) {
    for (size_t i = 0; i < c->n_knobs; i++) turn(c, &c->knobs[i]);
    double now = lbr_aim_ratio(&c->aim);
    if (!(now > before + 1e-4 * fabs(before))) break;
    before = now;
  }
  return lbr_aim_ratio(&c->aim);
}

/* The wander of the line's driver, which moves all its sources. */
static void set_wander(lbr_bench *bench, size_t line, double depth,
                       double phase) {
  const lbr_scene *scene = bench->proof->scene;
  for (size_t j = 0; j < scene->n_sources; j++)
    if (scene->sources[j].driver == scene->sources[line].driver) {
      lbr_actual *a = &bench->particulars->actual[j];
      a->wander = depth * scene->sources[j].wander;
      a->wander_phase = phase;
    }
}

/* Reads the record of the bench with every wander tried, which the model
 * leaves out, and stays at the worst. */
static void read_worst(lbr_bench *bench, size_t line, lbr_outcome *outcomes,
                       lbr_attack *out) {
  double depth = 0, phase = 0;
  int most = bench->proof->scene->sources[line].wander > 0 ? 8 : 0;
  out->reached = -1;
  for (int k = 0; k <= most; k++) {
    set_wander(bench, line, k > 0, TAU * (k - 1) / 8);
    lbr_bench_read(bench, outcomes);
    if (outcomes[line].ratio > out->reached) {
      out->reached = outcomes[line].ratio;
      out->read = outcomes[line].read;
      depth = k > 0;
      phase = TAU * (k - 1) / 8;
    }
  }
  out->true_amplitude = bench->particulars->actual[line].amplitude;
  set_wander(bench, line, depth, phase);
  lbr_particulars_record(bench->proof, bench->particulars, bench->clean);
}

/* Climbs from every start with the line at one end of its range; the best
 * places end up in c->scratch. */
static void climb_from_all(climb *c, double own_amplitude, uint64_t seed,
                           double *best, double *amplitude) {
  set_ends(c, own_amplitude);
  for (size_t start = 0; start < STARTS; start++) {
    set_start(c, start, seed);
    double ratio = climb_once(c);
    if (!(ratio > *best)) continue;
    *best = ratio;
    *amplitude = own_amplitude;
    for (size_t i = 0; i < c->n_knobs; i++) c->scratch[i] = *c->knobs[i].value;
  }
}

static void attack(climb *c, lbr_bench *bench, uint64_t seed,
                   lbr_outcome *outcomes, lbr_attack *out) {
  const lbr_source *own = &bench->proof->scene->sources[c->aim.line];
  double amplitude = own->least;
  out->predicted = -INFINITY;
  list_knobs(c);
  climb_from_all(c, own->least, seed, &out->predicted, &amplitude);
  if (own->most > own->least)
    climb_from_all(c, own->most, seed, &out->predicted, &amplitude);
  set_ends(c, amplitude);
  for (size_t i = 0; i < c->n_knobs; i++) *c->knobs[i].value = c->scratch[i];
  lbr_particulars_settle(c->aim.proof, c->aim.p);
  lbr_aim_phases(&c->aim);
  read_worst(bench, c->aim.line, outcomes, out);
}

lbr_status lbr_attack_run(lbr_bench *bench, const lbr_response *response,
                          size_t line, int side, uint64_t seed,
                          lbr_attack *out) {
  const lbr_scene *scene = bench->proof->scene;
  size_t most = scene->n_drivers + scene->n_sources + 3;
  climb c = {.aim = {.proof = bench->proof, .response = response,
                     .line = line, .side = side, .p = bench->particulars}};
  c.knobs = lbr_alloc(most, sizeof *c.knobs);
  c.scratch = lbr_alloc(most, sizeof *c.scratch);
  lbr_outcome *outcomes = lbr_alloc(scene->n_lines, sizeof *outcomes);
  lbr_status status = LBR_NO_MEMORY;
  if (c.knobs && c.scratch && outcomes) {
    *out = (lbr_attack){.line = line, .side = side};
    attack(&c, bench, seed, outcomes, out);
    status = LBR_OK;
  }
  free(c.knobs);
  free(c.scratch);
  free(outcomes);
  return status;
}

typedef struct campaign {
  lbr_bench *benches[MOST_WORKERS];
  lbr_response *response;
  lbr_attack *attacks;
  uint64_t seed;
} campaign;

static lbr_status run_one(void *context, size_t task, unsigned worker) {
  campaign *c = context;
  return lbr_attack_run(c->benches[worker], c->response, task / 2,
                        task % 2 ? -1 : 1, c->seed, &c->attacks[task]);
}

lbr_status lbr_attack_all(const lbr_proof *proof, uint64_t seed,
                          unsigned workers, lbr_attack *attacks) {
  campaign *c = lbr_alloc(1, sizeof *c);
  if (!c) return LBR_NO_MEMORY;
  size_t tasks = 2 * proof->scene->n_lines;
  if (workers == 0) workers = lbr_cores();
  if (workers > MOST_WORKERS) workers = MOST_WORKERS;
  if (workers > tasks) workers = (unsigned)tasks;
  c->attacks = attacks;
  c->seed = seed;
  lbr_status status = lbr_response_new(proof->window, proof->n, &c->response);
  for (unsigned i = 0; i < workers && status == LBR_OK; i++)
    status = lbr_bench_new(proof, &c->benches[i]);
  if (status == LBR_OK) status = lbr_workers_run(run_one, c, tasks, workers);
  for (unsigned i = 0; i < workers; i++) lbr_bench_free(c->benches[i]);
  lbr_response_free(c->response);
  free(c);
  return status;
}
