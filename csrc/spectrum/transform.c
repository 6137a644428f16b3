#define _GNU_SOURCE /* madvise */
#include "spectrum/transform.h"

#include <fftw3.h>
#include <pthread.h>
#include <stdbool.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>
#include <sys/mman.h>

#include "base/checked.h"

#define IDLE_PLANS 32          /* plans kept although nobody uses them */
#define HUGE_PAGE ((size_t)2 << 20)
#define HEADROOM (1024 * 1024) /* bytes that must be free before planning */

struct lbr_transform {
  size_t points;
  bool is_complex;
  fftw_plan forward, back;
  size_t users;       /* how many hold the plan */
  bool forgotten;     /* not in the cache: the last user frees it */
  lbr_transform *next;
};

/* The one piece of varying state of the core; newest plan first. */
static pthread_mutex_t lock = PTHREAD_MUTEX_INITIALIZER;
static lbr_transform *cache;
static size_t forgotten; /* plans in use that are not in the cache */

/* Large pages for large buffers: first writes cost a tenth.  Only a hint. */
static void advise(void *data, size_t bytes) {
  uintptr_t from = ((uintptr_t)data + HUGE_PAGE - 1) & ~(HUGE_PAGE - 1);
  uintptr_t to = ((uintptr_t)data + bytes) & ~(HUGE_PAGE - 1);
  if (to > from) (void)madvise((void *)from, to - from, MADV_HUGEPAGE);
}

double *lbr_transform_unset(size_t count) {
  size_t bytes;
  if (lbr_size(count ? count : 1, sizeof(double), &bytes) != LBR_OK)
    return NULL;
  double *buffer = fftw_malloc(bytes);
  if (buffer) advise(buffer, bytes);
  return buffer;
}

double *lbr_transform_buffer(size_t count) {
  double *buffer = lbr_transform_unset(count);
  if (buffer) memset(buffer, 0, (count ? count : 1) * sizeof *buffer);
  return buffer;
}

void lbr_transform_drop(void *buffer) { fftw_free(buffer); }

static void free_plan(lbr_transform *t) {
  if (t->forward) fftw_destroy_plan(t->forward);
  if (t->back) fftw_destroy_plan(t->back);
  free(t);
}

static void plan_real(lbr_transform *t, double *x, double *bins) {
  int n = (int)t->points;
  t->forward = fftw_plan_dft_r2c_1d(n, x, (fftw_complex *)bins,
                                    FFTW_ESTIMATE | FFTW_PRESERVE_INPUT);
  t->back = fftw_plan_dft_c2r_1d(n, (fftw_complex *)bins, x,
                                 FFTW_ESTIMATE | FFTW_DESTROY_INPUT);
}

/* Planning on scratch of our own; the lock is held. */
static lbr_status make_plan(size_t n, bool is_complex, lbr_transform **out) {
  lbr_transform *t = lbr_alloc(1, sizeof *t);
  double *x = lbr_transform_buffer(2 * n);
  double *bins = lbr_transform_buffer(2 * n + 2);
  void *headroom = malloc(HEADROOM);
  free(headroom);
  lbr_status status = LBR_NO_MEMORY;
  if (!t || !x || !bins || !headroom) goto done;
  t->points = n;
  t->is_complex = is_complex;
  if (is_complex)
    t->forward = fftw_plan_dft_1d((int)n, (fftw_complex *)x,
                                  (fftw_complex *)bins, FFTW_FORWARD,
                                  FFTW_ESTIMATE | FFTW_PRESERVE_INPUT);
  else
    plan_real(t, x, bins);
  if (t->forward && (t->back || is_complex)) status = LBR_OK;
done:
  lbr_transform_drop(x);
  lbr_transform_drop(bins);
  if (status == LBR_OK)
    *out = t;
  else if (t)
    free_plan(t);
  return status;
}

static lbr_transform *find_plan(size_t n, bool is_complex) {
  for (lbr_transform *t = cache; t; t = t->next)
    if (t->points == n && t->is_complex == is_complex) return t;
  return NULL;
}

/* Keeps the newest idle plans only; the lock is held. */
static void trim(size_t keep) {
  size_t idle = 0;
  for (lbr_transform **at = &cache; *at;) {
    lbr_transform *t = *at;
    if (t->users == 0 && ++idle > keep) {
      *at = t->next;
      free_plan(t);
    } else {
      at = &t->next;
    }
  }
}

static lbr_status get(size_t n, bool is_complex, lbr_transform **out) {
  if (n < 1 || n > LBR_TRANSFORM_MOST) return LBR_DOMAIN;
  lbr_status status = LBR_OK;
  pthread_mutex_lock(&lock);
  lbr_transform *t = find_plan(n, is_complex);
  if (!t) {
    status = make_plan(n, is_complex, &t);
    if (status == LBR_OK) {
      t->next = cache;
      cache = t;
    }
  }
  if (status == LBR_OK) {
    t->users++;
    *out = t;
  }
  pthread_mutex_unlock(&lock);
  return status;
}

lbr_status lbr_transform_get(size_t n, lbr_transform **out) {
  return get(n, false, out);
}

lbr_status lbr_transform_get_complex(size_t n, lbr_transform **out) {
  return get(n, true, out);
}

void lbr_transform_put(lbr_transform *t) {
  if (!t) return;
  pthread_mutex_lock(&lock);
  if (--t->users == 0) {
    if (t->forgotten) {
      free_plan(t);
      forgotten--;
    } else {
      trim(IDLE_PLANS);
    }
  }
  pthread_mutex_unlock(&lock);
}

/* Takes the plans of n points from the cache; the lock is held. */
static void drop_plans(size_t n) {
  for (lbr_transform **at = &cache; *at;) {
    lbr_transform *t = *at;
    if (t->points != n || t->is_complex) {
      at = &t->next;
      continue;
    }
    *at = t->next;
    if (t->users == 0) {
      free_plan(t);
    } else {
      t->forgotten = true;
      forgotten++;
    }
  }
}

lbr_status lbr_transform_tune(size_t n) {
  if (n < 1 || n > LBR_TRANSFORM_MOST) return LBR_DOMAIN;
  double *x = lbr_transform_buffer(n);
  double *bins = lbr_transform_buffer(2 * (n / 2 + 1));
  void *headroom = malloc(HEADROOM);
  free(headroom);
  lbr_status status = LBR_NO_MEMORY;
  if (x && bins && headroom) {
    pthread_mutex_lock(&lock);
    /* What is learnt here is used by plans that are only estimated, too. */
    fftw_plan plan = fftw_plan_dft_r2c_1d((int)n, x, (fftw_complex *)bins,
                                          FFTW_MEASURE | FFTW_PRESERVE_INPUT);
    if (plan) {
      fftw_destroy_plan(plan);
      drop_plans(n);
      status = LBR_OK;
    }
    pthread_mutex_unlock(&lock);
  }
  lbr_transform_drop(x);
  lbr_transform_drop(bins);
  return status;
}

void lbr_transform_forget(void) {
  pthread_mutex_lock(&lock);
  trim(0);
  for (lbr_transform *t = cache; t; t = t->next, forgotten++)
    t->forgotten = true;
  cache = NULL;
  if (forgotten == 0)
    fftw_cleanup();
  else
    fftw_forget_wisdom(); /* what was tuned; plans in use live on */
  pthread_mutex_unlock(&lock);
}

size_t lbr_transform_points(const lbr_transform *t) { return t->points; }

void lbr_transform_forward(const lbr_transform *t, double *x,
                           double complex *bins) {
  fftw_execute_dft_r2c(t->forward, x, (fftw_complex *)bins);
}

void lbr_transform_complex(const lbr_transform *t, double complex *x,
                           double complex *bins) {
  fftw_execute_dft(t->forward, (fftw_complex *)x, (fftw_complex *)bins);
}

void lbr_transform_back(const lbr_transform *t, double complex *bins,
                        double *x) {
  fftw_execute_dft_c2r(t->back, (fftw_complex *)bins, x);
  double scale = 1.0 / (double)t->points;
  for (size_t i = 0; i < t->points; i++) x[i] *= scale;
}

void lbr_transform_windowed(const lbr_transform *t, const double *x,
                            const double *w, size_t n, double *scratch,
                            double complex *bins) {
  if (w)
    for (size_t i = 0; i < n; i++) scratch[i] = w[i] * x[i];
  else
    memcpy(scratch, x, n * sizeof *x);
  memset(scratch + n, 0, (t->points - n) * sizeof *scratch);
  lbr_transform_forward(t, scratch, bins);
}

static bool is_fast(size_t n) {
  static const size_t primes[] = {2, 3, 5};
  for (size_t i = 0; i < 3; i++)
    while (n % primes[i] == 0) n /= primes[i];
  return n == 1;
}

size_t lbr_transform_fast_length(size_t n) {
  if (n < 1) n = 1;
  while (!is_fast(n)) n++;
  return n;
}
