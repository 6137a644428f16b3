/* Why a file was refused, in words that can follow its name.
 */
#ifndef LBR_STORE_WHY_H
#define LBR_STORE_WHY_H

#include <sys/stat.h>

#include "base/status.h"

typedef struct lbr_why {
  char text[192]; /* "is a directory"; never empty after a refusal */
} lbr_why;

/* Fills the text and returns the status, so that a refusal is one line. */
__attribute__((format(printf, 3, 4))) lbr_status
lbr_because(lbr_why *why, lbr_status status, const char *format, ...);

/* The words for an errno value; LBR_IO. */
lbr_status lbr_because_errno(lbr_why *why, int number);

/* LBR_OK for a regular file; otherwise says what it is instead. */
LBR_CHECKED lbr_status lbr_regular(const struct stat *facts, lbr_why *why);

#endif
