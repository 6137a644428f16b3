#include "reading/bound.h"

#include <math.h>
#include <stdbool.h>

#include "reading/leak.h"
#include "reading/parts.h"

#define PI 3.14159265358979323846
#define SLACK 2e-3  /* how tight joint suprema are made, of the tolerance */
#define ROUNDS 3    /* times the steering radius is narrowed */
#define LOBE_END 16 /* no main lobe reaches further, bins */

static const lbr_source *own(const lbr_case *c, size_t line) {
  return &c->scene->sources[line];
}

double lbr_duration(const lbr_case *c) { return (double)c->n / c->path->rate; }

static double bin_hz(const lbr_case *c, size_t line) {
  return rint(own(c, line)->hz * lbr_duration(c)) / lbr_duration(c);
}

void lbr_bound_search(const lbr_case *c, size_t line, double *low,
                      double *high) {
  if (c->reading == LBR_READING_BIN) {
    *low = *high = bin_hz(c, line);
    return;
  }
  *low = lbr_seen_low(c->scene, c->front, line);
  *high = lbr_seen_high(c->scene, c->front, line);
}

/* Variances of one record's amplitude by cause, unit squared. */
lbr_variance lbr_bound_variance(const lbr_case *c, size_t line) {
  const lbr_front_end *f = c->front;
  double nyquist = c->path->rate / 2, slopes = 0;
  double per_density = c->noise_bandwidth / lbr_duration(c) /
                       (c->path->nominal[line] * c->path->nominal[line]);
  for (size_t j = 0; f->jitter_s > 0 && j < c->scene->n_sources; j++) {
    const lbr_source *s = &c->scene->sources[j];
    double slope = 2 * PI * s->hz * s->most * c->path->high[j];
    slopes += slope * slope / 2;
  }
  return (lbr_variance){
      .noise = c->path->density[line] * per_density,
      .quantisation = f->step * f->step / 12 / nyquist * per_density,
      .jitter = slopes * f->jitter_s * f->jitter_s / nyquist * per_density};
}

static double sigma(const lbr_case *c, size_t line) {
  lbr_variance v = lbr_bound_variance(c, line);
  return sqrt(v.noise + v.quantisation + v.jitter);
}

/* The distance beyond which the kernel stays below `level` as far as
 * `widest`, bins; INFINITY where that is further than any main lobe. */
static double last_above(lbr_kernel *kernel, double level, double widest) {
  double low, high;
  int bin = LOBE_END;
  if (widest > LOBE_END) {
    lbr_kernel_range(kernel, LOBE_END, widest, &low, &high);
    if (high >= level) return INFINITY;
  }
  while (bin > 0) {
    lbr_kernel_range(kernel, bin - 1, bin, &low, &high);
    if (high >= level) break;
    bin--;
  }
  if (bin == 0) return bin;
  double from = bin - 1, to = bin; /* gain below level on [to, bin] */
  while (to - from > 1e-3) {
    double middle = (from + to) / 2;
    lbr_kernel_range(kernel, middle, to, &low, &high);
    if (high >= level)
      from = middle;
    else
      to = middle;
  }
  return to;
}

/* Own wander, `reach` bins off the line at most: an odd sideband pair is in
 * quadrature with the carrier at the line itself, an even one is not. */
static lbr_smear smear_of(const lbr_case *c, size_t line, double reach) {
  size_t asked = 0;
  double weight[LBR_SIDEBANDS] = {1}, low, absolute, even = 0;
  lbr_leak l = lbr_leak_of_case(c, line, 0, &asked);
  lbr_wander w;
  lbr_leak_wander(&l, line, &w);
  if (w.count == 1) return (lbr_smear){0, 0, 0, 0};
  absolute = lbr_kernel_absolute(c->kernel);
  if (!w.whole) return (lbr_smear){1, 1, absolute - 1, absolute};
  lbr_smear smear = {.carrier = 1 - w.carrier};
  for (size_t k = 1; k < w.count; k++) {
    double order = (double)k, shown;
    lbr_kernel_range(c->kernel, order - reach, order + reach, &low,
                     &weight[k]);
    weight[k] *= 2;
    shown = lbr_wander_order(&w, k) * weight[k];
    smear.flanks += shown;
    if (k % 2 == 0) even += shown;
  }
  smear.loss = smear.carrier + even;
  smear.excess = fmax(fmin(absolute, lbr_wander_sum(&w, weight)) - 1, 0);
  return smear;
}

/* Response to the offset wherever the line may be read. */
static double offset_gain(const lbr_case *c, double low_hz, double high_hz) {
  double low, high, t = lbr_duration(c);
  lbr_kernel_range(c->kernel, low_hz * t, high_hz * t, &low, &high);
  return high;
}

/* Response to the line's own image, wherever it is and is read. */
static double image_gain(const lbr_case *c, size_t line) {
  size_t asked = 0;
  double t = lbr_duration(c), read = bin_hz(c, line);
  lbr_leak l = lbr_leak_of_case(c, line, 0, &asked);
  double from = lbr_seen_low(c->scene, c->front, line);
  double to = lbr_seen_high(c->scene, c->front, line);
  bool bin = c->reading == LBR_READING_BIN;
  from += bin ? read : from;
  to += bin ? read : to;
  return lbr_leak_spread(&l, line, from * t, to * t);
}

/* How far a line may be off its bin, bins. */
static void bin_offsets(const lbr_case *c, size_t line, double *from,
                        double *to) {
  double t = lbr_duration(c), read = bin_hz(c, line);
  *from = (lbr_seen_low(c->scene, c->front, line) - read) * t;
  *to = (lbr_seen_high(c->scene, c->front, line) - read) * t;
}

/* Own lobe: how far |H| leaves 1 where the line may stand. */
static double lobe_gain(const lbr_case *c, size_t line, double steer) {
  double low, high, from, to;
  if (c->reading == LBR_READING_TRACKED) {
    lbr_kernel_range(c->kernel, -steer, steer, &low, &high);
    return fmax(high - 1, 0);
  }
  bin_offsets(c, line, &from, &to);
  lbr_kernel_range(c->kernel, from, to, &low, &high);
  return fmax(high - 1, 1 - low);
}

static double off_line(const lbr_case *c, size_t line, double steer) {
  double from, to;
  if (c->reading == LBR_READING_TRACKED) return steer;
  bin_offsets(c, line, &from, &to);
  return fmax(fabs(from), fabs(to));
}

/* The highest frequency a line may truly have, Hz. */
static double top_hz(const lbr_case *c, size_t line) {
  return own(c, line)->hz + lbr_half_width(c->scene, line);
}

/* What the record shows of an offset: some filters lift 0 Hz. */
static double offset_shown(const lbr_case *c) {
  double gain = lbr_filter_gain(&c->front->filter, 0, c->path->rate);
  return c->scene->offset * fmax(gain, 1) * lbr_parts_scale(c);
}

/* The terms of one line for a given steering radius, joint sum apart. */
lbr_parts lbr_bound_parts(const lbr_case *c, size_t line, double steer) {
  double low, high;
  double jitter = 2 * PI * top_hz(c, line) * c->front->jitter_s;
  lbr_smear smear = smear_of(c, line, off_line(c, line, steer));
  lbr_bound_search(c, line, &low, &high);
  lbr_parts p = {.steer = steer};
  p.lobe = lobe_gain(c, line, steer);
  p.image = image_gain(c, line);
  p.smear = c->reading == LBR_READING_BIN ? smear.carrier + smear.flanks
                                          : fmax(smear.loss, smear.excess);
  p.flanks = smear.flanks;
  p.carrier = smear.carrier;
  p.droop = c->path->droop[line];
  p.accuracy = c->front->accuracy;
  p.jitter_loss = -expm1(-jitter * jitter / 2);
  p.offset = 2 * offset_shown(c) / c->path->nominal[line] *
             offset_gain(c, low, high);
  return p;
}

static double own_product(const lbr_parts *p) {
  return (1 + p->lobe + p->image + p->smear) * (1 + p->droop) *
             (1 + p->accuracy) * (1 + p->jitter_loss) - 1;
}

double lbr_parts_scale(const lbr_case *c) {
  return (1 + c->front->flatness) * (1 + c->front->accuracy);
}

static double tolerance_at(const lbr_line *line, double amplitude) {
  return fmin(line->tolerance * amplitude, line->tolerance_abs);
}

/* Fills error, tolerance, amplitude, ratio from own, others, sigma. */
static void judge(const lbr_case *c, size_t line, lbr_bound *b) {
  const lbr_source *s = own(c, line);
  const double ends[2] = {s->least, s->most};
  double root = sqrt((double)c->averages), random = c->coverage / root;
  b->ratio = -1;
  for (int k = 0; k < 2; k++) {
    double error = b->own * ends[k] + b->others + random * b->sigma;
    double tolerance = tolerance_at(&c->scene->lines[line], ends[k]);
    double ratio = isinf(tolerance) ? 0 : error / tolerance;
    if (isnan(ratio)) ratio = INFINITY; /* nothing comes through the filter */
    if (ratio <= b->ratio) continue;
    b->ratio = ratio;
    b->amplitude = ends[k];
    b->error = error;
    b->tolerance = tolerance;
  }
  double hz = b->hz + random * b->sigma_hz;
  double allowed = c->scene->lines[line].tolerance_hz;
  b->ratio_hz = isinf(allowed) ? 0 : hz / allowed;
  if (isnan(b->ratio_hz)) b->ratio_hz = INFINITY;
  b->ratio = fmax(b->ratio, b->ratio_hz);
}

/* What leaks (unit) and an offset (unit, its gains in) are beside the line
 * where it comes out weakest and they strongest; accuracy is common to all. */
static double beside(const lbr_case *c, size_t line, const lbr_parts *p,
                     double leak, double offset) {
  double left = fmax(1 - p->droop, 0) * (1 - p->jitter_loss);
  double weakest = own(c, line)->least * left;
  double others = leak * (1 + c->front->flatness) +
                  offset / (1 + c->front->accuracy);
  return others > 0 ? others / weakest : 0;
}

/* Upper bound of the slope of everything but the line's own carrier, per bin,
 * relative to the line. */
static double disturbing_slope(const lbr_case *c, const lbr_leak *l,
                               const lbr_parts *p) {
  double t = l->duration, far = p->steer, low, high, offset, slope;
  lbr_wander w;
  lbr_leak_wander(l, l->line, &w);
  if (!w.whole) return INFINITY;
  lbr_bound_search(c, l->line, &low, &high);
  offset = 2 * offset_shown(c) / c->path->nominal[l->line] *
           lbr_kernel_slope(c->kernel, low * t - far, high * t + far);
  slope = beside(c, l->line, p, lbr_leak_slope(l), offset);
  for (size_t k = 1; k < w.count; k++)
    slope += 2 * lbr_wander_order(&w, k) *
             lbr_kernel_slope(c->kernel, (double)k - far, (double)k + far);
  return slope + lbr_leak_spread_slope(l, l->line, 2 * low * t - far,
                                       2 * high * t + far);
}

/* How far the highest point is from the line, bins: by the stationarity of
 * |X|^2,  |R'| <= |L'| (R + |L|) / (R - |L|),  all relative to the line. */
static double track_bins(const lbr_case *c, const lbr_leak *l,
                         const lbr_parts *p, double leak) {
  double carrier = 1 - p->carrier, least, high;
  double curvature = carrier * lbr_kernel_curvature(c->kernel, p->steer);
  double others = beside(c, l->line, p, leak, p->offset) + p->flanks +
                  p->image;
  lbr_kernel_range(c->kernel, -p->steer, p->steer, &least, &high);
  double kept = carrier * least;
  if (!(curvature > 0 && others < kept)) return p->steer;
  double bins = disturbing_slope(c, l, p) / curvature * (kept + others) /
                (kept - others);
  return fmin(bins, p->steer);
}

static void track_frequency(const lbr_case *c, const lbr_leak *l,
                            const lbr_parts *p, double leak, lbr_bound *b) {
  double t = l->duration, low, high;
  double peak = lbr_kernel_curvature(c->kernel, 0);
  lbr_bound_search(c, l->line, &low, &high);
  b->hz = track_bins(c, l, p, leak) / t + high * c->front->timebase;
  b->sigma_hz = peak > 0 ? b->sigma * 2 * PI * sqrt(c->second_moment) /
                               (own(c, l->line)->least * peak * t)
                         : (high - low);
}

static void bin_frequency(const lbr_case *c, size_t line, lbr_bound *b) {
  const lbr_source *s = own(c, line);
  double half = lbr_half_width(c->scene, line), read = bin_hz(c, line);
  b->hz = fmax(fabs(s->hz - half - read), fabs(s->hz + half - read));
  b->sigma_hz = 0;
}

static void settle(const lbr_case *c, const lbr_leak *l, const lbr_parts *p,
                   double leak, bool search, lbr_bound *b) {
  b->own = own_product(p);
  b->others = leak * lbr_parts_scale(c) + p->offset;
  if (search && isinf(c->scene->lines[l->line].tolerance_hz))
    b->hz = INFINITY; /* nobody asks while plans are searched */
  else if (c->reading == LBR_READING_BIN)
    bin_frequency(c, l->line, b);
  else
    track_frequency(c, l, p, leak, b);
  judge(c, l->line, b);
}

/* Most the line's place of reading can be from the line, given that all other
 * contributions stay below `leak` (unit) wherever the search may look. */
static double steer_radius(const lbr_case *c, size_t line, double leak_anywhere,
                           double leak_here, const lbr_parts *p) {
  double others =
      beside(c, line, p, leak_anywhere + leak_here, 2 * p->offset);
  double level = 1 - p->smear - p->flanks - 2 * p->image - others;
  if (!(level > 0)) return INFINITY;
  return last_above(c->kernel, level, p->steer);
}

/* The sum of leaks that the amplitude bound could at most afford. */
static double affordable(const lbr_case *c, size_t line, double own_share,
                         double offset, double sigma_one, double enough) {
  const lbr_source *s = own(c, line);
  double random = c->coverage / sqrt((double)c->averages) * sigma_one;
  double most = INFINITY;
  for (int k = 0; k < 2; k++) {
    double a = k ? s->most : s->least;
    double room = enough * tolerance_at(&c->scene->lines[line], a) -
                  own_share * a - offset - random;
    most = fmin(most, room / lbr_parts_scale(c));
  }
  return most;
}

void lbr_bound_line(const lbr_case *c, size_t line, lbr_care care,
                    double enough, lbr_bound *b) {
  double low, high, t = lbr_duration(c);
  lbr_bound_search(c, line, &low, &high);
  bool tracked = c->reading == LBR_READING_TRACKED;
  double widest = tracked ? (high - low) * t : 0;
  lbr_leak l = lbr_leak_of_case(c, line, INFINITY, &b->asked);
  *b = (lbr_bound){.sigma = sigma(c, line)};
  double anywhere = lbr_leak_crude(&l), leak = anywhere;
  lbr_parts p = lbr_bound_parts(c, line, widest);
  b->steer = widest;
  settle(c, &l, &p, leak, enough > 0, b);
  if (b->ratio <= enough) return;
  for (int round = 0; round < ROUNDS; round++) {
    if (tracked) {
      double radius = steer_radius(c, line, round ? leak : anywhere, leak, &p);
      l.steer = fmin(fmin(radius, b->steer), widest);
      if (round > 0 && l.steer > 0.97 * b->steer) return;
      p = lbr_bound_parts(c, line, l.steer);
    }
    double room = 0;
    if (enough > 0)
      room = affordable(c, line, own_product(&p), p.offset, b->sigma, enough);
    if (room < 0) return;
    double limit = enough > 0 ? room : INFINITY;
    double sum = lbr_leak_plain(&l, INFINITY);
    if (care == LBR_CARE_JOINT && sum > room)
      sum = lbr_leak_joint(&l, room, limit, SLACK * b->tolerance);
    leak = fmin(leak, sum);
    b->steer = l.steer;
    settle(c, &l, &p, leak, enough > 0, b);
    if (!tracked || b->ratio <= enough) return;
  }
}

/* What no choice of phases and deviations can take away, leaks apart. */
static double least_own(const lbr_case *c, size_t line, double read_hz) {
  double own = (1 + c->path->droop[line]) * (1 + c->front->accuracy) - 1;
  if (c->reading == LBR_READING_BIN) {
    double off = (c->scene->sources[line].hz - read_hz) * lbr_duration(c);
    own += 1 - fmin(lbr_kernel_gain(c->kernel, off), 1);
  }
  return own;
}

double lbr_bound_glance(const lbr_case *c, size_t line, double enough) {
  size_t asked = 0;
  lbr_leak l = lbr_leak_of_case(c, line, 0, &asked);
  lbr_bound b = {.sigma = sigma(c, line)};
  b.own = least_own(c, line, l.read_hz);
  double room = affordable(c, line, b.own, 0, b.sigma, enough);
  if (room >= 0) b.others = lbr_leak_nominal(&l, room * (1 + 1e-9));
  judge(c, line, &b);
  return b.ratio;
}

double lbr_bound_reached(const lbr_case *c, size_t line, lbr_care care,
                         double enough, size_t *asked) {
  lbr_leak l = lbr_leak_of_case(c, line, 0, asked);
  lbr_bound b = {.sigma = sigma(c, line)};
  lbr_parts p = lbr_bound_parts(c, line, 0);
  b.own = own_product(&p);
  double room = affordable(c, line, b.own, p.offset, b.sigma, enough);
  bool joint = care == LBR_CARE_JOINT;
  if (room >= 0)
    b.others = joint ? lbr_leak_reached(&l, room) : lbr_leak_plain(&l, room);
  b.others = b.others * lbr_parts_scale(c) + p.offset;
  judge(c, line, &b);
  return b.ratio;
}

static double square(double x) { return x * x; }

lbr_status lbr_second_moment(const lbr_window *window, double *out) {
  enum { POINTS = 512 };
  double w[POINTS], moment = 0, power = 0;
  lbr_status status = lbr_window_fill(window, w, POINTS);
  if (status != LBR_OK) return status;
  for (int i = 0; i < POINTS; i++) {
    moment += square(w[i] * ((double)i / POINTS - 0.5));
    power += square(w[i]);
  }
  *out = moment / power;
  return LBR_OK;
}
