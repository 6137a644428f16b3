#include "filter/digital.h"

#include <math.h>

#define PI 3.14159265358979323846

typedef struct design {
  lbr_band band;
  double edge;   /* rad per sample/2 scale: 2 tan(pi edge) */
  double width;  /* of the band, likewise; pass and stop */
  double centre; /* sqrt(low high); pass and stop */
} design;

/* Where a root of the low-pass goes: one place, or two for pass and stop. */
static size_t move(const design *d, double complex root,
                   double complex to[2]) {
  double complex half = 0;
  switch (d->band) {
    case LBR_BAND_LOW: to[0] = root * d->edge; return 1;
    case LBR_BAND_HIGH: to[0] = d->edge / root; return 1;
    case LBR_BAND_PASS: half = root * (d->width / 2); break;
    case LBR_BAND_STOP: half = (d->width / 2) / root; break;
  }
  double complex split =
      csqrt((half - d->centre) * (half + d->centre));
  to[0] = half + split;
  to[1] = half - split;
  double complex less = cabs(to[0]) < cabs(to[1]) ? to[0] : to[1];
  if (cabs(less) < 0.1 * cabs(split)) { /* the product is known exactly */
    int second = cabs(to[1]) < cabs(to[0]);
    to[second] = d->centre * d->centre / to[!second];
  }
  return 2;
}

static double complex bilinear(double complex s) { return (2 + s) / (2 - s); }

/* z^2 + c1 z + c2 of two roots whose coefficients are real. */
static void real_quadratic(double complex a, double complex b, double *c1,
                           double *c2) {
  *c1 = -creal(a + b);
  *c2 = creal(a * b);
}

static lbr_section section_of(double complex p, double complex q,
                              double complex u, double complex v) {
  lbr_section s = {1, 0, 0, 0, 0};
  real_quadratic(p, q, &s.a1, &s.a2);
  real_quadratic(u, v, &s.b1, &s.b2);
  return s;
}

/* Zeros of a section whose low-pass had its zeros at infinity. */
static void far_zeros(const design *d, double complex *u, double complex *v) {
  double complex middle;
  switch (d->band) {
    case LBR_BAND_LOW: *u = *v = -1; return;
    case LBR_BAND_HIGH: *u = *v = 1; return;
    case LBR_BAND_PASS:
      *u = 1;
      *v = -1;
      return;
    case LBR_BAND_STOP: break;
  }
  middle = bilinear(CMPLX(0, d->centre));
  *u = middle;
  *v = conj(middle);
}

/* Whether the frequency of the pole is farther from that of zero u. */
static int farther(double complex pole, double complex u, double complex v) {
  double at = fabs(cimag(pole));
  return fabs(at - fabs(cimag(u))) > fabs(at - fabs(cimag(v)));
}

/* A pair of poles and, where there are zeros, the pair of zeros with it. */
static void add_pair(const design *d, double complex pole,
                     const double complex *zero, lbr_sections *out) {
  double complex p[2], z[2] = {0, 0};
  size_t parts = move(d, pole, p);
  if (zero) (void)move(d, *zero, z);
  int crossed = zero && parts == 2 && farther(p[0], z[0], z[1]);
  for (size_t i = 0; i < parts; i++) {
    double complex a = bilinear(p[i]), u, v;
    far_zeros(d, &u, &v);
    if (zero) {
      u = bilinear(z[crossed ? 1 - i : i]);
      v = conj(u);
    }
    out->part[out->count++] = section_of(a, conj(a), u, v);
  }
}

/* A real pole: a section of order one, or of two for pass and stop. */
static void add_single(const design *d, double pole, lbr_sections *out) {
  double complex p[2], u, v;
  size_t parts = move(d, pole, p);
  far_zeros(d, &u, &v);
  double complex a = bilinear(p[0]);
  out->part[out->count++] = parts == 2
      ? section_of(a, bilinear(p[1]), u, v) : section_of(a, 0, u, 0);
}

/* Gain of one section alone. */
static double alone(const lbr_section *part, double share) {
  lbr_sections one = {1, {*part}};
  return cabs(lbr_sections_response(&one, share));
}

/* Every section gets gain 1 where the low-pass was at 0 Hz; what is left, and
 * the start, goes into the first. */
static lbr_status scale(lbr_sections *s, double share, double start) {
  for (size_t j = 0; j < s->count; j++) {
    lbr_section *p = &s->part[j];
    double gain = alone(p, share);
    if (!(gain > 0) || !isfinite(gain)) return LBR_NO_CONVERGE;
    double k = (j == 0 ? start : 1) / gain;
    p->b0 *= k;
    p->b1 *= k;
    p->b2 *= k;
  }
  return LBR_OK;
}

/* Rounded coefficients must still be a stable filter (the triangle of a1 and
 * a2). */
static lbr_status check_stable(const lbr_sections *s) {
  for (size_t j = 0; j < s->count; j++) {
    const lbr_section *p = &s->part[j];
    if (!(fabs(p->a2) < 1) || !(fabs(p->a1) < 1 + p->a2))
      return LBR_NO_CONVERGE;
  }
  return LBR_OK;
}

/* The least damped sections last: what they amplify has been filtered. */
static void order_sections(lbr_sections *s) {
  for (size_t i = 1; i < s->count; i++) {
    lbr_section moved = s->part[i];
    size_t j = i;
    for (; j > 0 && s->part[j - 1].a2 > moved.a2; j--)
      s->part[j] = s->part[j - 1];
    s->part[j] = moved;
  }
}

static double reference(const design *d) {
  switch (d->band) {
    case LBR_BAND_HIGH: return 0.5;
    case LBR_BAND_PASS: return atan(d->centre / 2) / PI;
    case LBR_BAND_LOW:
    case LBR_BAND_STOP: break;
  }
  return 0;
}

static lbr_status check_edges(const lbr_filter *f, lbr_band band,
                              const double edge[2]) {
  int two = band == LBR_BAND_PASS || band == LBR_BAND_STOP;
  if (f->poles == 0 || f->shape == LBR_FILTER_NONE ||
      f->shape == LBR_FILTER_POINTS)
    return LBR_DOMAIN;
  if (!(edge[0] > 0 && edge[0] < 0.5)) return LBR_DOMAIN;
  if (two && !(edge[1] > edge[0] && edge[1] < 0.5)) return LBR_DOMAIN;
  return LBR_OK;
}

lbr_status lbr_digital_design(const lbr_filter *f, lbr_band band,
                              const double edge[2], lbr_sections *out) {
  if (check_edges(f, band, edge) != LBR_OK) return LBR_DOMAIN;
  design d = {band, 2 * tan(PI * edge[0]), 0, 0};
  lbr_sections made = {0, {{0, 0, 0, 0, 0}}};
  if (band == LBR_BAND_PASS || band == LBR_BAND_STOP) {
    double high = 2 * tan(PI * edge[1]);
    d.width = 2 * sin(PI * (edge[1] - edge[0])) /
              (cos(PI * edge[1]) * cos(PI * edge[0]));
    d.centre = sqrt(d.edge * high);
  }
  size_t pairs = f->poles / 2;
  for (size_t i = 0; i < pairs; i++)
    add_pair(&d, f->pole[2 * i], f->zeros ? &f->zero[2 * i] : NULL, &made);
  if (f->poles % 2) add_single(&d, creal(f->pole[f->poles - 1]), &made);
  order_sections(&made);
  lbr_status status = check_stable(&made);
  if (status == LBR_OK) status = scale(&made, reference(&d), f->start);
  if (status == LBR_OK) *out = made;
  return status;
}
