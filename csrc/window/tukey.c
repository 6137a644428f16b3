/* A flat middle with cosine tapers (Harris 1978, after Tukey): the parameter is
 * the tapered share of the length.
 *
 * With m samples in each taper the window is a run of ones between two tapers
 * 1/2 - cos(theta n) / 2, theta = 2 pi / (share N), so that its transform is a
 * sum of four runs of exponentials, each sin(pi L y / N) / sin(pi y / N). */
#include <math.h>

#include "window/closed.h"
#include "window/families.h"
#include "window/jet.h"
#include "window/series.h"

static size_t taper(double share, size_t n) {
  return (size_t)ceil(share * (double)n / 2 - 1e-12 * (double)n);
}

static lbr_status fill(const lbr_window *window, double *out, size_t n) {
  double share = window->parameter, count = (double)n;
  size_t m = taper(share, n);
  for (size_t i = 0; i <= n / 2; i++) {
    double s = sin(LBR_PI * (double)i / (share * count));
    out[i] = i < m ? s * s : 1;
    if (i > 0) out[n - i] = out[i];
  }
  return LBR_OK;
}

/* sin(z) / z and its derivatives by z */
static void sinc(double z, double out[3]) {
  if (fabs(z) > 1) {
    out[0] = sin(z) / z;
    out[1] = (cos(z) - out[0]) / z;
    out[2] = -out[0] - 2 * out[1] / z;
    return;
  }
  double term = 1, power = 1; /* (-1)^k / (2 k + 1)!, z^(2 k - 2) */
  out[0] = 1;
  out[1] = out[2] = 0;
  for (int k = 1; k < 12; k++) {
    double twice = 2 * k;
    term /= -twice * (twice + 1);
    out[0] += term * power * z * z;
    out[1] += twice * term * power * z;
    out[2] += twice * (twice - 1) * term * power;
    power *= z * z;
  }
}

/* sum of exp(2 pi i y n / N) over a run of L samples about 0, over N; length
 * is L / N. */
static lbr_jet run(double y, double length, size_t n) {
  double top[3], low[3], scale = LBR_PI * length;
  sinc(scale * y, top);
  lbr_jet a = {length * top[0], length * scale * top[1],
               length * scale * scale * top[2]};
  if (n == 0) return a;
  double thin = LBR_PI / (double)n;
  sinc(thin * y, low);
  return lbr_jet_over(a, (lbr_jet){low[0], thin * low[1],
                                   thin * thin * low[2]});
}

/* The geometry of one length. */
typedef struct plan {
  double flat, side; /* samples of the middle and of a taper, over N */
  double centre;     /* middle of the left taper, u */
  double shift;      /* 1 / share, in bins, reduced to N */
  double phase;      /* theta times the middle of the taper */
  int flips;         /* a turn of N bins changes the sign of a taper's run */
  double sum;        /* mean of the window */
} plan;

static plan plan_of(const lbr_window *window, size_t n) {
  plan p;
  double share = window->parameter, count = (double)n;
  p.shift = 1 / share;
  p.flips = 0;
  if (n == 0) {
    p.flat = 1 - share;
    p.side = share / 2;
    p.centre = share / 4 - 0.5;
    p.phase = LBR_PI / 2;
    p.sum = 1 - share / 2;
    return p;
  }
  size_t m = taper(share, n);
  double middle = ((double)m - 1) / 2;
  p.shift = remainder(p.shift, count);
  p.flat = (count - 2 * (double)m + 1) / count;
  p.side = (double)m / count;
  p.centre = middle / count - 0.5;
  p.phase = 2 * LBR_PI * p.shift * middle / count;
  p.flips = m % 2 == 0;
  double sums = run(p.shift, p.side, n).v;
  p.sum = p.flat + p.side - sums * cos(p.phase);
  return p;
}

/* One run of a taper: exponent y = x + side * shift, phases about its
 * middle. */
static lbr_jet taper_run(const plan *p, size_t n, double x, int side) {
  double y = x + side * p->shift, sign = 1, count = (double)n;
  if (n && y > count / 2) {
    y -= count;
    if (p->flips) sign = -1;
  }
  double rate = 2 * LBR_PI * p->centre;
  double angle = rate * x + side * p->phase;
  lbr_jet turn = {sign * cos(angle), -sign * rate * sin(angle),
                  -sign * rate * rate * cos(angle)};
  return lbr_jet_times(run(y, p->side, n), turn);
}

static void jet(const lbr_window *window, size_t n, double x, double out[3]) {
  plan p = plan_of(window, n);
  lbr_jet sum = run(x, p.flat, n);
  lbr_jet_add(&sum, 1, taper_run(&p, n, x, 0));
  lbr_jet_add(&sum, -0.5, taper_run(&p, n, x, 1));
  lbr_jet_add(&sum, -0.5, taper_run(&p, n, x, -1));
  out[0] = sum.v / p.sum;
  out[1] = sum.d / p.sum;
  out[2] = sum.dd / p.sum;
}

static double edge(const lbr_window *window, size_t n) {
  (void)window;
  (void)n;
  return 0; /* the tapers start at 0 */
}

/* Summing by parts k times leaves the variation of the k-th difference over
 * (2 sin)^k: 2, 2 theta and 4 theta^2 for k = 1, 2, 3.  R' is the transform of
 * 2 pi u w, whose first difference varies by no more than twice pi. */
static void beyond(const lbr_window *window, size_t n, double x, double *value,
                   double *slope) {
  double sum = 1 - window->parameter / 2;
  double chord = n ? 2 * (double)n * sin(LBR_PI * x / (double)n)
                   : 2 * LBR_PI * x;
  double theta = 2 * LBR_PI / window->parameter;
  double first = 2 / chord, second = first * theta / chord;
  double third = 2 * second * theta / chord;
  if (n) sum -= 1 / (double)n;
  *value = fmin(first, fmin(second, third)) / sum;
  *slope = 2 * LBR_PI * 2 / chord / sum;
}

/* sum of cos(step * i) over i < m */
static double cosines(double step, double m) {
  double half = sin(step / 2);
  if (fabs(half) < 1e-300) return m;
  return sin(m * step / 2) / half * cos((m - 1) * step / 2);
}

static double bandwidth(const lbr_window *window, size_t n) {
  double share = window->parameter;
  if (n == 0) return (1 - share * 5 / 8) / pow(1 - share / 2, 2);
  plan p = plan_of(window, n);
  double m = p.side * (double)n, step = 2 * LBR_PI * p.shift / (double)n;
  double squares = 0.375 * m - 0.5 * cosines(step, m) +
                   0.125 * cosines(2 * step, m);
  return (p.flat + 2 * squares / (double)n) / (p.sum * p.sum);
}

static const lbr_closed closed = {1, jet, edge, beyond, bandwidth};

const lbr_window_shape lbr_tukey_shape = {
    "tukey", "Tapered cosine (Tukey)", "Harris 1978, Table I",
    0, {0}, "share", 0.001, 1, 0.5, fill, NULL, &closed};
