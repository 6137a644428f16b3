#include "reading/leak.h"

#include <math.h>

#define PIECES 12          /* most pieces a driver's interval is cut into */
#define GAIN 0.995         /* a cut that lowers the bound by less is the last */
#define PROBES 7           /* deviations tried for a sum that is reached */
#define WIDE 64.0          /* enclosures wider than this cost no more, bins */
#define PER_ASKED 4.0      /* bins that cost as much as a narrow enclosure */

typedef struct span {
  double low, high;
} span;

static const lbr_source *source(const lbr_leak *l, size_t j) {
  return &l->c->scene->sources[j];
}

/* Where source j stands when its driver deviates by [d1, d2]. */
static span place(const lbr_leak *l, size_t j, double d1, double d2) {
  const lbr_source *s = source(l, j);
  return (span){s->hz + s->lock_hz * d1 - s->free_hz,
                s->hz + s->lock_hz * d2 + s->free_hz};
}

/* As a record sees it whose time base is off by up to `timebase`: frequencies
 * over 1 + t, |t| <= timebase, of which 1 / (1 - timebase) is the farthest. */
static span widen(span s, double timebase) {
  double relative = timebase / (1 - timebase);
  return (span){s.low - fabs(s.low) * relative,
                s.high + fabs(s.high) * relative};
}

lbr_leak lbr_leak_of_case(const lbr_case *c, size_t line, double steer,
                          size_t *asked) {
  double t = (double)c->n / c->path->rate;
  lbr_leak l = {.c = c, .line = line, .duration = t, .asked = asked};
  l.steer = c->reading == LBR_READING_BIN ? 0 : steer;
  l.read_hz = rint(c->scene->sources[line].hz * t) / t;
  lbr_bound_search(c, line, &l.from_hz, &l.to_hz);
  return l;
}

/* The part of a span of distances, Hz, that lies within steering of a line
 * and within the interval that is searched, in bins. */
static span steered(const lbr_leak *l, span to, span other, double sign) {
  double t = l->duration;
  double low = sign > 0 ? other.low - l->to_hz : other.low + l->from_hz;
  double high = sign > 0 ? other.high - l->from_hz : other.high + l->to_hz;
  span x = {fmax(to.low * t - l->steer, low * t),
            fmin(to.high * t + l->steer, high * t)};
  if (x.low > x.high) x.low = x.high = (x.low + x.high) / 2; /* rounding */
  return x;
}

/* Distance (sign = 1: f_j - f, sign = -1: f_j + f) to the place where the
 * line is read, in bins. */
static span distance(const lbr_leak *l, size_t j, double e1, double e2,
                     double d1, double d2, bool locked, double sign) {
  double timebase = l->c->front->timebase, t = l->duration;
  span other = widen(place(l, j, d1, d2), timebase), to;
  if (l->c->reading == LBR_READING_BIN)
    return (span){(other.low - sign * l->read_hz) * t,
                  (other.high - sign * l->read_hz) * t};
  if (locked) {
    const lbr_source *a = source(l, l->line), *b = source(l, j);
    double lock = b->lock_hz - sign * a->lock_hz;
    double free = a->free_hz + b->free_hz, hz = b->hz - sign * a->hz;
    to = (span){hz + fmin(lock * e1, lock * e2) - free,
                hz + fmax(lock * e1, lock * e2) + free};
  } else {
    span own = place(l, l->line, e1, e2), at = place(l, j, d1, d2);
    to = sign > 0 ? (span){at.low - own.high, at.high - own.low}
                  : (span){at.low + own.low, at.high + own.high};
  }
  return steered(l, widen(to, timebase), other, sign);
}

void lbr_leak_wander(const lbr_leak *l, size_t j, lbr_wander *out) {
  double top = lbr_seen_high(l->c->scene, l->c->front, j);
  lbr_wander_of_index(source(l, j)->wander * top * l->duration / 2, out);
}

static double most(const lbr_leak *l, span x) {
  double low, high, width = fmin(x.high - x.low, WIDE);
  *l->asked += 1 + (size_t)(width / PER_ASKED);
  lbr_kernel_range(l->c->kernel, x.low, x.high, &low, &high);
  return high;
}

/* Sum over the sidebands; a wander too wide for the list counts whole. */
static double spread_most(const lbr_leak *l, size_t j, span x) {
  if (source(l, j)->wander <= 0) return most(l, x);
  lbr_wander wander;
  double weight[LBR_SIDEBANDS];
  lbr_leak_wander(l, j, &wander);
  if (!wander.whole) return lbr_kernel_absolute(l->c->kernel);
  weight[0] = most(l, x);
  for (size_t k = 1; k < wander.count; k++) {
    double shift = (double)k;
    weight[k] = most(l, (span){x.low - shift, x.high - shift}) +
                most(l, (span){x.low + shift, x.high + shift});
  }
  return lbr_wander_sum(&wander, weight);
}

double lbr_leak_spread(const lbr_leak *l, size_t j, double from, double to) {
  return spread_most(l, j, (span){from, to});
}

double lbr_leak_gain(const lbr_leak *l, size_t j, double e1, double e2,
                     double d1, double d2, bool locked) {
  return spread_most(l, j, distance(l, j, e1, e2, d1, d2, locked, 1)) +
         spread_most(l, j, distance(l, j, e1, e2, d1, d2, locked, -1));
}

/* Amplitude of source j behind the filter, as the line's reading scales it. */
static double weight(const lbr_leak *l, size_t j) {
  const lbr_path *path = l->c->path;
  return source(l, j)->most * path->high[j] / path->nominal[l->line];
}

static double spread_of(const lbr_leak *l, size_t driver) {
  return l->c->scene->spread[driver];
}

double lbr_leak_of(const lbr_leak *l, size_t j) {
  double e = spread_of(l, source(l, l->line)->driver);
  double d = spread_of(l, source(l, j)->driver);
  return weight(l, j) * lbr_leak_gain(l, j, -e, e, -d, d, false);
}

double lbr_leak_crude(const lbr_leak *l) {
  double sum = 0;
  for (size_t j = 0; j < l->c->scene->n_sources; j++)
    if (j != l->line) sum += lbr_leak_of(l, j);
  return sum;
}

double lbr_leak_plain(const lbr_leak *l, double high) {
  size_t own = source(l, l->line)->driver;
  double e = spread_of(l, own), sum = 0;
  for (size_t j = 0; j < l->c->scene->n_sources && sum <= high; j++) {
    if (j == l->line) continue;
    size_t driver = source(l, j)->driver;
    double d = spread_of(l, driver);
    sum += weight(l, j) * lbr_leak_gain(l, j, -e, e, -d, d, driver == own);
  }
  return sum;
}

/* All sources of one driver, the line's driver in [e1, e2]. */
static double group(const lbr_leak *l, size_t driver, double e1, double e2,
                    double d1, double d2) {
  bool locked = driver == source(l, l->line)->driver;
  double sum = 0;
  for (size_t j = 0; j < l->c->scene->n_sources; j++)
    if (j != l->line && source(l, j)->driver == driver)
      sum += weight(l, j) * lbr_leak_gain(l, j, e1, e2, d1, d2, locked);
  return sum;
}

static bool more_than_one(const lbr_leak *l, size_t driver) {
  size_t count = 0;
  for (size_t j = 0; j < l->c->scene->n_sources; j++)
    count += j != l->line && source(l, j)->driver == driver;
  return count > 1;
}

/* An interval of a driver with the bounds known there. */
typedef struct piece {
  double a, b;   /* deviation */
  double upper;  /* upper bound on the piece */
  double lower;  /* value reached at its middle */
} piece;

typedef struct sweep {
  const lbr_leak *leak;
  size_t driver; /* whose pieces these are */
  double e1, e2; /* the line's driver (when it is another) */
  double slack;
  bool outer;    /* the line's own driver, all groups inside */
} sweep;

static piece judge(const sweep *s, double a, double b);

static double widest(const piece *pieces, size_t count, size_t *at) {
  *at = 0;
  for (size_t i = 1; i < count; i++)
    if (pieces[i].upper > pieces[*at].upper) *at = i;
  return pieces[*at].upper;
}

/* Cuts the piece with the largest upper bound until the bound is tight or
 * the question is settled. */
static piece refine(const sweep *s, double low, double high) {
  double spread = spread_of(s->leak, s->driver);
  piece pieces[PIECES];
  size_t count = 1, at;
  pieces[0] = judge(s, -spread, spread);
  double lower = pieces[0].lower, before = INFINITY;
  for (;;) {
    double upper = widest(pieces, count, &at);
    bool settled = upper <= low || lower > high ||
                   upper <= lower + s->slack;
    if (count % 4 == 0) {
      settled = settled || upper > GAIN * before;
      before = upper;
    }
    if (settled || spread <= 0 || count == PIECES)
      return (piece){pieces[at].a, pieces[at].b, upper, lower};
    piece cut = pieces[at];
    double middle = (cut.a + cut.b) / 2;
    pieces[at] = judge(s, cut.a, middle);
    pieces[count] = judge(s, middle, cut.b);
    lower = fmax(lower, fmax(pieces[at].lower, pieces[count].lower));
    count++;
  }
}

/* One group, its driver in [a, b] (or the line's driver, when locked). */
static piece judge_group(const sweep *s, double a, double b) {
  double middle = (a + b) / 2, e = (s->e1 + s->e2) / 2;
  return (piece){a, b, group(s->leak, s->driver, s->e1, s->e2, a, b),
                 group(s->leak, s->driver, e, e, middle, middle)};
}

/* Everything, the line's driver in [a, b]. */
static piece judge_all(const sweep *s, double a, double b) {
  const lbr_leak *l = s->leak;
  double middle = (a + b) / 2;
  piece sum = {a, b, group(l, s->driver, a, b, a, b),
               group(l, s->driver, middle, middle, middle, middle)};
  for (size_t d = 0; d < l->c->scene->n_drivers; d++) {
    if (d == s->driver) continue;
    double spread = spread_of(l, d);
    sweep inner = {l, d, a, b, s->slack, false};
    piece found = more_than_one(l, d) ? refine(&inner, 0, INFINITY)
                                      : judge_group(&inner, -spread, spread);
    sum.upper += found.upper;
    sum.lower += found.lower;
  }
  return sum;
}

static piece judge(const sweep *s, double a, double b) {
  return s->outer ? judge_all(s, a, b) : judge_group(s, a, b);
}

double lbr_leak_joint(const lbr_leak *l, double low, double high,
                      double slack) {
  sweep s = {l, source(l, l->line)->driver, 0, 0, slack, true};
  return refine(&s, low, high).upper;
}

double lbr_leak_nominal(const lbr_leak *l, double high) {
  bool bin = l->c->reading == LBR_READING_BIN;
  double own = bin ? l->read_hz : source(l, l->line)->hz, sum = 0;
  for (size_t j = 0; j < l->c->scene->n_sources && sum <= high; j++) {
    if (j == l->line || source(l, j)->wander > 0) continue;
    double hz = source(l, j)->hz;
    sum += weight(l, j) *
           (lbr_kernel_gain(l->c->kernel, (hz - own) * l->duration) +
            lbr_kernel_gain(l->c->kernel, (hz + own) * l->duration));
  }
  return sum;
}

/* The most that one driver's sources reach together, the line nominal. */
static double group_reached(const lbr_leak *l, size_t driver) {
  double spread = spread_of(l, driver), most_sum = 0;
  if (driver == source(l, l->line)->driver)
    return group(l, driver, 0, 0, 0, 0);
  if (!more_than_one(l, driver))
    return group(l, driver, 0, 0, -spread, spread);
  int probes = spread > 0 ? PROBES : 1;
  for (int k = 0; k < probes; k++) {
    double d = probes > 1 ? spread * (2.0 * k / (probes - 1) - 1) : 0;
    most_sum = fmax(most_sum, group(l, driver, 0, 0, d, d));
  }
  return most_sum;
}

double lbr_leak_reached(const lbr_leak *l, double high) {
  double sum = 0;
  for (size_t d = 0; d < l->c->scene->n_drivers && sum <= high; d++)
    sum += group_reached(l, d);
  return sum;
}

static double slope_most(const lbr_leak *l, size_t j, span x) {
  lbr_wander wander;
  double weight[LBR_SIDEBANDS];
  lbr_leak_wander(l, j, &wander);
  if (!wander.whole) return INFINITY;
  weight[0] = lbr_kernel_slope(l->c->kernel, x.low, x.high);
  for (size_t k = 1; k < wander.count; k++) {
    double shift = (double)k;
    weight[k] =
        lbr_kernel_slope(l->c->kernel, x.low - shift, x.high - shift) +
        lbr_kernel_slope(l->c->kernel, x.low + shift, x.high + shift);
  }
  return lbr_wander_sum(&wander, weight);
}

double lbr_leak_spread_slope(const lbr_leak *l, size_t j, double from,
                             double to) {
  return slope_most(l, j, (span){from, to});
}

double lbr_leak_slope(const lbr_leak *l) {
  const lbr_source *own = source(l, l->line);
  double e = spread_of(l, own->driver), sum = 0;
  for (size_t j = 0; j < l->c->scene->n_sources; j++) {
    if (j == l->line) continue;
    double d = spread_of(l, source(l, j)->driver);
    bool locked = source(l, j)->driver == own->driver;
    sum += weight(l, j) *
           (slope_most(l, j, distance(l, j, -e, e, -d, d, locked, 1)) +
            slope_most(l, j, distance(l, j, -e, e, -d, d, locked, -1)));
  }
  return sum;
}
