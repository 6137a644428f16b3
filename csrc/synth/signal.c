#include "synth/signal.h"

#include "base/workers.h"

#define TASK 16384 /* samples of one task: they stay in a core's cache */

typedef struct job {
  const lbr_signal *signal;
  uint64_t first;
  double *out;
  size_t n;
} job;

static void fill(const lbr_signal *s, uint64_t first, double *out, size_t n) {
  for (size_t i = 0; i < n; i++) out[i] = s->offset;
  if (s->bank) lbr_bank_add(s->bank, first, out, n);
  if (s->shape)
    lbr_noise_add_shaped(&s->key, s->sigma, s->shape, first, out, n);
  else
    lbr_noise_add_white(&s->key, s->sigma, first, out, n);
}

static lbr_status fill_task(void *context, size_t task, unsigned worker) {
  const job *j = context;
  size_t from = task * TASK, left = j->n - from;
  (void)worker;
  fill(j->signal, j->first + from, j->out + from, left < TASK ? left : TASK);
  return LBR_OK;
}

lbr_status lbr_signal_fill(const lbr_signal *signal, uint64_t first,
                           double *out, size_t n, unsigned workers) {
  job j = {signal, first, out, n};
  return lbr_workers_run(fill_task, &j, n / TASK + (n % TASK != 0), workers);
}
