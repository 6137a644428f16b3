/* The kernel of a window: its response at any frequency, and true suprema.
 *
 *   W(x) = sum_n w[n] exp(2 pi i x n / N),   x in bins (any real number)
 *
 * is used through the normalised magnitude |W(x)| / |W(0)|, which has period N.
 * N = 0 means the limit N -> infinity (no period).  Enclosures are rigorous up
 * to LBR_KERNEL_FLOOR, an absolute allowance that is already inside them.
 *
 * A kernel carries caches and belongs to one thread at a time.
 */
#ifndef LBR_WINDOW_KERNEL_H
#define LBR_WINDOW_KERNEL_H

#include <stddef.h>

#include "base/status.h"
#include "window/window.h"

/* most that an enclosure is widened by, absolute */
#define LBR_KERNEL_FLOOR 1e-9

typedef struct lbr_kernel lbr_kernel;

/* Cheap for cosine sums (about a microsecond), up to milliseconds for shapes
 * that need a fit.  n is 0 or at least 4; LBR_DOMAIN: another n, or 0 for a
 * shape without a limit (Dolph-Chebyshev). */
LBR_CHECKED lbr_status lbr_kernel_new(const lbr_window *window, size_t n,
                                      lbr_kernel **out);
void lbr_kernel_free(lbr_kernel *kernel); /* NULL is fine */

/* The same window at another length, reusing the memory and whatever does not
 * depend on the length.  After a failure the kernel may only be resized again
 * or freed. */
LBR_CHECKED lbr_status lbr_kernel_resize(lbr_kernel *kernel, size_t n);

/* |W(x)| / |W(0)| at one point, to 1e-12 absolute. */
double lbr_kernel_gain(const lbr_kernel *kernel, double x);

/* low <= |W(x)|/|W(0)| <= high for all x in [x1, x2] (x1 <= x2); as tight as
 * 1e-3 relative plus LBR_KERNEL_FLOOR. */
void lbr_kernel_range(lbr_kernel *kernel, double x1, double x2, double *low,
                      double *high);

/* Upper bound of |dW/dx| / |W(0)| over [x1, x2], for the transform seen from
 * the middle of the window (linear phase removed). */
double lbr_kernel_slope(lbr_kernel *kernel, double x1, double x2);

/* Lower bound of -d2R/dx2 / R(0) over |x| <= radius, R the real, phase-free
 * kernel; 0 where the curvature may vanish or change sign. */
double lbr_kernel_curvature(lbr_kernel *kernel, double radius);

/* Upper bound of |W(x)|/|W(0)| over all x (1 unless the main lobe peaks off
 * its centre, as flat-tops do). */
double lbr_kernel_peak(lbr_kernel *kernel);

/* The smallest x >= 0 with |W(x)|/|W(0)| <= level, never more than the true
 * one (a lower bound good to 1e-6); level > 0.  INFINITY: nowhere. */
double lbr_kernel_reach(lbr_kernel *kernel, double level);

/* Noise bandwidth in bins, N sum w^2 / (sum w)^2; and sum |w| / |sum w|. */
double lbr_kernel_noise_bandwidth(const lbr_kernel *kernel);
double lbr_kernel_absolute(const lbr_kernel *kernel);

#endif
