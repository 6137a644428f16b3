#define _XOPEN_SOURCE 700 /* names of file kinds */
#include "store/why.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

lbr_status lbr_because(lbr_why *why, lbr_status status, const char *format,
                       ...) {
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(why->text, sizeof why->text, format, arguments);
  va_end(arguments);
  return status;
}

lbr_status lbr_because_errno(lbr_why *why, int number) {
  char words[128];
  if (strerror_r(number, words, sizeof words) != 0)
    snprintf(words, sizeof words, "error %d", number);
  return lbr_because(why, LBR_IO, "%s", words);
}

lbr_status lbr_regular(const struct stat *facts, lbr_why *why) {
  static const struct {
    mode_t kind;
    const char *words;
  } rows[] = {
      {S_IFDIR, "is a directory"},        {S_IFIFO, "is a FIFO"},
      {S_IFSOCK, "is a socket"},          {S_IFCHR, "is a character device"},
      {S_IFBLK, "is a block device"},     {S_IFLNK, "is a symbolic link"},
  };
  if (S_ISREG(facts->st_mode)) return LBR_OK;
  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++)
    if ((facts->st_mode & S_IFMT) == rows[i].kind)
      return lbr_because(why, LBR_IO, "%s, not a file", rows[i].words);
  return lbr_because(why, LBR_IO, "is not a regular file");
}
