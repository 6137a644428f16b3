/* Windowed sums at one frequency, exact to rounding at any record length.
 *
 * Time is counted in samples from the record's centre, t = n - (N - 1) / 2,
 * frequency in cycles per sample (any real value: it need not lie below 1/2).
 * Phases come from a table inside blocks of LBR_PHASOR_BLOCK samples and an
 * anchor for each block; both are products of two phasors of exactly reduced
 * phases.  Nothing recurs from sample to sample, so errors do not grow with N.
 */
#ifndef LBR_LINES_PHASOR_H
#define LBR_LINES_PHASOR_H

#include <complex.h>
#include <stddef.h>

#define LBR_PHASOR_BLOCK 64
#define LBR_PHASOR_GROUP 16   /* blocks that share an exact anchor */
#define LBR_PHASOR_MOMENTS 10 /* moments of one expansion */

/* exp(-2 pi i f t), the phase reduced exactly before it is rounded. */
double complex lbr_phasor_at(double f, double t);

/* c[k] + i s[k] = exp(-2 pi i f k) for the k of a block. */
void lbr_phasor_table(double f, double c[LBR_PHASOR_BLOCK],
                      double s[LBR_PHASOR_BLOCK]);

/* Anchors: the phasors at the starts of blocks, in order. */
typedef struct lbr_phasor_walk {
  double f, start;                          /* cycles/sample; t of sample 0 */
  size_t block;                             /* the next block */
  double complex base;                      /* of its group of blocks */
  double complex step[LBR_PHASOR_GROUP];    /* of a block within its group */
} lbr_phasor_walk;

void lbr_phasor_walk_start(lbr_phasor_walk *walk, double f, double start);
double complex lbr_phasor_walk_next(lbr_phasor_walk *walk);

/* sum_n y[n] exp(-2 pi i f t_n) */
double complex lbr_phasor_sum(const double *y, size_t n, double f);

/* m_p = sum_n y[n] u_n^p exp(-2 pi i f t_n), u = t / N, |u| <= 1/2, for
 * p = 0 .. LBR_PHASOR_MOMENTS - 1: the transform near f is
 *   X(f + v / N) = sum_p m_p (-2 pi i v)^p / p!
 * with an error below (pi |v|)^10 / 10! of sum |y|. */
void lbr_phasor_moments(const double *y, size_t n, double f,
                        double complex m[LBR_PHASOR_MOMENTS]);

/* Sums over the blocks of a long record, ceil(n / LBR_PHASOR_BLOCK) of them,
 * and from them |X(f + shift)|^2, quickly and nearly: the phase that `shift`
 * turns inside a block is left out, an error of X below
 * (pi shift LBR_PHASOR_BLOCK)^2 / 6 of sum |y|. */
void lbr_phasor_blocks(const double *y, size_t n, double f,
                       double complex *sums);
double lbr_phasor_coarse(const double complex *sums, size_t n, double shift);

/* X(f + v / N) and its derivatives with respect to v from the moments. */
void lbr_phasor_expand(const double complex m[LBR_PHASOR_MOMENTS], double v,
                       double complex *x, double complex *slope,
                       double complex *curve);

#endif
