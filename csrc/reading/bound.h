/* Error bounds: how wrong a reading of a line can be at worst.
 *
 * A reading is a set of weights; its selectivity is the window's kernel moved
 * to the frequency that is read, and has the sample rate as its period, so
 * that aliases need no special case.  For a line of true amplitude A
 *
 *   |a - A| <= own A + others     for certain (systematic terms)
 *   plus coverage * sigma / sqrt(averages)    (random terms)
 *
 * Two readings:
 *   bin      the transform at the bin nearest to the nominal frequency
 *   tracked  the highest point of the transform over the line's interval
 *
 * Suprema run over what can move (lbr_scene), jointly for all sources of one
 * driver, and are true upper bounds.
 */
#ifndef LBR_READING_BOUND_H
#define LBR_READING_BOUND_H

#include "base/status.h"
#include "reading/scene.h"
#include "window/kernel.h"

typedef enum lbr_reading { LBR_READING_BIN, LBR_READING_TRACKED } lbr_reading;

/* What a sample rate makes of a scene before any record length is chosen. */
typedef struct lbr_path {
  double rate;     /* S/s */
  double *high;    /* n_sources: most |F| over the source's interval */
  double *nominal; /* n_lines: |F| at the nominal frequency */
  double *droop;   /* n_lines: most relative departure from nominal */
  double *density; /* n_lines: noise density squared where the line is read,
                      folds and the digitizer's own noise included */
} lbr_path;

/* Bytes of doubles an lbr_path needs, and its filling; `memory` holds
 * lbr_path_doubles(scene) doubles that stay the caller's. */
size_t lbr_path_doubles(const lbr_scene *scene);
void lbr_path_fill(lbr_path *path, const lbr_scene *scene,
                   const lbr_front_end *front, double rate, double *memory);

/* One combination to be judged. */
typedef struct lbr_case {
  const lbr_scene *scene;
  const lbr_front_end *front;
  const lbr_path *path;
  lbr_kernel *kernel;   /* at this record length */
  lbr_reading reading;
  size_t n;             /* samples in the record */
  unsigned averages;    /* records averaged, at least 1 */
  double coverage;      /* k: random terms enter as k sigma */
  double second_moment; /* sum w^2 u^2 / sum w^2, u = time / T */
} lbr_case;

/* sum w^2 u^2 / sum w^2 of a window, by quadrature. */
LBR_CHECKED lbr_status lbr_second_moment(const lbr_window *window,
                                         double *out);

typedef struct lbr_bound {
  double own;       /* systematic, relative to the amplitude */
  double others;    /* systematic, demand's unit, independent of amplitude */
  double sigma;     /* standard deviation of one record's amplitude, unit */
  double hz;        /* systematic bound of the frequency, Hz, time base in */
  double sigma_hz;  /* standard deviation of one record's frequency, Hz */
  double amplitude; /* the amplitude at which the tolerance is tightest */
  double error;     /* worst error there, random part included, unit */
  double tolerance; /* tolerance there, unit */
  double ratio;     /* error / tolerance, or frequency error / tolerance_hz,
                       whichever is larger */
  double ratio_hz;  /* the frequency part alone; 0: no such tolerance */
} lbr_bound;

/* A lower bound of lbr_bound.ratio, in well under a microsecond a source:
 * everything at its nominal place. */
double lbr_bound_glance(const lbr_case *c, size_t line);

/* The bound of a line.  Work stops as soon as ratio is known to be at most
 * `enough` or known to exceed it (then ratio > enough, not refined further);
 * enough = 0 refines to the end. */
void lbr_bound_line(const lbr_case *c, size_t line, double enough,
                    lbr_bound *out);

/* The interval over which a tracked reading searches, Hz as the record sees
 * it (for `bin` both ends are the bin's frequency). */
void lbr_bound_search(const lbr_case *c, size_t line, double *low,
                      double *high);

typedef enum lbr_term_kind {
  LBR_TERM_SCALLOP,      /* own droop off the bin, or main lobe over 1 */
  LBR_TERM_IMAGE,        /* own negative-frequency image */
  LBR_TERM_SMEAR,        /* own wander within the record */
  LBR_TERM_DROOP,        /* filter: flatness and slope over the interval */
  LBR_TERM_ACCURACY,     /* sensor and range tolerance */
  LBR_TERM_JITTER_LOSS,  /* loss by aperture jitter */
  LBR_TERM_OFFSET,       /* mean of the record */
  LBR_TERM_LEAKAGE,      /* another source, its image and fold included */
  LBR_TERM_PRODUCTS,     /* products of the terms above, and joint slack */
  LBR_TERM_NOISE,        /* random from here on: noise at the input */
  LBR_TERM_QUANTISATION, /* rounding to codes */
  LBR_TERM_JITTER_NOISE, /* noise by aperture jitter */
  LBR_TERM_KINDS
} lbr_term_kind;

typedef struct lbr_term {
  lbr_term_kind kind;
  size_t source; /* LBR_TERM_LEAKAGE: index of the other source */
  double value;  /* demand's unit at lbr_bound.amplitude: a bound, or for
                    random kinds coverage * sigma / sqrt(averages) */
} lbr_term;

const char *lbr_term_text(lbr_term_kind kind); /* "own image", never NULL */

/* The entries of a line's budget: systematic ones add up to bound->error's
 * systematic part (joint suprema make LBR_TERM_PRODUCTS negative where single
 * suprema cannot coincide), random ones in quadrature.  `terms` has room for
 * n_sources + LBR_TERM_KINDS entries; returns the count. */
size_t lbr_bound_budget(const lbr_case *c, size_t line,
                        const lbr_bound *bound, lbr_term *terms);

#endif
