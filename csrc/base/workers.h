/* Worker threads: run one function over task numbers on several cores.
 *
 * Threads live only for the call (a forked child never finds threads that it
 * does not have), take tasks from a shared counter, and therefore must write
 * results by task number: the answer may not depend on who did what.
 */
#ifndef LBR_BASE_WORKERS_H
#define LBR_BASE_WORKERS_H

#include <stddef.h>

#include "base/status.h"

/* One task; a status other than LBR_OK stops the hand-out of further tasks.
 * worker is 0 .. workers - 1, for workspaces that belong to one thread. */
typedef lbr_status (*lbr_task)(void *context, size_t task, unsigned worker);

/* Cores this process may use, at least 1. */
unsigned lbr_cores(void);

/* Runs tasks 0 .. tasks - 1 on at most `workers` threads (0: one per core; the
 * calling thread is one of them).  Returns the status of the lowest-numbered
 * failing task.  Where a thread cannot be started the others do the work. */
LBR_CHECKED lbr_status lbr_workers_run(lbr_task run, void *context,
                                       size_t tasks, unsigned workers);

#endif
