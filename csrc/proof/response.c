#include "proof/response.h"

#include <math.h>
#include <stdbool.h>

#include "base/checked.h"
#include "spectrum/transform.h"

#define PI 3.14159265358979323846264338327950
#define DENSITY 4 /* points a bin */
#define REACH 12  /* points used on either side */

/* Sinc interpolation damped by a Gaussian: REACH points a side at this density
 * leave exp(-REACH (pi - pi / DENSITY) / 2) = 7e-7 of the window's mean. */
#define DAMPING (PI * (DENSITY - 1) / (2.0 * DENSITY * REACH))

struct lbr_response {
  size_t n;
  size_t points;         /* of the grid: 0 .. DENSITY n / 2, both ends */
  double complex *grid;  /* G at k / DENSITY */
  double weight[REACH + 1]; /* exp(-DAMPING k^2) */
};

static lbr_status fill(lbr_response *r, const double *w) {
  size_t padded = DENSITY * r->n;
  lbr_transform *transform = NULL;
  double *scratch = lbr_transform_buffer(padded);
  double complex *bins =
      (double complex *)lbr_transform_buffer(2 * (padded / 2 + 1));
  r->grid = lbr_alloc(r->points, sizeof *r->grid);
  lbr_status status = LBR_NO_MEMORY;
  if (scratch && bins && r->grid)
    status = lbr_transform_get(padded, &transform);
  if (status == LBR_OK) {
    lbr_transform_windowed(transform, w, NULL, r->n, scratch, bins);
    double scale = 1 / creal(bins[0]), middle = 0.5 * ((double)r->n - 1);
    for (size_t k = 0; k < r->points; k++) {
      double turn = fmod(middle * (double)k / (double)padded, 1.0);
      r->grid[k] = conj(bins[k]) * scale * cexp(CMPLX(0, -2 * PI * turn));
    }
  }
  lbr_transform_put(transform);
  lbr_transform_drop(scratch);
  lbr_transform_drop(bins);
  return status;
}

lbr_status lbr_response_new(const double *w, size_t n, lbr_response **out) {
  if (n < 4 || n > LBR_RESPONSE_MOST) return LBR_DOMAIN;
  lbr_response *r = lbr_alloc(1, sizeof *r);
  if (!r) return LBR_NO_MEMORY;
  r->n = n;
  r->points = DENSITY * n / 2 + 1;
  for (int k = 0; k <= REACH; k++) r->weight[k] = exp(-DAMPING * k * k);
  lbr_status status = fill(r, w);
  if (status == LBR_OK)
    *out = r;
  else
    lbr_response_free(r);
  return status;
}

void lbr_response_free(lbr_response *r) {
  if (!r) return;
  free(r->grid);
  free(r);
}

/* The grid beyond its ends: G(-x) = conj G(x), G(x + N) = (-1)^(N-1) G(x). */
static double complex grid_at(const lbr_response *r, long k) {
  long period = (long)(DENSITY * r->n);
  bool mirrored = k < 0;
  if (mirrored) k = -k;
  double sign = 1;
  if (k >= (long)r->points) { /* G(x) = sign conj G(N - x) */
    k = period - k;
    mirrored = !mirrored;
    sign = r->n % 2 ? 1 : -1;
  }
  double complex g = sign * r->grid[k];
  return mirrored ? conj(g) : g;
}

double complex lbr_response_at(const lbr_response *r, double x) {
  double bins = (double)r->n, periods = rint(x / bins);
  double sign = r->n % 2 || fmod(periods, 2) == 0 ? 1 : -1;
  double place = (x - periods * bins) * DENSITY, near = rint(place);
  double off = place - near, sine = sin(PI * off) / PI;
  long k0 = (long)near;
  if (fabs(off) < 1e-9) return sign * grid_at(r, k0);
  /* exp(-D (off - k)^2) = exp(-D off^2) exp(-D k^2) exp(2 D off)^k */
  double step = exp(2 * DAMPING * off), up = 1, down = 1;
  double complex sum = grid_at(r, k0) / off;
  for (int k = 1; k <= REACH; k++) {
    up *= step;
    down /= step;
    double odd = k % 2 ? -r->weight[k] : r->weight[k];
    sum += grid_at(r, k0 + k) * (odd * up / (off - k)) +
           grid_at(r, k0 - k) * (odd * down / (off + k));
  }
  return sum * (sign * sine * exp(-DAMPING * off * off));
}
