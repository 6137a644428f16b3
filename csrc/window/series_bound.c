/* Bounds far from the poles, and the power, of a cosine series. */
#include <math.h>

#include "window/series.h"

#define MOMENTS 8

/* sum_k residue_k / (S - S_k) = sum_j m_j / S^(j + 1), m_j = sum residue S_k^j:
 * |m_j| S^-(j + 1) falls with S, and so does the geometric rest.  The slope
 * bound takes the derivative of each power times y by x, which is at most
 * (2 j + 3) S^-(j + 1). */
static void far(const lbr_poles *p, double square, double *value,
                double *slope) {
  double power[LBR_SERIES_MOST], inverse = 1 / square, scale = inverse;
  *value = *slope = 0;
  for (size_t k = 0; k < p->count; k++) power[k] = p->residue[k];
  for (int j = 0; j < MOMENTS; j++) {
    double moment = 0;
    for (size_t k = 0; k < p->count; k++) {
      moment += power[k];
      power[k] *= p->at[k] * inverse;
    }
    *value += fabs(moment) * scale;
    *slope += fabs(moment) * scale * (2 * j + 3);
  }
  for (size_t k = 0; k < p->count; k++) {
    double r = p->at[k] * inverse, left = 1 / (1 - r);
    double rest = fabs(power[k]) * scale * left;
    *value += rest;
    *slope += rest * (2 * MOMENTS + 3 + 2 * r * left);
  }
}

void lbr_series_beyond(const lbr_series *s, double x, double *value,
                       double *slope) {
  double a = s->n ? x / s->m : 0;
  double sine = s->n ? s->m * sin(a) : x, root = s->n ? cos(a) * sine : x;
  double square = sine * sine, last = 0;
  if (s->whole.count) last = s->whole.at[s->whole.count - 1];
  if (s->half.count && s->half.at[s->half.count - 1] > last)
    last = s->half.at[s->half.count - 1];
  for (size_t k = 0; k < s->whole.count; k++)
    if (s->whole.at[k] > last) last = s->whole.at[k];
  *value = *slope = INFINITY;
  if (!(square > 1.5 * last) || square < 1) return;
  double v, d, hv, hd;
  far(&s->whole, square, &v, &d);
  /* y / S falls; the sine and its derivative are at most 1 and pi */
  *value = root * v / LBR_PI;
  *slope = root * v + d / LBR_PI;
  if (s->half.count == 0) return;
  far(&s->half, square, &hv, &hd);
  *value += hv / LBR_PI;
  *slope += hv + hd / (LBR_PI * sine);
}

static void add_square(double *whole, double *half, size_t twice, double v) {
  if (twice % 2 == 0)
    whole[twice / 2] += v;
  else
    half[twice / 2] += v;
}

/* Twice the shift of term i (whole ones first), and its size. */
static size_t term_at(const lbr_series *s, size_t i, double *size) {
  if (i < s->whole.count) {
    *size = s->whole.term[i];
    return 2 * i;
  }
  *size = s->half.term[i - s->whole.count];
  return 2 * (i - s->whole.count) + 1;
}

/* w^2 is a cosine series itself; whole shifts of it sum to zero over the
 * record unless they are multiples of N. */
double lbr_series_noise_bandwidth(const lbr_series *s) {
  double whole[2 * LBR_SERIES_MOST] = {0}, half[2 * LBR_SERIES_MOST] = {0};
  size_t terms = s->whole.count + s->half.count;
  for (size_t i = 0; i < terms; i++) {
    double a, b;
    size_t p = term_at(s, i, &a);
    for (size_t j = 0; j < terms; j++) {
      size_t q = term_at(s, j, &b);
      add_square(whole, half, p + q, a * b / 2);
      add_square(whole, half, p > q ? p - q : q - p, a * b / 2);
    }
  }
  double sum = whole[0];
  for (size_t k = 1; s->n && k < 2 * LBR_SERIES_MOST; k++)
    if (k % s->n == 0)
      sum += (s->n % 2) && (k / s->n % 2) ? -whole[k] : whole[k];
  for (size_t j = 0; j < 2 * LBR_SERIES_MOST; j++) {
    double shift = (double)j + 0.5, sign = j % 2 ? -1 : 1;
    if (half[j] == 0) continue;
    sum += half[j] * sign * (s->n ? 1 / (tan(shift / s->m) * (double)s->n)
                                  : 1 / (LBR_PI * shift));
  }
  return sum;
}
