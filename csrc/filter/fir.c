#include "filter/fir.h"

#include <math.h>

#define PI 3.14159265358979323846

/* Kaiser's shape parameter (his equation 8). */
static double shape_of(double db) {
  if (db > 50) return 0.1102 * (db - 8.7);
  if (db > 21) return 0.5842 * pow(db - 21, 0.4) + 0.07886 * (db - 21);
  return 0;
}

lbr_status lbr_fir_kaiser(double db, double width, size_t *taps,
                          double *beta) {
  if (!(db >= 8 && db <= 300) || !(width > 0 && width < 0.5))
    return LBR_DOMAIN;
  double count = ceil((db - 7.95) / (2.285 * 2 * PI * width) + 1);
  if (!(count <= (double)LBR_FIR_MOST_TAPS)) return LBR_OVERFLOW;
  *taps = (size_t)count;
  *beta = shape_of(db);
  return LBR_OK;
}

/* I0 by its power series, whose terms are all positive. */
static double bessel_i0(double x) {
  double term = 1, sum = 1, quarter = x * x / 4;
  for (int k = 1; k < 2000 && term > 1e-18 * sum; k++) {
    term *= quarter / ((double)k * k);
    sum += term;
  }
  return sum;
}

void lbr_fir_kaiser_window(double beta, double *weight, size_t n) {
  double top = bessel_i0(beta);
  for (size_t i = 0; i < n; i++) {
    double last = (double)(n - 1), from = (double)i, to = last - from;
    double arch = n > 1 ? 2 * sqrt(from * to) / last : 1;
    weight[i] = bessel_i0(beta * arch) / top;
  }
}

/* Ideal low-pass: sin(2 pi edge t) / (pi t). */
static double ideal_low(double edge, double t) {
  return t == 0 ? 2 * edge : sin(2 * PI * edge * t) / (PI * t);
}

static double ideal(lbr_band band, const double edge[2], double t) {
  switch (band) {
    case LBR_BAND_LOW: return ideal_low(edge[0], t);
    case LBR_BAND_HIGH: return (t == 0) - ideal_low(edge[0], t);
    case LBR_BAND_PASS: return ideal_low(edge[1], t) - ideal_low(edge[0], t);
    case LBR_BAND_STOP: break;
  }
  return (t == 0) - ideal_low(edge[1], t) + ideal_low(edge[0], t);
}

static double reference(lbr_band band, const double edge[2]) {
  switch (band) {
    case LBR_BAND_HIGH: return 0.5;
    case LBR_BAND_PASS: return (edge[0] + edge[1]) / 2;
    case LBR_BAND_LOW:
    case LBR_BAND_STOP: break;
  }
  return 0;
}

lbr_status lbr_fir_design(lbr_band band, const double edge[2],
                          const double *weight, double *h, size_t n) {
  int two = band == LBR_BAND_PASS || band == LBR_BAND_STOP;
  if (n == 0 || !(edge[0] > 0 && edge[0] < 0.5)) return LBR_DOMAIN;
  if (two && !(edge[1] > edge[0] && edge[1] < 0.5)) return LBR_DOMAIN;
  if ((band == LBR_BAND_HIGH || band == LBR_BAND_STOP) && n % 2 == 0)
    return LBR_DOMAIN;
  double middle = 0.5 * (double)(n - 1);
  for (size_t i = 0; i < n; i++)
    h[i] = weight[i] * ideal(band, edge, (double)i - middle);
  double gain = lbr_fir_gain(h, n, reference(band, edge));
  if (!(fabs(gain) > 0)) return LBR_DOMAIN;
  for (size_t i = 0; i < n; i++) h[i] /= gain;
  return LBR_OK;
}

double lbr_fir_gain(const double *h, size_t n, double share) {
  double sum = n % 2 ? h[n / 2] : 0, first = n % 2 ? 1 : 0.5;
  for (size_t i = 0; i < n / 2; i++) {
    double turns = share * (first + (double)i);
    turns -= floor(turns);
    sum += (h[n / 2 - 1 - i] + h[(n + 1) / 2 + i]) * cos(2 * PI * turns);
  }
  return sum;
}
