#include "lines/estimator.h"

#include <math.h>
#include <string.h>

#include "lines/phasor.h"

#define PI 3.14159265358979323846264338328
#define ROUNDS 2 /* of interpolation between the bins */

static double candan(const lbr_peak *p) {
  double n = (double)p->n, half = PI / n;
  double ratio =
      creal((p->below - p->above) / (2 * p->at - p->below - p->above));
  return atan(ratio * tan(half)) / half;
}

static double quinn_tau(double v) {
  double root = sqrt(2.0 / 3);
  return 0.25 * log(3 * v * v + 6 * v + 1) -
         sqrt(6) / 24 * log((v + 1 - root) / (v + 1 + root));
}

static double quinn(const lbr_peak *p) {
  double up = creal(p->above / p->at), down = creal(p->below / p->at);
  double u = -up / (1 - up), d = down / (1 - down);
  return 0.5 * (u + d) + quinn_tau(u * u) - quinn_tau(d * d);
}

static double macleod(const lbr_peak *p) {
  double below = creal(p->below * conj(p->at));
  double at = creal(p->at * conj(p->at)), above = creal(p->above * conj(p->at));
  double g = (below - above) / (2 * at + below + above);
  return g == 0 ? 0 : (sqrt(1 + 8 * g * g) - 1) / (4 * g);
}

static double grandke(const lbr_peak *p) {
  double below = cabs(p->below), above = cabs(p->above);
  double r = fmax(below, above) / cabs(p->at), d = (2 * r - 1) / (r + 1);
  return above > below ? d : -d;
}

static const lbr_estimator rows[] = {
    {"aboutanios_mulgrew2005",
     "E. Aboutanios, B. Mulgrew 2005, IEEE Trans. Signal Process. 53(4), "
     "1237-1242, two rounds",
     0, NULL},
    {"candan2013",
     "C. Candan 2013, IEEE Signal Process. Lett. 20(9), 913-916", 0, candan},
    {"grandke1983",
     "T. Grandke 1983, IEEE Trans. Instrum. Meas. 32(2), 350-355", 1, grandke},
    {"macleod1998",
     "M. D. Macleod 1998, IEEE Trans. Signal Process. 46(1), 141-148", 0,
     macleod},
    {"quinn1997",
     "B. G. Quinn 1997, IEEE Trans. Signal Process. 45(3), 814-817", 0, quinn},
};

size_t lbr_estimators(void) { return sizeof rows / sizeof *rows; }

const lbr_estimator *lbr_estimator_at(size_t i) { return &rows[i]; }

lbr_status lbr_estimator_find(const char *name, const lbr_estimator **out) {
  for (size_t i = 0; i < lbr_estimators(); i++)
    if (strcmp(rows[i].name, name) == 0) {
      *out = &rows[i];
      return LBR_OK;
    }
  return LBR_UNKNOWN;
}

/* The transform at any bin, time counted from the first sample. */
static double complex bin_at(const double *re, const double *im, size_t n,
                             double k) {
  double f = k / (double)n;
  double complex sum = lbr_phasor_sum(re, n, f);
  if (im) sum += CMPLX(0, 1) * lbr_phasor_sum(im, n, f);
  return sum * lbr_phasor_at(f, 0.5 * ((double)n - 1));
}

static double between_bins(const double *re, const double *im, size_t n,
                           double k) {
  double d = 0;
  for (int i = 0; i < ROUNDS; i++) {
    double complex up = bin_at(re, im, n, k + d + 0.5);
    double complex down = bin_at(re, im, n, k + d - 0.5);
    d += 0.5 * creal((up + down) / (up - down));
  }
  return d;
}

static double from_bins(const lbr_estimator *row, const double *re,
                        const double *im, size_t n, double k) {
  double complex x[5];
  for (int j = 0; j < 5; j++) x[j] = bin_at(re, im, n, k + j - 2);
  lbr_peak peak = {x[1], x[2], x[3], n};
  if (row->hann) {
    peak.below = x[1] - 0.5 * (x[0] + x[2]);
    peak.at = x[2] - 0.5 * (x[1] + x[3]);
    peak.above = x[3] - 0.5 * (x[2] + x[4]);
  }
  return row->offset(&peak);
}

lbr_status lbr_estimate(const lbr_estimator *row, const double *re,
                        const double *im, size_t n, size_t k, double *offset) {
  if (n < 8 || k >= n) return LBR_DOMAIN;
  double d = row->offset ? from_bins(row, re, im, n, (double)k)
                         : between_bins(re, im, n, (double)k);
  if (!isfinite(d)) return LBR_DOMAIN;
  *offset = d;
  return LBR_OK;
}
