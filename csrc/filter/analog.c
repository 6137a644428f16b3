#include "filter/analog.h"

#include <math.h>

#include "filter/bessel.h"
#include "filter/design.h"
#include "filter/elliptic.h"

#define MOST_W 1e70 /* rad/s; keeps w^4 finite */
#define LEAST_RIPPLE_DB 1e-6
#define MOST_DB 300.0

static bool positive(double x) { return isfinite(x) && x > 0.0; }

static bool order_ok(const lbr_filter *f) {
  return f->order >= 1 && f->order <= LBR_FILTER_MOST_ORDER;
}

static bool ripple_ok(const lbr_filter *f) {
  return f->ripple_db >= LEAST_RIPPLE_DB && f->ripple_db <= MOST_DB;
}

static bool points_ok(const lbr_filter *f) {
  if (f->points < 1 || f->points > LBR_FILTER_MOST_POINTS) return false;
  for (size_t i = 0; i < f->points; i++) {
    if (!positive(f->point_at[i]) || !isfinite(f->point_db[i])) return false;
    if (fabs(f->point_db[i]) > 2.0 * MOST_DB) return false;
    if (i > 0 && f->point_at[i] <= f->point_at[i - 1]) return false;
  }
  return true;
}

static bool fields_ok(const lbr_filter *f) {
  switch (f->shape) {
    case LBR_FILTER_NONE: return true;
    case LBR_FILTER_BUTTERWORTH:
    case LBR_FILTER_BESSEL: return order_ok(f) && positive(f->corner);
    case LBR_FILTER_CHEBYSHEV:
      return order_ok(f) && positive(f->corner) && ripple_ok(f);
    case LBR_FILTER_ELLIPTIC:
      return order_ok(f) && positive(f->corner) && ripple_ok(f) &&
             f->stop_db > f->ripple_db && f->stop_db <= MOST_DB;
    case LBR_FILTER_POINTS: return points_ok(f);
  }
  return false;
}

static lbr_status design(lbr_filter *f) {
  switch (f->shape) {
    case LBR_FILTER_BUTTERWORTH: return lbr_design_butterworth(f);
    case LBR_FILTER_CHEBYSHEV: return lbr_design_chebyshev(f);
    case LBR_FILTER_BESSEL: return lbr_design_bessel(f);
    case LBR_FILTER_ELLIPTIC: return lbr_design_elliptic(f);
    case LBR_FILTER_NONE:
    case LBR_FILTER_POINTS: break;
  }
  f->poles = f->zeros = 0;
  return LBR_OK;
}

static double square(double x) { return x * x; }

/* Poles and zeros as factors of the power gain, and the overall scale. */
static void make_factors(lbr_filter *f) {
  f->pairs = f->poles / 2;
  f->drag = f->poles % 2 ? square(creal(f->pole[f->poles - 1])) : 0.0;
  bool dips = (f->shape == LBR_FILTER_CHEBYSHEV ||
               f->shape == LBR_FILTER_ELLIPTIC) && f->order % 2 == 0;
  f->start = dips ? f->floor : 1.0;
  f->scale = f->start * (f->drag > 0.0 ? sqrt(f->drag) : 1.0);
  for (size_t i = 0; i < f->pairs; i++) {
    double re = creal(f->pole[2 * i]), im = cimag(f->pole[2 * i]);
    f->stiff[i] = re * re + im * im;
    f->damp[i] = 4.0 * re * re;
    f->null[i] = f->zeros ? square(cimag(f->zero[2 * i])) : 1.0;
    f->top[i] = f->zeros ? f->stiff[i] / f->null[i] : f->stiff[i];
    f->scale *= f->top[i];
  }
}

double lbr_filter_corner(const lbr_filter *f, double rate) {
  double corner = f->shape == LBR_FILTER_POINTS ? f->point_at[0] : f->corner;
  return f->corner_of_rate ? corner * rate : corner;
}

/* hz in corners; of a table in the unit of its first column. */
static double scaled(const lbr_filter *f, double hz, double rate) {
  if (f->corner_of_rate) hz /= rate;
  return f->shape == LBR_FILTER_POINTS ? hz : hz / f->corner;
}

static double unscaled(const lbr_filter *f, double w, double rate) {
  if (f->shape != LBR_FILTER_POINTS) w *= f->corner;
  return f->corner_of_rate ? w * rate : w;
}

static double power(double x, int n) {
  double product = n & 1 ? x : 1.0;
  while (n >>= 1) {
    x *= x;
    if (n & 1) product *= x;
  }
  return product;
}

/* T_n(w), doubling the order bit by bit: T_2k = 2 T_k^2 - 1,
 * T_2k+1 = 2 T_k T_k+1 - w. */
static double chebyshev(int n, double w) {
  double t = 1.0, next = w; /* T_k and T_k+1, k = the leading bits of n */
  int bit = 1;
  while (bit <= n >> 1) bit <<= 1;
  for (; bit; bit >>= 1) {
    double between = 2.0 * t * next - w;
    if (n & bit) {
      t = between;
      next = 2.0 * next * next - 1.0;
    } else {
      next = between;
      t = 2.0 * t * t - 1.0;
    }
  }
  return t;
}

static double product_gain(const lbr_filter *f, double w) {
  double w2 = w < MOST_W ? w * w : MOST_W * MOST_W;
  double gain2 = f->drag > 0.0 ? f->drag / (f->drag + w2) : 1.0;
  for (size_t i = 0; i < f->pairs; i++) {
    double above = f->zeros ? f->top[i] * (f->null[i] - w2) : f->top[i];
    gain2 *= above * above / (square(f->stiff[i] - w2) + f->damp[i] * w2);
  }
  return f->start * sqrt(gain2);
}

/* Double precision carries the design only while the transition is not too
 * narrow: the edge must come out where it was asked for. */
static bool came_out(const lbr_filter *f) {
  return f->shape != LBR_FILTER_ELLIPTIC ||
         fabs(product_gain(f, 1.0) - f->floor) < 1e-9 * f->floor;
}

lbr_status lbr_filter_prepare(lbr_filter *filter) {
  if (!fields_ok(filter)) return LBR_DOMAIN;
  lbr_status status = design(filter);
  if (status != LBR_OK) return status;
  make_factors(filter);
  return came_out(filter) ? LBR_OK : LBR_NO_CONVERGE;
}

static double decibels(const lbr_filter *f, double at) {
  size_t low = 0, high = f->points - 1;
  if (at <= f->point_at[0]) return f->point_db[0];
  if (at >= f->point_at[high]) return f->point_db[high];
  while (high - low > 1) {
    size_t middle = (low + high) / 2;
    if (f->point_at[middle] <= at)
      low = middle;
    else
      high = middle;
  }
  double share = log(at / f->point_at[low]) /
                 log(f->point_at[high] / f->point_at[low]);
  return f->point_db[low] + share * (f->point_db[high] - f->point_db[low]);
}

/* The gain at w in the units of scaled(). */
static double gain_at(const lbr_filter *f, double w) {
  switch (f->shape) {
    case LBR_FILTER_NONE: return 1.0;
    case LBR_FILTER_BUTTERWORTH: {
      double rise = power(w, f->order);
      return 1.0 / sqrt(1.0 + rise * rise);
    }
    case LBR_FILTER_CHEBYSHEV: {
      double rise = f->ripple * chebyshev(f->order, fmin(w, MOST_W));
      return isfinite(rise) ? 1.0 / sqrt(1.0 + rise * rise) : 0.0;
    }
    case LBR_FILTER_BESSEL:
    case LBR_FILTER_ELLIPTIC: return product_gain(f, w);
    case LBR_FILTER_POINTS: return pow(10.0, decibels(f, w) / 20.0);
  }
  return 1.0;
}

double lbr_filter_gain(const lbr_filter *filter, double hz, double rate) {
  return gain_at(filter, scaled(filter, hz, rate));
}

double complex lbr_filter_response(const lbr_filter *filter, double hz,
                                   double rate) {
  if (filter->poles == 0) return lbr_filter_gain(filter, hz, rate);
  double complex s = CMPLX(0.0, fmin(scaled(filter, hz, rate), MOST_W));
  double complex product = filter->start;
  for (size_t i = 0; i < filter->zeros; i++)
    product *= (s - filter->zero[i]) / -filter->zero[i];
  for (size_t i = 0; i < filter->poles; i++)
    product *= -filter->pole[i] / (s - filter->pole[i]);
  return product;
}

/* An interval of gain that grows as values are found to lie in it. */
typedef struct extent {
  double low, high;
} extent;

static void include(extent *e, double value) {
  e->low = fmin(e->low, value);
  e->high = fmax(e->high, value);
}

/* Whether [w1, w2] holds w; a turning point that is only just outside counts
 * as inside, where its neighbourhood is too flat or too small to compute. */
static bool holds(double w1, double w2, double w) {
  return w1 <= w * (1.0 + 1e-9) && w * (1.0 - 1e-9) <= w2;
}

static void include_turns(const lbr_filter *f, double w1, double w2,
                          extent *e) {
  for (int m = 0; m <= f->order; m++) {
    double w = f->turn[m];
    if (holds(w1, w2, w)) include(e, m % 2 ? 1.0 : f->floor);
    if (f->shape == LBR_FILTER_ELLIPTIC && w > 0.0 &&
        holds(w1, w2, 1.0 / (f->selectivity * w)))
      include(e, m % 2 ? 0.0 : f->ceiling);
  }
}

static void include_points(const lbr_filter *f, double w1, double w2,
                           extent *e) {
  for (size_t i = 0; i < f->points; i++)
    if (holds(w1, w2, f->point_at[i]))
      include(e, pow(10.0, f->point_db[i] / 20.0));
}

/* Between turning points every shape is monotone, so the ends and the turning
 * points inside are all there is; the margins are for rounding. */
void lbr_filter_range(const lbr_filter *f, double hz1, double hz2,
                      double rate, double *low, double *high) {
  double w1 = scaled(f, fmin(hz1, hz2), rate);
  double w2 = scaled(f, fmax(hz1, hz2), rate);
  extent e = {INFINITY, -INFINITY};
  if (f->shape == LBR_FILTER_NONE) {
    *low = *high = 1.0;
    return;
  }
  include(&e, gain_at(f, w1));
  include(&e, gain_at(f, w2));
  if (f->shape == LBR_FILTER_CHEBYSHEV || f->shape == LBR_FILTER_ELLIPTIC)
    include_turns(f, w1, w2, &e);
  if (f->shape == LBR_FILTER_POINTS) include_points(f, w1, w2, &e);
  double slack = f->shape == LBR_FILTER_ELLIPTIC ? 1e-14 : 0.0;
  *low = fmax(e.low * (1.0 - 1e-12) - slack, 0.0);
  *high = e.high * (1.0 + 1e-12) + slack;
}

/* The w of a falling stretch [from, to] (to may be INFINITY) where the gain
 * comes down to the level. */
static double crossing(const lbr_filter *f, double from, double to,
                       double level) {
  double low = from, high = to;
  if (isinf(to))
    for (high = 2.0 * fmax(from, 1.0); gain_at(f, high) > level; high *= 2.0)
      if (high > MOST_W) return INFINITY;
  for (int i = 0; i < 100 && low < high; i++) {
    double middle = 0.5 * (low + high);
    if (gain_at(f, middle) > level)
      low = middle;
    else
      high = middle;
  }
  return high;
}

static double edge_chebyshev(const lbr_filter *f, double level) {
  double y = sqrt((1.0 / level - 1.0) * (1.0 / level + 1.0)) / f->ripple;
  return y < 1.0 ? cos(acos(y) / f->order) : cosh(acosh(y) / f->order);
}

static double edge_elliptic(const lbr_filter *f, double level) {
  if (level >= f->ceiling * (1.0 - 1e-12)) {
    double stop = 1.0 / f->selectivity;
    return f->order == 1 ? crossing(f, f->turn[1], INFINITY, level)
                         : crossing(f, f->turn[1], stop, level);
  }
  if (f->order % 2 == 0) return INFINITY;
  return crossing(f, 1.0 / (f->selectivity * f->turn[f->order - 1]), INFINITY,
                  level);
}

static double edge_points(const lbr_filter *f, double level) {
  double db = 20.0 * log10(level);
  size_t last = f->points - 1;
  if (f->point_db[last] > db + 1e-12) return INFINITY;
  for (size_t i = last; i-- > 0;) {
    if (f->point_db[i] <= db + 1e-12) continue;
    double share =
        (f->point_db[i] - db) / (f->point_db[i] - f->point_db[i + 1]);
    return f->point_at[i] *
           pow(f->point_at[i + 1] / f->point_at[i], fmin(share, 1.0));
  }
  return 0.0;
}

static double edge_at(const lbr_filter *f, double level) {
  switch (f->shape) {
    case LBR_FILTER_BUTTERWORTH:
      return pow((1.0 / level - 1.0) * (1.0 / level + 1.0),
                 0.5 / f->order);
    case LBR_FILTER_CHEBYSHEV: return edge_chebyshev(f, level);
    case LBR_FILTER_BESSEL: return crossing(f, 0.0, INFINITY, level);
    case LBR_FILTER_ELLIPTIC: return edge_elliptic(f, level);
    case LBR_FILTER_POINTS: return edge_points(f, level);
    case LBR_FILTER_NONE: break;
  }
  return INFINITY;
}

double lbr_filter_edge(const lbr_filter *filter, double level, double rate) {
  bool table = filter->shape == LBR_FILTER_POINTS;
  if (!(level > 0.0)) return INFINITY;
  if (!table && level >= 1.0) return 0.0;
  return unscaled(filter, edge_at(filter, level), rate) * (1.0 + 1e-12);
}
