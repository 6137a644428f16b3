/* Notation of the literature (Cauer 1958; Abramowitz & Stegun, ch. 16, 17):
 * modulus k, complement k' = sqrt(1 - k^2), quarter period K(k), nome
 * q = exp(-pi K(k')/K(k)).  A response of order n with ripple factors e
 * (pass) and E (stop) has the discrimination k1 = e/E, and its selectivity k
 * solves  n K(k')/K(k) = K(k1')/K(k1),  that is  q(k)^n = q(k1).
 */
#include "filter/elliptic.h"

#include <math.h>

#include "filter/design.h"

#define PI 3.14159265358979323846
#define MOST_STEPS 24

typedef struct modulus {
  double k, kc; /* the modulus and its complement, each to full precision */
} modulus;

/* Moduli of Landen's descending transformation, until k vanishes. */
typedef struct ladder {
  size_t steps;
  double first;              /* the modulus at the top */
  double rung[MOST_STEPS];   /* those below it */
} ladder;

static lbr_status descend(modulus m, ladder *l) {
  l->first = m.k;
  l->steps = 0;
  while (m.k > 1e-18) {
    if (l->steps == MOST_STEPS) return LBR_NO_CONVERGE;
    double next = m.k / (1.0 + m.kc);
    m.kc = 2.0 * sqrt(m.kc) / (1.0 + m.kc);
    m.k = next * next;
    l->rung[l->steps++] = m.k;
  }
  return LBR_OK;
}

/* cd(u K, k) for complex u. */
static double complex cd(const ladder *l, double complex u) {
  double complex w = ccos(u * (PI / 2.0));
  for (size_t i = l->steps; i-- > 0;)
    w = (1.0 + l->rung[i]) * w / (1.0 + l->rung[i] * w * w);
  return w;
}

/* The real v for which sn(j v K, k) = j y. */
static double inverse_sn_imaginary(const ladder *l, double y) {
  double k = l->first;
  for (size_t i = 0; i < l->steps; i++) {
    double root = hypot(1.0, k * y);
    k = l->rung[i];
    y = 2.0 * y / ((1.0 + k) * (1.0 + root));
  }
  return asinh(y) * (2.0 / PI);
}

/* Arithmetic-geometric mean of 1 and b. */
static double agm(double b) {
  double a = 1.0;
  for (int i = 0; i < 40 && fabs(a - b) > 1e-16 * a; i++) {
    double mean = 0.5 * (a + b);
    b = sqrt(a * b);
    a = mean;
  }
  return a;
}

/* The modulus of a nome up to exp(-pi), by theta functions. */
static double modulus_of_nome(double q) {
  double above = 0.0, below = 0.5;
  for (int m = 0; m < 8; m++) above += pow(q, m * (m + 1.0));
  for (int m = 1; m < 8; m++) below += pow(q, (double)m * m);
  double ratio = above / (2.0 * below);
  return 4.0 * sqrt(q) * ratio * ratio;
}

/* From log q: the smaller of k and k' by its own nome, the other from it. */
static modulus from_log_nome(double log_q) {
  bool direct = log_q <= -PI;
  double small = modulus_of_nome(exp(direct ? log_q : PI * PI / log_q));
  double large = sqrt((1.0 - small) * (1.0 + small));
  return direct ? (modulus){small, large} : (modulus){large, small};
}

/* The log of the discrimination's nome: -pi K(k1')/K(k1), by K(k) = pi /
 * (2 agm(1, k')). */
static double log_nome(modulus m) { return -PI * agm(m.kc) / agm(m.k); }

static void place(lbr_filter *f, const ladder *l, double v) {
  int n = f->order;
  size_t poles = 0, zeros = 0;
  for (int i = 0; i < n / 2; i++) {
    double u = (2 * i + 1) / (double)n;
    double at = 1.0 / (f->selectivity * creal(cd(l, u)));
    double complex p = I * cd(l, CMPLX(u, -v));
    f->zero[zeros++] = CMPLX(0.0, at);
    f->zero[zeros++] = CMPLX(0.0, -at);
    f->pole[poles++] = p;
    f->pole[poles++] = conj(p);
  }
  if (n % 2) f->pole[poles++] = creal(I * cd(l, CMPLX(1.0, -v)));
  f->poles = poles;
  f->zeros = zeros;
  for (int m = 0; m < n; m++) f->turn[m] = creal(cd(l, m / (double)n));
  f->turn[n] = 0.0;
}

lbr_status lbr_design_elliptic(lbr_filter *f) {
  ladder narrow, wide;
  f->ripple = lbr_design_ripple(f->ripple_db);
  f->floor = pow(10.0, -f->ripple_db / 20.0);
  f->ceiling = pow(10.0, -f->stop_db / 20.0);
  double k1 = f->ripple / lbr_design_ripple(f->stop_db);
  modulus discrimination = {k1, sqrt((1.0 - k1) * (1.0 + k1))};
  lbr_status status = descend(discrimination, &narrow);
  if (status != LBR_OK) return status;
  modulus m = from_log_nome(log_nome(discrimination) / f->order);
  status = descend(m, &wide);
  if (status != LBR_OK) return status;
  f->selectivity = m.k;
  place(f, &wide, inverse_sn_imaginary(&narrow, 1.0 / f->ripple) / f->order);
  return LBR_OK;
}
