#include "window/figures.h"

#include <math.h>

#include "window/fit.h"
#include "window/model.h"

#define STEP (1.0 / LBR_GRID)
#define FARTHEST 4096.0 /* bins that are searched for side lobes */
#define OCTAVE 3000.0   /* bins where the fall by an octave is measured */

static double decibels(double ratio) { return 20 * log10(ratio); }

static double far_end(const lbr_kernel *k) {
  return k->n ? fmin((double)k->n / 2, FARTHEST) : FARTHEST;
}

/* Full width at a level: the first crossing, twice. */
static double width(const lbr_kernel *k, double level) {
  double from = 0, to = STEP;
  while (lbr_kernel_gain(k, to) > level && to < far_end(k)) {
    from = to;
    to += STEP;
  }
  for (int i = 0; i < 60; i++) {
    double middle = (from + to) / 2;
    if (lbr_kernel_gain(k, middle) > level)
      from = middle;
    else
      to = middle;
  }
  return from + to;
}

/* First sign change of R. */
static double first_null(const lbr_kernel *k) {
  double from = 0, to = STEP;
  while (lbr_model_real(k, to) > 1e-15) {
    from = to;
    to += STEP;
    if (to > far_end(k)) return NAN;
  }
  if (fabs(lbr_model_real(k, to)) <= 1e-15) return to;
  for (int i = 0; i < 60; i++) {
    double middle = (from + to) / 2;
    if (lbr_model_real(k, middle) > 0)
      from = middle;
    else
      to = middle;
  }
  return (from + to) / 2;
}

/* The highest point of sign * |W| between from and to, by golden sections. */
static double summit(const lbr_kernel *k, double from, double to, double sign,
                     double *value) {
  const double golden = 0.61803398874989484820;
  double a = to - golden * (to - from), b = from + golden * (to - from);
  double fa = sign * lbr_kernel_gain(k, a), fb = sign * lbr_kernel_gain(k, b);
  for (int i = 0; i < 50; i++) {
    if (fa > fb) {
      to = b, b = a, fb = fa;
      a = to - golden * (to - from);
      fa = sign * lbr_kernel_gain(k, a);
    } else {
      from = a, a = b, fa = fb;
      b = from + golden * (to - from);
      fb = sign * lbr_kernel_gain(k, b);
    }
  }
  *value = fmax(fa, fb) * sign;
  return (from + to) / 2;
}

static void side_lobe(const lbr_kernel *k, double null, lbr_figures *out) {
  double best = 0, at = NAN, value, bound, slope;
  double left = 0, here = lbr_kernel_gain(k, null);
  for (double x = null; x < far_end(k); x += STEP) {
    double right = lbr_kernel_gain(k, x + STEP);
    if (here >= left && here >= right && here > 0.9 * best) {
      double place = summit(k, fmax(null, x - STEP), x + STEP, 1, &value);
      if (value > best) best = value, at = place;
    }
    left = here;
    here = right;
    lbr_model_beyond(k, x, &bound, &slope);
    if (bound < best) break;
  }
  out->side_lobe_db = decibels(best);
  out->side_lobe_at = at;
}

/* The response at its extremes within half a bin, in dB. */
static double flatness(const lbr_kernel *k) {
  double worst = 0, value;
  for (double x = 0; x < 0.5; x += STEP)
    for (int sign = -1; sign <= 1; sign += 2) {
      summit(k, x, x + STEP, sign, &value);
      double db = decibels(value);
      if (fabs(db) > fabs(worst)) worst = db;
    }
  double end = decibels(lbr_kernel_gain(k, 0.5));
  return fabs(end) > fabs(worst) ? end : worst;
}

/* The first power of 1/S whose factor is not lost to rounding makes the fall
 * of an exact series: 6 dB per octave and 12 more for each that vanishes. */
static double decay_of_series(const lbr_poles *p, double first) {
  double power[LBR_SERIES_MOST];
  for (size_t k = 0; k < p->count; k++) power[k] = p->residue[k];
  for (int j = 0; j < 8; j++) {
    double sum = 0, size = 0;
    for (size_t k = 0; k < p->count; k++) {
      sum += power[k];
      size += fabs(power[k]);
      power[k] *= p->at[k];
    }
    if (fabs(sum) > 3e-15 * size) return first + 2 * j;
  }
  return NAN;
}

/* The highest response on some bins from a place on. */
static double highest(const lbr_kernel *k, double from) {
  double most = 0;
  for (double x = from; x < from + 32; x += STEP)
    most = fmax(most, lbr_kernel_gain(k, x));
  return most;
}

static double decay(const lbr_kernel *k) {
  const lbr_window_shape *shape = k->window.shape;
  const double order = 20 * log10(2);
  if (shape->terms || (shape->expand && k->series.misfit == 0)) {
    if (k->series.half.count)
      return order * decay_of_series(&k->series.half, 2);
    return order * decay_of_series(&k->series.whole, 1);
  }
  double from = k->n ? (double)k->n / 16 : OCTAVE;
  double near = highest(k, from), far = highest(k, 2 * from);
  return far > 1e-13 ? decibels(near / far) : NAN;
}

static double coherent_gain(const lbr_kernel *k) {
  const lbr_window_shape *shape = k->window.shape;
  if (!shape->closed) return k->series.sum / lbr_fit_value(&k->series, 0);
  return NAN;
}

static void measure(lbr_kernel *k, lbr_figures *out) {
  out->length = k->n;
  out->coherent_gain = coherent_gain(k);
  out->noise_bandwidth = lbr_kernel_noise_bandwidth(k);
  out->noise_bandwidth_db = decibels(out->noise_bandwidth) / 2;
  out->scalloping_db = -decibels(lbr_kernel_gain(k, 0.5));
  out->flatness_db = flatness(k);
  out->worst_loss_db = out->scalloping_db + out->noise_bandwidth_db;
  out->width_half_power = width(k, sqrt(0.5));
  out->width_3db = width(k, pow(10, -3.0 / 20));
  out->width_6db = width(k, pow(10, -6.0 / 20));
  out->width_half = width(k, 0.5);
  out->first_null = first_null(k);
  side_lobe(k, isnan(out->first_null) ? 0 : out->first_null, out);
  out->decay_db_octave = decay(k);
}

lbr_status lbr_figures_of(const lbr_window *window, lbr_figures *out) {
  lbr_kernel *k = NULL;
  const lbr_closed *closed = window->shape->closed;
  size_t n = closed && !closed->limit ? LBR_FIGURES_LENGTH : 0;
  lbr_figures made;
  lbr_status status = lbr_kernel_new(window, n, &k);
  if (status != LBR_OK) return status;
  measure(k, &made);
  lbr_kernel_free(k);
  status = lbr_figures_overlap(window, &made);
  if (status == LBR_OK) *out = made;
  return status;
}
