/* Numbers in columns of fixed width in a text file, as Fortran writes them.
 */
#ifndef LBR_STORE_COLUMNS_H
#define LBR_STORE_COLUMNS_H

#include <stddef.h>
#include <stdint.h>

#include "base/status.h"
#include "samples/feed.h"
#include "store/why.h"

#define LBR_COLUMNS_MOST_LINE 1024 /* bytes of a line, its end included */

typedef struct lbr_columns lbr_columns; /* an open file */

/* One channel: its numbers stand one after the other, line by line. */
typedef struct lbr_columns_channel {
  int64_t at;      /* byte offset of its first line */
  size_t width;    /* characters of a number, 1 .. 64 */
  size_t per_line; /* numbers in a line */
  size_t line;     /* bytes from line to line, at least width * per_line + 1 */
} lbr_columns_channel;

/* Opens a file with `samples` numbers of every channel.  LBR_IO: cannot be
 * opened; LBR_FORMAT: some are not there; the reason is left in *why. */
LBR_CHECKED lbr_status lbr_columns_open(const char *path,
                                        const lbr_columns_channel *channel,
                                        size_t channels, int64_t samples,
                                        lbr_columns **out, lbr_why *why);

/* A feed of the numbers; it ends with the file.  LBR_FORMAT where a column is
 * no number, or a line does not end where it should. */
lbr_feed lbr_columns_feed(lbr_columns *columns);

/* Closes and frees; NULL is allowed. */
void lbr_columns_close(lbr_columns *columns);

#endif
