/* Rows of numbers in a text file: counted first, then read from any row on,
 * in bounded memory and by several threads.
 *
 * Numbers have '.' as the point in every locale and are read to the last bit;
 * "nan", "inf" and "-inf" are numbers, too.  A number may stand in quotes (RFC
 * 4180) and between blanks.  Every row has the same number of columns.
 */
#ifndef LBR_STORE_ROWS_H
#define LBR_STORE_ROWS_H

#include <stddef.h>
#include <stdint.h>

#include "base/status.h"
#include "samples/feed.h"
#include "store/why.h"

#define LBR_ROWS_MOST_COLUMNS 4096
#define LBR_ROWS_MOST_LINE 65536 /* bytes of a row, its line feed included */

typedef struct lbr_rows lbr_rows; /* an open file */

typedef struct lbr_rows_spec {
  int64_t data_at;    /* byte offset of the first row */
  int64_t first_line; /* number of its line, from 1, for messages */
  size_t columns;     /* 1 .. LBR_ROWS_MOST_COLUMNS */
  char separator;     /* ',', ';', '\t' */
} lbr_rows_spec;

/* Opens a file and counts its rows; blank lines at the end are none.  LBR_IO
 * and LBR_FORMAT with the reason in *why. */
LBR_CHECKED lbr_status lbr_rows_open(const char *path,
                                     const lbr_rows_spec *spec, lbr_rows **out,
                                     int64_t *count, lbr_why *why);

/* A feed whose channels are the columns; it ends with the file.  A row that
 * is no row of numbers is LBR_FORMAT, with its line in the words. */
lbr_feed lbr_rows_feed(lbr_rows *rows);

/* Closes and frees; NULL is allowed. */
void lbr_rows_close(lbr_rows *rows);

#endif
