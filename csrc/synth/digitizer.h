/* The digitizer model: from tones and noise at its input to the record.
 *
 *   v(t)   = offset F(0) + sum A |F(f)| cos(2 pi f t + phase + arg F(f))
 *   x[n]   = v(t_n) + input noise (shaped by F) + own noise
 *   out[n] = quantise((1 + gain_error) x[n])
 *   t_n    = n / (rate (1 + timebase)) + delay_s + jitter_s Gaussian(n)
 *
 * F acts at each tone's true frequency (its value at t = 0 for tones that
 * ramp or swing).  Quantiser: mid-tread, round half to even, codes
 * -2^(bits-1) .. 2^(bits-1) - 1 of 2 range / 2^bits each, the ends clip.
 *
 * Jitter: for steady tones v at the displaced instant is taken from value,
 * first and second derivative (error below (2 pi f displacement)^3 / 6 of the
 * amplitude) while 2 pi f jitter_s <= 1e-3 for every tone; beyond that, and
 * for moving tones always, each tone is evaluated at the displaced instant.
 */
#ifndef LBR_SYNTH_DIGITIZER_H
#define LBR_SYNTH_DIGITIZER_H

#include <stddef.h>
#include <stdint.h>

#include "base/random.h"
#include "base/status.h"
#include "filter/analog.h"
#include "synth/noise.h"
#include "synth/tones.h"

typedef struct lbr_input_tone {
  double hz;          /* at t = 0, Hz, >= 0 */
  double amplitude;   /* peak before the filter, unit */
  double phase;       /* at t = 0 before the filter, rad */
  double ramp;        /* Hz per second; 0: steady */
  double swing_hz;    /* slow frequency modulation, peak, Hz; 0: steady:
                         f(t) = hz + swing_hz sin(2 pi t / swing_s +
                         swing_phase), phase at t = 0 unmoved */
  double swing_s;     /* its period, s, > 0 where swing_hz is not 0 */
  double swing_phase; /* rad */
} lbr_input_tone;

typedef struct lbr_record_model {
  const lbr_input_tone *tones; /* n_tones */
  size_t n_tones;
  double offset;       /* at the input, unit */
  double rate;         /* nominal sample rate, S/s, > 0 */
  double timebase;     /* true rate = rate (1 + timebase), > -1 */
  const lbr_filter *filter; /* prepared; NULL: none */
  double delay_s;      /* of this channel's sampling instants, s */
  double jitter_s;     /* standard deviation of a sampling instant, s */
  double gain_error;   /* relative */
  double input_noise;  /* one-sided density before the filter, unit/sqrt(Hz) */
  const lbr_shape *input_shape; /* what the filter makes of it, folds
                          included; NULL: white up to half the rate */
  double own_noise;    /* one-sided density of the digitizer */
  int bits;            /* 0: no quantiser; else 1 .. 32 */
  double range;        /* largest |value|, unit; used with bits, or alone as a
                          clipping level when bits is 0; INFINITY: none */
  uint64_t seed, trial, channel; /* key of jitter and noise */
} lbr_record_model;

typedef struct lbr_record_facts {
  size_t clipped; /* samples that the rails changed */
} lbr_record_facts;

/* Room for records of at most most_tones tones, any length. */
typedef struct lbr_record_work lbr_record_work;

LBR_CHECKED lbr_status lbr_record_work_make(size_t most_tones,
                                            lbr_record_work **work);
void lbr_record_work_free(lbr_record_work *work); /* NULL is fine */

/* Samples first .. first + n - 1 of the record.  codes (NULL: not wanted;
 * needs bits) gets the integer codes.  Allocates nothing; single thread;
 * LBR_DOMAIN when a field is out of range. */
LBR_CHECKED lbr_status lbr_synth_record(const lbr_record_model *model,
                                        uint64_t first, double *out,
                                        int32_t *codes, size_t n,
                                        lbr_record_work *work,
                                        lbr_record_facts *facts);

/* The shape that the filter and folding give white input noise at `rate`:
 * tap[0 .. half] of a symmetric filter whose response is the square root of
 * the sum of |F|^2 over all frequencies that fold onto f.  Folds are summed
 * until the gain stays below 1e-4; where it never does (no filter, a table
 * that does not fall) they are left out: input noise then ends at rate / 2.
 * LBR_DOMAIN: half > LBR_MOST_HALF_TAPS or a rate that is no rate. */
LBR_CHECKED lbr_status lbr_input_shape(const lbr_filter *filter, double rate,
                                       size_t half, double *tap);

#endif
