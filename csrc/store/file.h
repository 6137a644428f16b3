/* Opening files that are only read, and reading parts of them.
 */
#ifndef LBR_STORE_FILE_H
#define LBR_STORE_FILE_H

#include <stddef.h>
#include <stdint.h>

#include "base/status.h"
#include "store/why.h"

/* Opens a regular file for reading (nothing waits for a FIFO).  On success
 * the descriptor is the caller's to close. */
LBR_CHECKED lbr_status lbr_file_open(const char *path, int *fd, int64_t *bytes,
                                     lbr_why *why);

/* n bytes from offset `at`; LBR_FORMAT when the file is shorter, LBR_IO when
 * the system refuses. */
LBR_CHECKED lbr_status lbr_file_read(int fd, int64_t at, void *to, size_t n);

#endif
