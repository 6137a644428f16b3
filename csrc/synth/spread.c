#include "synth/spread.h"

#include "base/workers.h"

#define TASK 16384 /* samples of one task: they stay in a core's cache */

typedef struct job {
  lbr_adder add;
  const void *what;
  int64_t first;
  double *out;
  size_t n;
} job;

static lbr_status run(void *context, size_t task, unsigned worker) {
  const job *j = context;
  size_t from = task * TASK, left = j->n - from;
  (void)worker;
  j->add(j->what, j->first + (int64_t)from, j->out + from,
         left < TASK ? left : TASK);
  return LBR_OK;
}

lbr_status lbr_spread(lbr_adder add, const void *what, int64_t first,
                      double *out, size_t n, unsigned workers) {
  job j = {add, what, first, out, n};
  return lbr_workers_run(run, &j, n / TASK + (n % TASK != 0), workers);
}

void lbr_add_blocks(lbr_maker make, const void *what, int64_t first,
                    double *out, size_t n) {
  double block[LBR_SPREAD_BLOCK];
  int64_t place = first & (LBR_SPREAD_BLOCK - 1);
  for (size_t done = 0; done < n;) {
    size_t skip = (size_t)(done ? 0 : place);
    size_t take = LBR_SPREAD_BLOCK - skip;
    if (take > n - done) take = n - done;
    make(what, first + (int64_t)done - (int64_t)skip, block);
    for (size_t i = 0; i < take; i++) out[done + i] += block[skip + i];
    done += take;
  }
}
