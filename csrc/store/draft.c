#include "store/draft.h"

#include <errno.h>
#include <fcntl.h>
#include <limits.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/checked.h"

#define MOST_TRIES 100
#define BUFFER 262144

struct lbr_draft {
  char *path, *name; /* of the file and of the temporary one */
  int fd;
  bool exists; /* the temporary file is there to be removed */
  size_t used; /* bytes of the buffer */
  char buffer[BUFFER];
};

/* Only a file may be replaced: never a device, a directory or a link. */
static lbr_status check_target(const char *path, lbr_why *why) {
  struct stat facts;
  if (lstat(path, &facts) == 0) return lbr_regular(&facts, why);
  return errno == ENOENT ? LBR_OK : lbr_because_errno(why, errno);
}

static lbr_status create(lbr_draft *d, const char *path, lbr_why *why) {
  size_t length = strlen(path), room = length + 48;
  d->path = lbr_alloc(length + 1, 1);
  d->name = lbr_alloc(room, 1);
  if (!d->path || !d->name)
    return lbr_because(why, LBR_NO_MEMORY, "does not fit memory");
  memcpy(d->path, path, length + 1);
  for (int i = 0; i < MOST_TRIES; i++) {
    snprintf(d->name, room, "%s.%ld-%d.part", path, (long)getpid(), i);
    d->fd = open(d->name, O_RDWR | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
    d->exists = d->fd >= 0;
    if (d->exists || errno != EEXIST) break;
  }
  return d->exists ? LBR_OK : lbr_because_errno(why, errno);
}

lbr_status lbr_draft_open(const char *path, lbr_draft **out, lbr_why *why) {
  lbr_status status = check_target(path, why);
  if (status != LBR_OK) return status;
  lbr_draft *d = lbr_alloc(1, sizeof *d);
  if (!d) return lbr_because(why, LBR_NO_MEMORY, "does not fit memory");
  d->fd = -1;
  status = create(d, path, why);
  if (status != LBR_OK) {
    lbr_draft_drop(d);
    return status;
  }
  *out = d;
  return LBR_OK;
}

int lbr_draft_fd(const lbr_draft *d) { return d->fd; }

const char *lbr_draft_name(const lbr_draft *d) { return d->name; }

static lbr_status flush(lbr_draft *d, lbr_why *why) {
  const char *next = d->buffer;
  while (d->used > 0) {
    ssize_t wrote = write(d->fd, next, d->used);
    if (wrote < 0 && errno == EINTR) continue;
    if (wrote < 0) return lbr_because_errno(why, errno);
    next += wrote;
    d->used -= (size_t)wrote;
  }
  return LBR_OK;
}

lbr_status lbr_draft_put(lbr_draft *d, const void *bytes, size_t n,
                         lbr_why *why) {
  const char *from = bytes;
  while (n > 0) {
    size_t room = BUFFER - d->used, part = n < room ? n : room;
    memcpy(d->buffer + d->used, from, part);
    d->used += part;
    from += part;
    n -= part;
    if (d->used < BUFFER) continue;
    lbr_status status = flush(d, why);
    if (status != LBR_OK) return status;
  }
  return LBR_OK;
}

/* The directory's entry must reach the disk too; a file system that cannot do
 * that for a directory says EINVAL, which is no failure of ours. */
static lbr_status sync_directory(const char *path, lbr_why *why) {
  char name[PATH_MAX];
  const char *slash = strrchr(path, '/');
  size_t n = slash ? (size_t)(slash - path) : 0;
  if (n >= sizeof name) return lbr_because_errno(why, ENAMETOOLONG);
  memcpy(name, path, n);
  name[n] = '\0';
  const char *directory = !slash ? "." : n ? name : "/";
  int fd = open(directory, O_RDONLY | O_DIRECTORY | O_CLOEXEC);
  if (fd < 0) return LBR_OK; /* writable but not readable: nothing to be had */
  int number = fsync(fd) == 0 || errno == EINVAL ? 0 : errno;
  close(fd);
  return number ? lbr_because_errno(why, number) : LBR_OK;
}

lbr_status lbr_draft_finish(lbr_draft *d, lbr_why *why) {
  lbr_status status = flush(d, why);
  if (status != LBR_OK) return status;
  if (fsync(d->fd) != 0) return lbr_because_errno(why, errno);
  if (rename(d->name, d->path) != 0) return lbr_because_errno(why, errno);
  d->exists = false;
  return sync_directory(d->path, why);
}

void lbr_draft_drop(lbr_draft *d) {
  if (!d) return;
  if (d->fd >= 0) close(d->fd);
  if (d->exists) unlink(d->name);
  free(d->name);
  free(d->path);
  free(d);
}
