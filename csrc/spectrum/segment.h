/* One segment on its way into a transform, and its power on the way out: the
 * inner loops of averaging.  The bits are the same on every processor.
 */
#ifndef LBR_SPECTRUM_SEGMENT_H
#define LBR_SPECTRUM_SEGMENT_H

#include <complex.h>
#include <stddef.h>

typedef enum lbr_detrend { /* what is taken from every segment */
  LBR_DETREND_NONE,        /* nothing */
  LBR_DETREND_MEAN,        /* its mean */
  LBR_DETREND_LINE,        /* the straight line of least squares */
  LBR_DETREND_KINDS
} lbr_detrend;

/* out[i] = w[i] (x[i] - trend) for i < n. */
void lbr_segment_window(const double *x, const double *w, size_t n,
                        lbr_detrend detrend, double *out);

/* power[k] = |bins[k]|^2 */
void lbr_segment_set_power(const double complex *bins, size_t count,
                           double *power);

/* sum[k] += |bins[k]|^2 */
void lbr_segment_add_power(const double complex *bins, size_t count,
                           double *sum);

/* most[k] = the larger of most[k] and |bins[k]|^2 */
void lbr_segment_most_power(const double complex *bins, size_t count,
                            double *most);

/* re[k] + i im[k] += conj(a[k]) b[k] */
void lbr_segment_add_cross(const double complex *a, const double complex *b,
                           size_t count, double *re, double *im);

#endif
