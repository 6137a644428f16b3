/* A file that is written whole or not at all: a temporary file beside it,
 * filled, flushed to the disk, and renamed over the name.
 */
#ifndef LBR_STORE_DRAFT_H
#define LBR_STORE_DRAFT_H

#include <stddef.h>

#include "base/status.h"
#include "store/why.h"

typedef struct lbr_draft lbr_draft;

/* Starts a draft of the file `path`, which may be there already if it is a
 * regular file.  Nothing is seen under that name before lbr_draft_finish. */
LBR_CHECKED lbr_status lbr_draft_open(const char *path, lbr_draft **out,
                                      lbr_why *why);

/* The open descriptor of the temporary file; it stays the draft's. */
int lbr_draft_fd(const lbr_draft *draft);

/* The name of the temporary file. */
const char *lbr_draft_name(const lbr_draft *draft);

/* Appends n bytes. */
LBR_CHECKED lbr_status lbr_draft_put(lbr_draft *draft, const void *bytes,
                                     size_t n, lbr_why *why);

/* Flushes to the disk and renames; then only lbr_draft_drop is left. */
LBR_CHECKED lbr_status lbr_draft_finish(lbr_draft *draft, lbr_why *why);

/* Frees, and removes the temporary file of a draft that was not finished;
 * NULL is allowed. */
void lbr_draft_drop(lbr_draft *draft);

#endif
