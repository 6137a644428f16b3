/* The scene: everything that may be in a record, as bare numbers.
 *
 * Frequencies are hz plus what moves: a driver d (a shaft, the mains) deviates
 * by a relative amount e in [-spread_d, spread_d], and a source locked to it
 * moves by lock_hz * e; free_hz is movement of the source's own.  So a
 * source stands at  hz + lock_hz e + g,  |g| <= free_hz.  The first n_lines
 * sources are the lines to be measured, the rest are interferers.
 */
#ifndef LBR_READING_SCENE_H
#define LBR_READING_SCENE_H

#include <stddef.h>

#include "filter/analog.h"

typedef struct lbr_source {
  double hz;      /* nominal frequency, Hz, > 0 */
  double lock_hz; /* movement per unit deviation of its driver, Hz */
  double free_hz; /* half-width of its own movement, Hz */
  double wander;  /* most change of frequency within a record, relative, peak
                     to peak: f(t) = f (1 + wander/2 sin(2 pi t/T + any)), one
                     period per record, so that the mean frequency is f */
  double least;   /* amplitude range, peak, in the demand's unit */
  double most;
  size_t driver;  /* index into the drivers */
} lbr_source;

typedef struct lbr_line { /* tolerance of the source with the same index */
  double tolerance;       /* relative to the amplitude; INFINITY: none */
  double tolerance_abs;   /* in the demand's unit; INFINITY: none */
  double tolerance_hz;    /* of the measured frequency; INFINITY: none */
} lbr_line;

typedef struct lbr_scene {
  size_t n_sources, n_lines, n_drivers;
  const lbr_source *sources; /* n_sources */
  const lbr_line *lines;     /* n_lines */
  const double *spread;      /* n_drivers, relative half-widths */
  double offset;             /* most |mean|, demand's unit */
  double noise;              /* one-sided density before the filter,
                                unit/sqrt(Hz) */
} lbr_scene;

/* The digitizer as the error bound sees it, in the demand's unit. */
typedef struct lbr_front_end {
  lbr_filter filter;
  double flatness;  /* relative, beyond the filter's nominal response */
  double accuracy;  /* relative gain error of sensor and range together */
  double timebase;  /* relative error of the sample rate */
  double jitter_s;  /* standard deviation of a sampling instant, s */
  double range;     /* largest |value| before clipping; INFINITY: not given */
  double step;      /* one code, demand's unit; 0: not given */
  double noise;     /* one-sided density of the digitizer, unit/sqrt(Hz) */
  double skew_s;    /* most delay between channels, s */
} lbr_front_end;

#endif
