#include "window/series.h"

#include <math.h>
#include <string.h>

double lbr_sin_pi(double x) {
  double whole = round(x), r = sin(LBR_PI * (x - whole));
  return fmod(whole, 2) != 0 ? -r : r;
}

double lbr_cos_pi(double x) {
  double whole = round(x), d = x - whole;
  double r = fabs(d) == 0.5 ? 0 : cos(LBR_PI * d);
  return fmod(whole, 2) != 0 ? -r : r;
}

/* sin(pi y) cot(pi y / N) / N, the sum over one record of exp(2 pi i y u)
 * with halved ends; 1 at y = 0. */
static double dirichlet(double y, size_t n) {
  if (n == 0) return y == 0 ? 1 : lbr_sin_pi(y) / (LBR_PI * y);
  double turns = round(y / (double)n), d = y - turns * (double)n;
  double sign = (n % 2) && fmod(turns, 2) != 0 ? -1 : 1;
  if (d == 0) return sign;
  return sign * lbr_sin_pi(d) / (tan(LBR_PI * d / (double)n) * (double)n);
}

/* Cosines beyond N / 2 are the same samples as ones below it. */
static size_t folded(size_t k, size_t n, double *sign) {
  *sign = 1;
  if (n == 0) return k;
  size_t turns = k / n;
  k %= n;
  if (2 * k > n) {
    k = n - k;
    turns++;
  }
  if ((n % 2) && (turns % 2)) *sign = -1;
  return k;
}

static void fold_whole(lbr_series *s) {
  lbr_poles *p = &s->whole;
  memset(p->term, 0, sizeof p->term);
  p->count = 0;
  for (size_t k = 0; k < p->terms; k++) {
    double sign;
    size_t to = folded(k, s->n, &sign);
    p->term[to] += sign * p->shape[k];
    if (to >= p->count) p->count = to + 1;
  }
}

static void place(lbr_poles *p, double offset, const lbr_series *s) {
  for (size_t k = 0; k < p->count; k++) {
    double shift = (double)k + offset, b = s->n ? shift / s->m : 0;
    double sine = sin(b), cosine = cos(b);
    p->at[k] = s->n ? s->m * s->m * sine * sine : shift * shift;
    p->rest[k] = s->n ? s->m * s->m * cosine * cosine : 0;
    double sign = k % 2 ? -1 : 1;
    if (offset == 0)
      p->residue[k] = sign * p->term[k];
    else
      p->residue[k] = -sign * p->term[k] *
                      (s->n ? s->m * sine * cosine : shift);
  }
}

lbr_status lbr_series_resize(lbr_series *s, size_t n) {
  s->n = n;
  s->m = (double)n / LBR_PI;
  s->half.count = s->half.terms;
  if (n && n < 2 * s->half.count) return LBR_DOMAIN;
  fold_whole(s);
  memcpy(s->half.term, s->half.shape, sizeof s->half.term);
  double edge = 0;
  s->sum = s->whole.term[0];
  for (size_t j = 0; j < s->half.count; j++)
    s->sum += s->half.term[j] * dirichlet((double)j + 0.5, n);
  if (!(s->sum > 0)) return LBR_DOMAIN;
  for (size_t k = 0; k < s->whole.count; k++) {
    edge += k % 2 ? -s->whole.term[k] : s->whole.term[k];
    s->whole.term[k] /= s->sum;
  }
  for (size_t j = 0; j < s->half.count; j++) s->half.term[j] /= s->sum;
  s->edge = n ? edge / (s->sum * (double)n) : 0;
  place(&s->whole, 0, s);
  place(&s->half, 0.5, s);
  return LBR_OK;
}

void lbr_series_from_samples(lbr_series *s, const double *w, size_t n) {
  s->half.terms = 0;
  s->whole.terms = n / 2 + 1;
  for (size_t k = 0; k <= n / 2; k++) {
    double sum = 0;
    for (size_t i = 0; i < n; i++)
      sum += w[i] * cos(2 * LBR_PI * (double)(k * i % n) / (double)n);
    double twice = k == 0 || 2 * k == n ? 1 : 2;
    s->whole.shape[k] = (k % 2 ? -1 : 1) * twice * sum / (double)n;
  }
}

/* Where a point lies: the variables of the closed form. */
typedef struct place_of {
  double y, value; /* y and S (or M^2 - S beyond the middle) */
  int beyond;      /* a > pi / 4: differences are taken from the far side */
  double dy, ddy;  /* y' and y'' */
} place_of;

static inline place_of locate(const lbr_series *s, double x) {
  if (s->n == 0) return (place_of){x, x * x, 0, 1, 0};
  double a = x / s->m, sine = sin(a), cosine = cos(a);
  double square = s->m * sine, other = s->m * cosine;
  double y = square * cosine;
  int beyond = sine > cosine;
  return (place_of){y, beyond ? other * other : square * square, beyond,
                    cosine * cosine - sine * sine, -4 * y / (s->m * s->m)};
}

/* sum of residue / (S - S_k), and with orders its derivatives by S, leaving
 * out pole number `skip`. */
static inline void sums(const lbr_poles *p, const place_of *at, size_t skip,
                        double h[3]) {
  double h0 = 0, h1 = 0, h2 = 0;
  const double *from = at->beyond ? p->rest : p->at;
  double sign = at->beyond ? -1 : 1;
  for (size_t k = 0; k < p->count; k++) {
    if (k == skip) continue;
    double r = sign / (at->value - from[k]), t = p->residue[k] * r;
    h0 += t;
    h1 += t * r;
    h2 += t * r * r;
  }
  h[0] = h0;
  h[1] = -h1;
  h[2] = 2 * h2;
}

#define NONE ((size_t)-1)

/* The pole nearest to x within 1/8 bin: its number in its kind. */
static void nearest_pole(const lbr_series *s, double x, size_t *whole,
                         size_t *half) {
  double q = round(2 * x);
  size_t i = (size_t)q;
  *whole = *half = NONE;
  if (fabs(2 * x - q) >= 0.25) return;
  if (i % 2 == 0 && i / 2 < s->whole.count) *whole = i / 2;
  if (i % 2 == 1 && i / 2 < s->half.count) *half = i / 2;
}

double lbr_series_real(const lbr_series *s, double x) {
  size_t whole, half;
  double h[3], sum = 0;
  nearest_pole(s, x, &whole, &half);
  if (whole != NONE)
    sum += s->whole.term[whole] / 2 * (dirichlet(x - (double)whole, s->n) +
                                       dirichlet(x + (double)whole, s->n));
  if (half != NONE)
    sum += s->half.term[half] / 2 *
           (dirichlet(x - (double)half - 0.5, s->n) +
            dirichlet(x + (double)half + 0.5, s->n));
  place_of at = locate(s, x);
  sums(&s->whole, &at, whole, h);
  sum += lbr_sin_pi(x) * at.y * h[0] / LBR_PI;
  if (s->half.count) {
    sums(&s->half, &at, half, h);
    sum += lbr_cos_pi(x) * h[0] / LBR_PI;
  }
  return sum;
}

/* sin(pi j / 16), j = 0 .. 8 */
static const double quarter[9] = {
    0,
    0.19509032201612826785,
    0.38268343236508977173,
    0.55557023301960222474,
    0.70710678118654752440,
    0.83146961230254523708,
    0.92387953251128675613,
    0.98078528040323044913,
    1};

double lbr_grid_sin(size_t j) {
  j %= 2 * LBR_GRID;
  double sign = j >= LBR_GRID ? -1 : 1;
  j %= LBR_GRID;
  return sign * quarter[j <= 8 ? j : LBR_GRID - j];
}

/* What the pair of shifts +s and -s adds at x = s, where its pole is. */
static void add_pole(const lbr_series *s, double shift, double term,
                     double sign, double jet[3]) {
  double inverse = s->n ? 1 / s->m : 0;
  double bend = -LBR_PI * LBR_PI / 3 - 2.0 / 3 * inverse * inverse;
  double share = term / 2;
  if (shift == 0 || 2 * shift == (double)s->n) share = term;
  jet[0] += share;
  jet[2] += share * bend;
  if (share == term) return;
  double sine = s->n ? s->m * sin(2 * shift / s->m) : 2 * shift;
  double cosine = s->n ? cos(2 * shift / s->m) : 1;
  jet[1] += sign * share * cosine / sine;
  jet[2] -= sign * share * 2 / (sine * sine);
}

void lbr_series_jet(const lbr_series *s, size_t point, double jet[3]) {
  double x = (double)point / LBR_GRID;
  double sine = lbr_grid_sin(point);
  double cosine = lbr_grid_sin(point + LBR_GRID / 2);
  size_t whole = NONE, half = NONE, bin = point / LBR_GRID;
  if (point % LBR_GRID == 0 && bin < s->whole.count) whole = bin;
  if (point % LBR_GRID == 8 && bin < s->half.count) half = bin;
  place_of at = locate(s, x);
  double h[3], y = at.y, f, d, dd;
  sums(&s->whole, &at, whole, h);
  f = y * h[0];
  d = at.dy * h[0] + 2 * y * y * h[1];
  dd = at.ddy * h[0] + 6 * y * at.dy * h[1] + 4 * y * y * y * h[2];
  jet[0] = sine * f / LBR_PI;
  jet[1] = cosine * f + sine * d / LBR_PI;
  jet[2] = -LBR_PI * sine * f + 2 * cosine * d + sine * dd / LBR_PI;
  if (whole != NONE)
    add_pole(s, x, s->whole.term[whole], 1, jet);
  if (s->half.count == 0) return;
  sums(&s->half, &at, half, h);
  f = h[0];
  d = 2 * y * h[1];
  dd = 2 * at.dy * h[1] + 4 * y * y * h[2];
  jet[0] += cosine * f / LBR_PI;
  jet[1] += -sine * f + cosine * d / LBR_PI;
  jet[2] += -LBR_PI * cosine * f - 2 * sine * d + cosine * dd / LBR_PI;
  if (half != NONE) add_pole(s, x, s->half.term[half], -1, jet);
}
