/* Phasors of exactly reduced phases.
 */
#ifndef LBR_SPECTRUM_PHASE_H
#define LBR_SPECTRUM_PHASE_H

#include <complex.h>
#include <stddef.h>
#include <stdint.h>

/* exp(-2 pi i turns), right to an eps for |turns| <= 1. */
double complex lbr_phase_at(double turns);

/* exp(-2 pi i k / n), k < n. */
double complex lbr_phase_root(uint64_t k, uint64_t n);

/* exp(-2 pi i f m) for any whole number |m| <= 2^53: the product is reduced
 * by whole turns before it is rounded. */
double complex lbr_phase_product(double f, double m);

#endif
