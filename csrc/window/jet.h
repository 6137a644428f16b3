/* A value with its first two derivatives by x. */
#ifndef LBR_WINDOW_JET_H
#define LBR_WINDOW_JET_H

typedef struct lbr_jet {
  double v, d, dd; /* value, first, second derivative */
} lbr_jet;

static inline lbr_jet lbr_jet_times(lbr_jet a, lbr_jet b) {
  return (lbr_jet){a.v * b.v, a.d * b.v + a.v * b.d,
                   a.dd * b.v + 2 * a.d * b.d + a.v * b.dd};
}

/* a / b, b away from 0 */
static inline lbr_jet lbr_jet_over(lbr_jet a, lbr_jet b) {
  lbr_jet q;
  q.v = a.v / b.v;
  q.d = (a.d - q.v * b.d) / b.v;
  q.dd = (a.dd - 2 * q.d * b.d - q.v * b.dd) / b.v;
  return q;
}

/* adds scale * b to a */
static inline void lbr_jet_add(lbr_jet *a, double scale, lbr_jet b) {
  a->v += scale * b.v;
  a->d += scale * b.d;
  a->dd += scale * b.dd;
}

/* f(y(x)) from f's derivatives by y and the jet of y */
static inline lbr_jet lbr_jet_of(double f, double df, double ddf, lbr_jet y) {
  return (lbr_jet){f, df * y.d, ddf * y.d * y.d + df * y.dd};
}

#endif
