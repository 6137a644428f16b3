/* Samples on their way into a draft: as text and as packed codes.
 */
#ifndef LBR_STORE_ENCODE_H
#define LBR_STORE_ENCODE_H

#include <stddef.h>
#include <stdint.h>

#include "base/status.h"
#include "store/draft.h"
#include "store/plain.h"
#include "store/why.h"

/* Appends rows of numbers as the shortest text that reads back, the columns
 * between `separator`.  With rate_over > 0 a first column holds the times
 * (first + i) * rate_under / rate_over, s, of rows i = 0 .. rows - 1. */
typedef struct lbr_rows_out {
  char separator;
  int64_t first, rate_over, rate_under;
  size_t columns, rows;
  const double *const *column;
} lbr_rows_out;
LBR_CHECKED lbr_status lbr_draft_rows(lbr_draft *draft, const lbr_rows_out *o,
                                      lbr_why *why);

/* Appends numbers in C's notation of `digits` digits behind the point with an
 * exponent (E13.5: width 13, digits 5), `per_line` of them to a line; the last
 * line may be shorter.  LBR_DOMAIN: an exponent does not fit, or not finite. */
LBR_CHECKED lbr_status lbr_draft_columns(lbr_draft *draft, const double *x,
                                         size_t n, int width, int digits,
                                         size_t per_line, lbr_why *why);

/* Appends frames of samples, interleaved, coded as `coding` says after being
 * multiplied by scale[k].  LBR_DOMAIN, with nothing clipped, when one does not
 * fit or is no whole number of codes. */
LBR_CHECKED lbr_status lbr_draft_frames(lbr_draft *draft,
                                        const lbr_coding *coding,
                                        const double *const *channel,
                                        const double *scale, size_t channels,
                                        size_t frames, lbr_why *why);

#endif
