/* A path: what a sample rate makes of a scene before any length is chosen. */
#ifndef LBR_READING_PATH_H
#define LBR_READING_PATH_H

#include "reading/scene.h"

typedef struct lbr_path {
  double rate;     /* S/s */
  double *high;    /* n_sources: most |F| over the source's interval */
  double *nominal; /* n_lines: |F| at the nominal frequency */
  double *droop;   /* n_lines: most relative departure from nominal */
  double *density; /* n_lines: noise density squared where the line is read,
                      its folds and the digitizer's own noise included */
} lbr_path;

/* Half-width of a source's interval before the time base, Hz. */
static inline double lbr_half_width(const lbr_scene *s, size_t source) {
  const lbr_source *p = &s->sources[source];
  return p->lock_hz * s->spread[p->driver] + p->free_hz;
}

/* Lowest and highest frequency at which a record may show a source, Hz: the
 * sample rate is off by up to `timebase`, so that f shows at f / (1 + t). */
static inline double lbr_seen_low(const lbr_scene *s, const lbr_front_end *f,
                                  size_t source) {
  double low = s->sources[source].hz - lbr_half_width(s, source);
  return low / (low < 0 ? 1 - f->timebase : 1 + f->timebase);
}

static inline double lbr_seen_high(const lbr_scene *s, const lbr_front_end *f,
                                   size_t source) {
  double high = s->sources[source].hz + lbr_half_width(s, source);
  return high / (1 - f->timebase);
}

/* How many doubles lbr_path_fill stores. */
size_t lbr_path_doubles(const lbr_scene *scene);

/* Fills a path; `memory` holds lbr_path_doubles(scene) doubles and stays the
 * caller's. */
void lbr_path_fill(lbr_path *path, const lbr_scene *scene,
                   const lbr_front_end *front, double rate, double *memory);

#endif
