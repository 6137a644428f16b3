/* Records against cosines and sines of known frequencies, many at once.
 */
#ifndef LBR_LINES_PROJECT_H
#define LBR_LINES_PROJECT_H

#include <complex.h>
#include <stddef.h>

/* sums[i] = sum_n x[n] exp(-2 pi i f_i t_n), t from the record's centre;
 * *sum = sum x[n], *energy = sum x[n]^2. */
void lbr_project(const double *x, size_t n, const double *f, size_t count,
                 double complex *sums, double *sum, double *energy);

/* *sum = sum_n x[n] exp(-2 pi i f t_n), and its derivative per bin, 1 / n
 * cycles per sample:
 * *slope = sum_n x[n] (-2 pi i t_n / n) exp(-2 pi i f t_n). */
void lbr_project_slope(const double *x, size_t n, double f,
                       double complex *sum, double complex *slope);

/* re[k] + i im[k] = exp(-2 pi i f (start + k step)), phases reduced exactly. */
void lbr_phases(double f, double start, double step, size_t count, double *re,
                double *im);

/* x[n] -= a cos(2 pi f t_n) + b sin(2 pi f t_n) */
void lbr_take_away(double *x, size_t n, double f, double a, double b);

/* sum x[n]^2 */
double lbr_energy(const double *x, size_t n);

#endif
