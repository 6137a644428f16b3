#include "plan/limits.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/checked.h"
#include "plan/fold.h"

#define PATHS 4096   /* paths kept, by rate modulo this */
#define LEVELS 8000  /* reach of a kernel, tabled at -k STEP_DB */
#define STEP_DB 0.05
#define LONG 2048          /* samples; kernels of records that long ... */
#define TRUST 0.9995       /* ... reach nearly as far as the endless one */
#define TRUST_SHORT 0.95   /* shorter ones may reach less far */
#define BIN_OFF 0.5  /* a bin reading may be this far off the line, bins */

typedef struct mode_limits {
  float *least;         /* n_rates, NAN: not asked for yet */
  float reach[LEVELS];  /* bins, NAN: not asked for yet */
} mode_limits;

struct lbr_limits {
  const lbr_problem *problem;
  size_t doubles;       /* of one path */
  size_t *rate_of;      /* PATHS: rate + 1, 0: empty */
  lbr_path *path;       /* PATHS */
  double *memory;       /* PATHS * doubles */
  double *source_db;    /* n_sources: amplitude behind the filter, dB */
  mode_limits *mode;    /* n_modes */
};

lbr_status lbr_limits_new(const lbr_problem *p, lbr_limits **out) {
  lbr_limits *l = lbr_alloc(1, sizeof *l);
  if (!l) return LBR_NO_MEMORY;
  l->problem = p;
  l->doubles = lbr_path_doubles(p->scene);
  l->rate_of = lbr_alloc(PATHS, sizeof *l->rate_of);
  l->path = lbr_alloc(PATHS, sizeof *l->path);
  l->memory = lbr_alloc(l->doubles, PATHS * sizeof *l->memory);
  l->source_db = lbr_alloc(p->scene->n_sources, sizeof *l->source_db);
  l->mode = lbr_alloc(p->n_modes, sizeof *l->mode);
  if (!l->rate_of || !l->path || !l->memory || !l->source_db || !l->mode) {
    lbr_limits_free(l);
    return LBR_NO_MEMORY;
  }
  *out = l;
  return LBR_OK;
}

void lbr_limits_free(lbr_limits *l) {
  if (!l) return;
  for (size_t m = 0; l->mode && m < l->problem->n_modes; m++)
    free(l->mode[m].least);
  free(l->mode);
  free(l->source_db);
  free(l->memory);
  free(l->path);
  free(l->rate_of);
  free(l);
}

const lbr_path *lbr_limits_path(lbr_limits *l, size_t rate) {
  size_t slot = rate % PATHS;
  if (l->rate_of[slot] != rate + 1) {
    const lbr_problem *p = l->problem;
    lbr_path_fill(&l->path[slot], p->scene, p->front,
                  p->rates->item[rate].value, l->memory + slot * l->doubles);
    l->rate_of[slot] = rate + 1;
  }
  return &l->path[slot];
}

static double to_db(double ratio) { return 20 * log10(ratio); }

/* Lower bound of the distance at which the kernel has fallen by `db`. */
static double reach(mode_limits *m, lbr_kernel *kernel, double db) {
  double place = db / STEP_DB;
  int level = place < LEVELS - 1 ? (int)place : LEVELS - 1;
  if (isnan(m->reach[level])) {
    double found = lbr_kernel_reach(kernel, pow(10, -level * STEP_DB / 20));
    m->reach[level] = (float)found;
  }
  return m->reach[level];
}

typedef struct line_view {
  size_t i;
  double allowed_db; /* what may leak in, dB re the demand's unit */
  double off;        /* how far the reading may be off the line, bins */
  bool tracked;
} line_view;

/* Shortest duration that keeps source j, its image and folds, off the line. */
static double least_for(const lbr_limits *l, mode_limits *m,
                        lbr_kernel *kernel, const line_view *v, size_t j,
                        double rate) {
  const lbr_scene *s = l->problem->scene;
  const lbr_source *a = &s->sources[v->i], *b = &s->sources[j];
  double db = l->source_db[j] - v->allowed_db, far = 0;
  if (b->wander > 0 || db <= 0) return 0;
  double bins = fmax(reach(m, kernel, db) - v->off, 0), distance = INFINITY;
  for (double sign = v->i == j ? -1 : 1; sign >= -1; sign -= 2) {
    double hz = b->hz - sign * a->hz;
    if (a->driver == b->driver && v->tracked)
      far = fabs(b->lock_hz - sign * a->lock_hz) * s->spread[a->driver];
    else
      far = b->lock_hz * s->spread[b->driver] +
            (v->tracked ? a->lock_hz * s->spread[a->driver] : 0);
    distance = fmin(distance, lbr_fold_distance(hz - far, hz + far, rate));
  }
  if (bins <= 0) return 0;
  double t = bins / distance; /* INFINITY where it folds onto the line */
  return t * (t * rate > LONG ? TRUST : TRUST_SHORT);
}

static double noise_least(const lbr_problem *p, const lbr_path *path, size_t i,
                          double allowed, double enbw) {
  double k = p->coverage / path->nominal[i];
  return k * k * path->density[i] * enbw / (p->averages * allowed * allowed);
}

static double find_least(lbr_limits *l, size_t rate, size_t mode,
                         lbr_kernel *kernel) {
  const lbr_problem *p = l->problem;
  const lbr_path *path = lbr_limits_path(l, rate);
  double least = 0, enbw = lbr_kernel_noise_bandwidth(kernel);
  bool tracked = p->modes[mode].reading == LBR_READING_TRACKED;
  for (size_t j = 0; j < p->scene->n_sources; j++)
    l->source_db[j] = to_db(p->scene->sources[j].most * path->high[j]);
  for (size_t i = 0; i < p->scene->n_lines && least < INFINITY; i++) {
    const lbr_line *line = &p->scene->lines[i];
    double a = p->scene->sources[i].least;
    double fixed = (1 + path->droop[i]) * (1 + p->front->accuracy) - 1;
    double allowed = p->share * fmin(line->tolerance * a, line->tolerance_abs);
    if (!(allowed > fixed * a)) return INFINITY;
    allowed -= fixed * a;
    line_view v = {i, to_db(allowed * path->nominal[i]),
                   tracked ? 0 : BIN_OFF, tracked};
    least = fmax(least, noise_least(p, path, i, allowed, enbw));
    for (size_t j = 0; j < p->scene->n_sources && least < INFINITY; j++)
      least = fmax(least, least_for(l, &l->mode[mode], kernel, &v, j,
                                    path->rate));
  }
  return least;
}

static lbr_status open_mode(lbr_limits *l, mode_limits *m) {
  size_t rates = l->problem->rates->count;
  float *least = lbr_alloc(rates, sizeof *least);
  if (!least) return LBR_NO_MEMORY;
  for (size_t r = 0; r < rates; r++) least[r] = NAN;
  for (size_t k = 0; k < LEVELS; k++) m->reach[k] = NAN;
  m->least = least;
  return LBR_OK;
}

lbr_status lbr_limits_least(lbr_limits *l, size_t rate, size_t mode,
                            lbr_kernel *kernel, double *least) {
  mode_limits *m = &l->mode[mode];
  lbr_status status = m->least ? LBR_OK : open_mode(l, m);
  if (status != LBR_OK) return status;
  if (isnan(m->least[rate])) {
    double found = find_least(l, rate, mode, kernel);
    m->least[rate] = (float)(found * (1 - 1e-6));
  }
  *least = m->least[rate];
  return LBR_OK;
}
