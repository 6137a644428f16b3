/* A whole signal in one pass: offset, tones and noise, on several threads.
 */
#ifndef LBR_SYNTH_SIGNAL_H
#define LBR_SYNTH_SIGNAL_H

#include <stddef.h>
#include <stdint.h>

#include "base/random.h"
#include "base/status.h"
#include "synth/noise.h"
#include "synth/tones.h"

typedef struct lbr_signal {
  double offset;          /* added to every sample, unit */
  const lbr_bank *bank;   /* NULL: no tones */
  double sigma;           /* of the noise before its shape, unit; 0: none */
  lbr_key key;            /* of the noise */
  const lbr_shape *shape; /* NULL: white */
} lbr_signal;

/* out[i] = sample first + i (what out held is lost).  The same bits for any
 * number of workers (0: one per core) and any division into calls. */
LBR_CHECKED lbr_status lbr_signal_fill(const lbr_signal *signal,
                                       uint64_t first, double *out, size_t n,
                                       unsigned workers);

#endif
