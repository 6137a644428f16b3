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
#include "reading/path.h"
#include "reading/scene.h"
#include "window/kernel.h"

typedef enum lbr_reading { LBR_READING_BIN, LBR_READING_TRACKED } lbr_reading;

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
  double noise_bandwidth; /* of the window, bins */
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
  size_t asked;     /* kernel enclosures it took */
  double steer;     /* tracked: most distance from the line to where it is
                       read, bins */
} lbr_bound;

/* A lower bound of lbr_bound.ratio, in well under a microsecond a source:
 * everything at its nominal place.  Stops as soon as it exceeds `enough`. */
double lbr_bound_glance(const lbr_case *c, size_t line, double enough);

/* How far suprema over drivers are followed. */
typedef enum lbr_care {
  LBR_CARE_PLAIN, /* every source at its own worst place; what is locked to
                     the line moves as it does */
  LBR_CARE_JOINT  /* sources of one driver are worst together: never more than
                     plain, at some ten times the work */
} lbr_care;

/* A tighter lower bound of the ratio with the same care, at the price of some
 * kernel enclosures, counted up in *asked; stops above `enough`. */
double lbr_bound_reached(const lbr_case *c, size_t line, lbr_care care,
                         double enough, size_t *asked);

/* The bound of a line.  Work stops as soon as ratio is known to be at most
 * `enough` or known to exceed it (then ratio > enough, not refined further);
 * enough = 0 refines to the end. */
void lbr_bound_line(const lbr_case *c, size_t line, lbr_care care,
                    double enough, lbr_bound *out);

/* The interval over which a tracked reading searches, Hz as the record sees
 * it (for `bin` both ends are the bin's frequency). */
void lbr_bound_search(const lbr_case *c, size_t line, double *low,
                      double *high);

#endif
