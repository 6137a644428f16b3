#include "lines/shaft.h"

#include <math.h>

#include "base/checked.h"
#include "base/cycles.h"
#include "lines/normal.h"

#define BLOCK 64 /* samples whose columns are made at a time */
#define PI 3.14159265358979323846264338328
#define BETA 10.0
#define TAPER 4096 /* steps of the window table */
#define FAST __attribute__((target_clones("avx512f", "avx2", "default")))

lbr_status lbr_shaft_check(const lbr_shaft *s) {
  if (s->pulses < 3 || !(s->per_turn > 0) || !isfinite(s->per_turn))
    return LBR_DOMAIN;
  for (size_t i = 0; i < s->pulses; i++)
    if (!isfinite(s->pulse[i]) || (i && !(s->pulse[i] > s->pulse[i - 1])))
      return LBR_DOMAIN;
  return LBR_OK;
}

/* Pulses per sample at pulse i, from the parabola through three. */
static double slope_at(const lbr_shaft *s, size_t i) {
  size_t a = i == 0 ? 0 : i + 1 == s->pulses ? i - 2 : i - 1;
  const double *t = s->pulse + a;
  double h = t[1] - t[0], g = t[2] - t[1];
  if (i == 0) return (1 / h) * (2 * h + g) / (h + g) - h / (g * (h + g));
  if (i + 1 == s->pulses)
    return (1 / g) * (2 * g + h) / (h + g) - g / (h * (h + g));
  return (g / h + h / g) / (h + g);
}

/* Pulses since the first at time t, between pulses i and i + 1; and slope. */
static double angle_at(const lbr_shaft *s, size_t i, double t, double *slope) {
  double h = s->pulse[i + 1] - s->pulse[i], u = (t - s->pulse[i]) / h;
  double a = slope_at(s, i) * h, b = slope_at(s, i + 1) * h;
  double c2 = 3 - 2 * a - b, c3 = a + b - 2;
  if (slope) *slope = (a + u * (2 * c2 + 3 * u * c3)) / h;
  return (double)i + u * (a + u * (c2 + u * c3));
}

void lbr_shaft_turns(const lbr_shaft *s, size_t first, size_t n,
                     double *turns) {
  size_t i = 0;
  for (size_t k = 0; k < n; k++) {
    double t = (double)(first + k);
    while (i + 2 < s->pulses && s->pulse[i + 1] <= t) i++;
    turns[k] = angle_at(s, i, t, NULL) / s->per_turn;
  }
}

/* cos and sin of the orders at a block of angles: columns 1 + 2 i, 2 + 2 i;
 * column 0 is 1. */
FAST static void fill_columns(const double *turns, size_t n,
                              const double *orders, size_t count,
                              double *columns) {
  for (size_t k = 0; k < BLOCK; k++) columns[k] = k < n ? 1 : 0;
  for (size_t i = 0; i < count; i++) {
    double *c = columns + (1 + 2 * i) * BLOCK, *s = c + BLOCK;
    for (size_t k = 0; k < n; k++)
      lbr_cos_sin_cycles(lbr_fraction_part(orders[i] * turns[k]), c + k, s + k);
    for (size_t k = n; k < BLOCK; k++) c[k] = s[k] = 0;
  }
}

static inline double block_dot(const double *a, const double *b) {
  double lane[8] = {0}, sum = 0;
  for (size_t k = 0; k < BLOCK; k += 8)
    for (size_t l = 0; l < 8; l++) lane[l] += a[k + l] * b[k + l];
  for (size_t l = 0; l < 8; l++) sum += lane[l];
  return sum;
}

FAST static void add_products(const double *columns, size_t width,
                              const double *y, double *g, double *b) {
  for (size_t i = 0; i < width; i++) {
    for (size_t j = 0; j <= i; j++)
      g[i * width + j] += block_dot(columns + i * BLOCK, columns + j * BLOCK);
    b[i] += block_dot(columns + i * BLOCK, y);
  }
}

typedef struct order_work {
  double *columns, *g, *inverse, *b; /* one block of memory */
  size_t width;
} order_work;

static void accumulate(const order_work *w, const double *x,
                       const double *turns, size_t n, const double *orders,
                       size_t count) {
  double y[BLOCK];
  for (size_t at = 0; at < n; at += BLOCK) {
    size_t present = n - at < BLOCK ? n - at : BLOCK;
    for (size_t k = 0; k < BLOCK; k++) y[k] = k < present ? x[at + k] : 0;
    fill_columns(turns + at, present, orders, count, w->columns);
    add_products(w->columns, w->width, y, w->g, w->b);
  }
}

static double left_over(const order_work *w, const double *x,
                        const double *turns, size_t n, const double *orders,
                        size_t count) {
  double squares = 0;
  for (size_t at = 0; at < n; at += BLOCK) {
    size_t present = n - at < BLOCK ? n - at : BLOCK;
    fill_columns(turns + at, present, orders, count, w->columns);
    for (size_t k = 0; k < present; k++) {
      double r = x[at + k];
      for (size_t i = 0; i < w->width; i++)
        r -= w->b[i] * w->columns[i * BLOCK + k];
      squares += r * r;
    }
  }
  return squares;
}

static void report(const order_work *w, size_t count, double s2,
                   lbr_order *out) {
  for (size_t i = 0; i < count; i++) {
    size_t c = 1 + 2 * i, s = c + 1;
    double a = w->b[c], b = w->b[s], r2 = a * a + b * b;
    double vaa = s2 * w->inverse[c * w->width + c];
    double vbb = s2 * w->inverse[s * w->width + s];
    double vab = s2 * w->inverse[s * w->width + c];
    out[i].amplitude = sqrt(r2);
    out[i].phase = atan2(-b, a);
    out[i].u_amplitude =
        r2 > 0 ? sqrt((a * a * vaa + 2 * a * b * vab + b * b * vbb) / r2)
               : sqrt(0.5 * (vaa + vbb));
    out[i].u_phase =
        r2 > 0 ? sqrt(b * b * vaa - 2 * a * b * vab + a * a * vbb) / r2
               : INFINITY;
  }
}

lbr_status lbr_order_fit(const double *x, const double *turns, size_t n,
                         const double *orders, size_t count, lbr_order *out,
                         double *offset, double *rms, size_t *which) {
  size_t width = 2 * count + 1, column = 0;
  if (count < 1 || count > LBR_ORDERS_MOST || n < width + 1) return LBR_DOMAIN;
  double *memory =
      lbr_alloc(width * BLOCK + 2 * width * width + width, sizeof *memory);
  if (!memory) return LBR_NO_MEMORY;
  order_work w = {.columns = memory, .width = width};
  w.g = memory + width * BLOCK;
  w.inverse = w.g + width * width;
  w.b = w.inverse + width * width;
  accumulate(&w, x, turns, n, orders, count);
  lbr_status status = lbr_normal_factor(w.g, width, width, &column);
  if (status == LBR_OK) {
    lbr_normal_solve(w.g, width, width, w.b);
    lbr_normal_invert(w.g, width, width, w.inverse);
    double squares = left_over(&w, x, turns, n, orders, count);
    report(&w, count, squares / (double)(n - width), out);
    *offset = w.b[0];
    *rms = sqrt(squares / (double)n);
  } else {
    *which = column ? (column - 1) / 2 : 0;
  }
  free(memory);
  return status;
}

/* I0 by its series (Abramowitz and Stegun 1964, 9.6.12). */
static double bessel_i0(double x) {
  double term = 1, sum = 1, z = 0.25 * x * x;
  for (int k = 1; k < 200 && term > 1e-17 * sum; k++) {
    term *= z / ((double)k * k);
    sum += term;
  }
  return sum;
}

/* The Kaiser window by |v|, 0 .. 1, to be read between its points: 1e-6 off. */
typedef struct taper {
  double at[TAPER + 2];
} taper;

static void fill_taper(taper *w) {
  double scale = 1 / bessel_i0(BETA);
  for (int k = 0; k < TAPER + 2; k++) {
    double v = (double)k / TAPER;
    w->at[k] = scale * bessel_i0(BETA * sqrt(fmax(1 - v * v, 0)));
  }
}

/* x between samples, by the windowed sinc; t at least LBR_SHAFT_TAPS inside. */
static double value_at(const double *x, double t, const taper *w) {
  double whole = floor(t), d = t - whole, sum = 0, sine = sin(PI * d);
  const double *at = x + (size_t)whole;
  if (d == 0) return at[0];
  for (int k = 1 - LBR_SHAFT_TAPS; k <= LBR_SHAFT_TAPS; k++) {
    double u = d - k, place = fabs(u) * ((double)TAPER / LBR_SHAFT_TAPS);
    double sinc = (k % 2 ? -sine : sine) / (PI * u);
    size_t j = (size_t)place;
    double rest = place - (double)j;
    sum += at[k] * sinc * (w->at[j] + rest * (w->at[j + 1] - w->at[j]));
  }
  return sum;
}

/* The time at which `pulses` pulses have passed since the first; *i is where
 * the last call found its interval. */
static double time_at(const lbr_shaft *s, double pulses, size_t *i) {
  while (*i + 2 < s->pulses && (double)(*i + 1) <= pulses) (*i)++;
  double lo = s->pulse[*i], hi = s->pulse[*i + 1], slope;
  double t = lo + (pulses - (double)*i) * (hi - lo);
  for (int k = 0; k < 50; k++) {
    double error = angle_at(s, *i, t, &slope) - pulses;
    if (error > 0)
      hi = t;
    else
      lo = t;
    double next = slope > 0 ? t - error / slope : NAN;
    if (!(next >= lo && next <= hi)) next = 0.5 * (lo + hi);
    if (fabs(next - t) <= 1e-14 * (1 + fabs(t))) break;
    t = next;
  }
  return t;
}

/* First and last whole turn inside the record with its margins. */
static lbr_status whole_turns(const lbr_shaft *s, size_t n, size_t *from,
                              size_t *to) {
  size_t i = 0, turn = 0, most;
  double all = floor((double)(s->pulses - 1) / s->per_turn);
  if (n <= 2 * LBR_SHAFT_TAPS || !(all >= 1)) return LBR_DOMAIN;
  most = (size_t)all;
  double first = LBR_SHAFT_TAPS, last = (double)(n - 1 - LBR_SHAFT_TAPS);
  while (turn < most && time_at(s, (double)turn * s->per_turn, &i) < first)
    turn++;
  *from = turn;
  while (turn < most &&
         time_at(s, (double)(turn + 1) * s->per_turn, &i) <= last)
    turn++;
  *to = turn;
  return *to > *from ? LBR_OK : LBR_DOMAIN;
}

lbr_status lbr_shaft_average(const lbr_shaft *s, const double *x, size_t n,
                             size_t points, double *mean, double *deviation,
                             size_t *turns) {
  size_t from, to, i = 0;
  taper window;
  lbr_status status = whole_turns(s, n, &from, &to);
  if (status != LBR_OK) return status;
  fill_taper(&window);
  for (size_t p = 0; p < points; p++) mean[p] = deviation[p] = 0;
  for (size_t turn = from; turn < to; turn++) {
    double count = (double)(turn - from + 1);
    for (size_t p = 0; p < points; p++) {
      double angle = (double)turn + (double)p / (double)points;
      double value = value_at(x, time_at(s, angle * s->per_turn, &i), &window);
      double step = value - mean[p]; /* running mean and squares */
      mean[p] += step / count;
      deviation[p] += step * (value - mean[p]);
    }
  }
  *turns = to - from;
  for (size_t p = 0; p < points; p++)
    deviation[p] = *turns > 1 ? sqrt(deviation[p] / (double)(*turns - 1)) : 0;
  return LBR_OK;
}
