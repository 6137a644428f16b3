/* Figures of merit of a window, in the words of Harris 1978 and of Heinzel et
 * al. 2002.  Shapes that have a limit for long records are judged there, the
 * others at the length that is stated. */
#ifndef LBR_WINDOW_FIGURES_H
#define LBR_WINDOW_FIGURES_H

#include <stddef.h>

#include "base/status.h"
#include "window/kernel.h"
#include "window/window.h"

#define LBR_FIGURES_LENGTH 4096 /* of shapes without a limit */

typedef struct lbr_figures {
  size_t length;              /* 0: the limit */
  double coherent_gain;       /* mean over the middle */
  double noise_bandwidth;     /* N sum w^2 / (sum w)^2, bins */
  double noise_bandwidth_db;  /* the same, dB */
  double scalloping_db;       /* loss half a bin off */
  double flatness_db;         /* extreme of the response within half a bin,
                               * with its sign */
  double worst_loss_db;       /* scalloping plus noise bandwidth */
  double width_half_power;    /* full widths of the main lobe, bins: |W|^2 = */
  double width_3db;           /* 1/2; -3 dB; */
  double width_6db;           /* -6 dB; */
  double width_half;          /* |W| = 1/2 */
  double first_null;          /* first zero of the response, bins; NAN: none */
  double side_lobe_db;        /* highest response past the first null */
  double side_lobe_at;        /* where it is, bins */
  double decay_db_octave;     /* fall of the far side lobes; NAN where they are
                               * below rounding */
  double overlap_50;          /* correlation of the noise of records that */
  double overlap_75;          /* overlap by 50 %, by 75 % */
  double overlap;             /* recommended: largest amplitude flatness less
                               * correlation, share of the length; overlaps
                               * that are even by themselves alone left out */
  double amplitude_flatness;  /* there: least over most of the sum of windows */
  double power_flatness;      /* root of least over most of summed squares */
  double correlation;         /* and the correlation */
} lbr_figures;

LBR_CHECKED lbr_status lbr_figures_of(const lbr_window *window,
                                      lbr_figures *out);

/* The overlap part alone (the last six fields), for lbr_figures_of. */
LBR_CHECKED lbr_status lbr_figures_overlap(const lbr_window *window,
                                           lbr_figures *out);

#endif
