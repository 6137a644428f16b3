#include "plan/limits.h"

#include <math.h>
#include <stdbool.h>
#include <stdlib.h>

#include "base/checked.h"
#include "plan/fold.h"

#define PATHS 4096   /* paths kept, by rate modulo this */
#define OUTLOOKS 8192 /* outlooks kept, by rate modulo this */
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

/* A source as it stands off a line at one rate. */
typedef struct threat {
  double db;       /* by how much it must be kept down, dB */
  double distance; /* least, folds included, Hz */
} threat;

#define THREATS 24 /* kept of a rate; what is weaker and farther is dropped */

/* What a rate means for every window of one reading. */
typedef struct outlook {
  size_t rate;          /* + 1; 0: empty */
  size_t count;
  threat threat[THREATS];
  double noise;         /* duration per bin of noise bandwidth, s */
  bool hopeless;        /* a fixed term takes all that is allowed */
} outlook;

struct lbr_limits {
  const lbr_problem *problem;
  size_t doubles;       /* of one path */
  size_t *rate_of;      /* PATHS: rate + 1, 0: empty */
  lbr_path *path;       /* PATHS */
  double *memory;       /* PATHS * doubles */
  double *source_db;    /* n_sources: amplitude behind the filter, dB */
  outlook *seen[2];     /* OUTLOOKS each, by reading */
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
  for (int reading = 0; reading < 2; reading++)
    l->seen[reading] = lbr_alloc(OUTLOOKS, sizeof(outlook));
  if (!l->rate_of || !l->path || !l->memory || !l->source_db || !l->mode ||
      !l->seen[0] || !l->seen[1]) {
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
  free(l->seen[0]);
  free(l->seen[1]);
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
  double own_db;     /* by how much its own image must be kept down where its
                        amplitude is least, dB */
  bool tracked;
} line_view;

/* Keeps a threat unless a kept one is at least as strong and as near; drops
 * kept ones that this holds for.  Where there is no room the new one goes. */
static void keep(outlook *o, threat t) {
  size_t kept = 0;
  for (size_t k = 0; k < o->count; k++) {
    const threat *other = &o->threat[k];
    if (other->db >= t.db && other->distance <= t.distance) return;
    if (other->db > t.db || other->distance < t.distance)
      o->threat[kept++] = *other;
  }
  o->count = kept;
  if (o->count < THREATS) o->threat[o->count++] = t;
}

/* Source j, its image and folds, as seen from the line. */
static void look(const lbr_limits *l, outlook *o, const line_view *v,
                 size_t j, double rate) {
  const lbr_scene *s = l->problem->scene;
  const lbr_source *a = &s->sources[v->i], *b = &s->sources[j];
  double db = v->i == j ? v->own_db : l->source_db[j] - v->allowed_db;
  double far = 0, distance = INFINITY;
  if (b->wander > 0 || db <= 0) return;
  for (double sign = v->i == j ? -1 : 1; sign >= -1; sign -= 2) {
    double hz = b->hz - sign * a->hz;
    if (a->driver == b->driver && v->tracked)
      far = fabs(b->lock_hz - sign * a->lock_hz) * s->spread[a->driver];
    else
      far = b->lock_hz * s->spread[b->driver] +
            (v->tracked ? a->lock_hz * s->spread[a->driver] : 0);
    distance = fmin(distance, lbr_fold_distance(hz - far, hz + far, rate));
  }
  keep(o, (threat){db, distance});
}

/* Duration per bin of noise bandwidth that a line's noise asks for. */
static double noise_least(const lbr_problem *p, const lbr_path *path, size_t i,
                          double allowed) {
  double k = p->coverage / path->nominal[i];
  return k * k * path->density[i] / (p->averages * allowed * allowed);
}

static void fill(lbr_limits *l, outlook *o, size_t rate, bool tracked) {
  const lbr_problem *p = l->problem;
  const lbr_path *path = lbr_limits_path(l, rate);
  *o = (outlook){.rate = rate + 1};
  for (size_t j = 0; j < p->scene->n_sources; j++)
    l->source_db[j] = to_db(p->scene->sources[j].most * path->high[j]);
  for (size_t i = 0; i < p->scene->n_lines; i++) {
    const lbr_line *line = &p->scene->lines[i];
    double a = p->scene->sources[i].least;
    double fixed = (1 + path->droop[i]) * (1 + p->front->accuracy) - 1;
    double allowed = p->share * fmin(line->tolerance * a, line->tolerance_abs);
    o->hopeless = o->hopeless || !(allowed > fixed * a);
    if (o->hopeless) return;
    allowed -= fixed * a;
    line_view v = {i, to_db(allowed * path->nominal[i]), to_db(a / allowed),
                   tracked};
    o->noise = fmax(o->noise, noise_least(p, path, i, allowed));
    for (size_t j = 0; j < p->scene->n_sources; j++)
      look(l, o, &v, j, path->rate);
  }
}

static double find_least(lbr_limits *l, size_t rate, size_t mode,
                         lbr_kernel *kernel) {
  bool tracked = l->problem->modes[mode].reading == LBR_READING_TRACKED;
  outlook *o = &l->seen[tracked][rate % OUTLOOKS];
  if (o->rate != rate + 1) fill(l, o, rate, tracked);
  if (o->hopeless) return INFINITY;
  double least = o->noise * lbr_kernel_noise_bandwidth(kernel);
  double hz = l->problem->rates->item[rate].value;
  for (size_t k = 0; k < o->count; k++) {
    double bins = reach(&l->mode[mode], kernel, o->threat[k].db);
    if (!tracked) bins -= BIN_OFF;
    if (bins <= 0) continue;
    double t = bins / o->threat[k].distance; /* INFINITY where it folds in */
    least = fmax(least, t * (t * hz > LONG ? TRUST : TRUST_SHORT));
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
