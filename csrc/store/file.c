#include "store/file.h"

#include <errno.h>
#include <fcntl.h>
#include <unistd.h>

lbr_status lbr_file_open(const char *path, int *fd, int64_t *bytes,
                         lbr_why *why) {
  struct stat facts;
  int file = open(path, O_RDONLY | O_NONBLOCK | O_CLOEXEC);
  if (file < 0) return lbr_because_errno(why, errno);
  lbr_status status = fstat(file, &facts) == 0
                          ? lbr_regular(&facts, why)
                          : lbr_because_errno(why, errno);
  if (status != LBR_OK) {
    close(file);
    return status;
  }
  *fd = file;
  *bytes = (int64_t)facts.st_size;
  return LBR_OK;
}

lbr_status lbr_file_read(int fd, int64_t at, void *to, size_t n) {
  unsigned char *next = to;
  while (n > 0) {
    ssize_t got = pread(fd, next, n, (off_t)at);
    if (got < 0 && errno == EINTR) continue;
    if (got < 0) return LBR_IO;
    if (got == 0) return LBR_FORMAT;
    next += got;
    at += got;
    n -= (size_t)got;
  }
  return LBR_OK;
}
