/* Sample by sample arithmetic.
 */
#ifndef LBR_SAMPLES_ARITH_H
#define LBR_SAMPLES_ARITH_H

#include <stdbool.h>
#include <stddef.h>

typedef enum lbr_operation {
  LBR_ADD,
  LBR_SUBTRACT,
  LBR_MULTIPLY,
  LBR_DIVIDE
} lbr_operation;

/* out[i] = x[i] op y[i]; out may be x or y. */
void lbr_arith(lbr_operation op, const double *x, const double *y, double *out,
               size_t n);

/* out[i] = x[i] op k, or k op x[i] when the number comes first. */
void lbr_arith_number(lbr_operation op, const double *x, double k,
                      bool number_first, double *out, size_t n);

/* x[i] += factor * y[i] */
void lbr_add_scaled(double *x, const double *y, double factor, size_t n);

/* x[i] == y[i] for all i. */
bool lbr_all_equal(const double *x, const double *y, size_t n);

#endif
