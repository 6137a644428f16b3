#define _GNU_SOURCE /* sched_getaffinity */
#include "base/workers.h"

#include <pthread.h>
#include <sched.h>
#include <signal.h>
#include <stdatomic.h>

#define MOST_WORKERS 256

typedef struct job {
  lbr_task run;
  void *context;
  size_t tasks;
  atomic_size_t next; /* the next task to hand out */
  pthread_mutex_t lock;
  size_t failed_task; /* lowest failing task so far, or `tasks` */
  lbr_status status;
} job;

typedef struct seat {
  job *job;
  unsigned worker;
} seat;

unsigned lbr_cores(void) {
  cpu_set_t set;
  if (sched_getaffinity(0, sizeof set, &set) != 0) return 1;
  int count = CPU_COUNT(&set);
  return count > 0 ? (unsigned)count : 1;
}

static void record_failure(job *j, size_t task, lbr_status status) {
  pthread_mutex_lock(&j->lock);
  if (task < j->failed_task) {
    j->failed_task = task;
    j->status = status;
  }
  pthread_mutex_unlock(&j->lock);
  atomic_store(&j->next, j->tasks);
}

static void *work(void *argument) {
  const seat *s = argument;
  job *j = s->job;
  for (;;) {
    size_t task = atomic_fetch_add(&j->next, 1);
    if (task >= j->tasks) return NULL;
    lbr_status status = j->run(j->context, task, s->worker);
    if (status != LBR_OK) record_failure(j, task, status);
  }
}

/* Signals belong to the host's own thread, not to ours. */
static unsigned start_threads(seat *seats, pthread_t *threads,
                              unsigned count) {
  sigset_t all, before;
  unsigned started = 0;
  sigfillset(&all);
  pthread_sigmask(SIG_SETMASK, &all, &before);
  while (started < count && pthread_create(&threads[started], NULL, work,
                                           &seats[started + 1]) == 0)
    started++;
  pthread_sigmask(SIG_SETMASK, &before, NULL);
  return started;
}

lbr_status lbr_workers_run(lbr_task run, void *context, size_t tasks,
                           unsigned workers) {
  seat seats[MOST_WORKERS];
  pthread_t threads[MOST_WORKERS];
  job j = {.run = run, .context = context, .tasks = tasks,
           .failed_task = tasks, .status = LBR_OK};
  if (workers == 0) workers = lbr_cores();
  if (workers > MOST_WORKERS) workers = MOST_WORKERS;
  if (workers > tasks) workers = tasks ? (unsigned)tasks : 1;
  atomic_init(&j.next, 0);
  if (pthread_mutex_init(&j.lock, NULL) != 0) return LBR_NO_MEMORY;
  for (unsigned i = 0; i < workers; i++) seats[i] = (seat){&j, i};
  unsigned started = start_threads(seats, threads, workers - 1);
  work(&seats[0]);
  for (unsigned i = 0; i < started; i++) pthread_join(threads[i], NULL);
  pthread_mutex_destroy(&j.lock);
  return j.status;
}
