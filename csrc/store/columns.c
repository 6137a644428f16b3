#include "store/columns.h"

#include <stdbool.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/checked.h"
#include "base/decimal.h"
#include "store/file.h"

#define BUFFER 65536

struct lbr_columns {
  int fd;
  size_t channels;
  int64_t samples;
  lbr_columns_channel *channel;
};

/* The last number of a channel ends inside the file. */
static bool is_there(const lbr_columns_channel *c, int64_t samples,
                     int64_t bytes) {
  int64_t lines, span, end;
  if (samples == 0) return true;
  lines = (samples - 1) / (int64_t)c->per_line;
  int64_t rest = (samples - 1) % (int64_t)c->per_line + 1;
  return !__builtin_mul_overflow(lines, (int64_t)c->line, &span) &&
         !__builtin_add_overflow(span, c->at, &end) &&
         !__builtin_add_overflow(end, rest * (int64_t)c->width, &end) &&
         end <= bytes;
}

static bool is_sound(const lbr_columns_channel *c) {
  return c->at >= 0 && c->width >= 1 && c->width <= 64 && c->per_line >= 1 &&
         c->line <= LBR_COLUMNS_MOST_LINE && c->per_line < c->line &&
         c->width * c->per_line < c->line;
}

lbr_status lbr_columns_open(const char *path,
                            const lbr_columns_channel *channel,
                            size_t channels, int64_t samples,
                            lbr_columns **out, lbr_why *why) {
  int fd = -1;
  int64_t bytes = 0;
  for (size_t k = 0; k < channels; k++)
    if (!is_sound(&channel[k]))
      return lbr_because(why, LBR_FORMAT, "has lines that are no columns");
  lbr_status status = lbr_file_open(path, &fd, &bytes, why);
  if (status != LBR_OK) return status;
  lbr_columns *c = lbr_alloc(1, sizeof *c);
  lbr_columns_channel *list = lbr_alloc(channels, sizeof *list);
  if (!c || !list) {
    free(c);
    free(list);
    close(fd);
    return lbr_because(why, LBR_NO_MEMORY, "does not fit memory");
  }
  memcpy(list, channel, channels * sizeof *list);
  *c = (lbr_columns){fd, channels, samples, list};
  for (size_t k = 0; k < channels; k++)
    if (!is_there(&list[k], samples, bytes)) {
      lbr_columns_close(c);
      return lbr_because(why, LBR_FORMAT, "is shorter than %lld numbers of "
                         "channel %zu", (long long)samples, k + 1);
    }
  *out = c;
  return LBR_OK;
}

void lbr_columns_close(lbr_columns *c) {
  if (!c) return;
  close(c->fd);
  free(c->channel);
  free(c);
}

/* A number between blanks, alone in its column; 'D' is an exponent, too. */
static bool take(const char *p, size_t width, double *out) {
  char copy[64];
  memcpy(copy, p, width);
  const char *from = copy, *end = copy + width;
  for (size_t i = 0; i < width; i++)
    if (copy[i] == 'D' || copy[i] == 'd') copy[i] = 'E';
  while (from < end && *from == ' ') from++;
  while (end > from && end[-1] == ' ') end--;
  return lbr_decimal(from, end, out) == end;
}

/* Numbers first .. of the lines in the buffer, until `count` are there. */
static bool take_lines(const lbr_columns_channel *c, const char *bytes,
                       size_t skip, size_t count, double *out) {
  for (size_t i = 0; i < count; i++) {
    size_t at = skip + i, column = at % c->per_line;
    const char *line = bytes + at / c->per_line * c->line;
    if (!take(line + column * c->width, c->width, out + i)) return false;
    if (column + 1 == c->per_line && i + 1 < count && line[c->line - 1] != '\n')
      return false;
  }
  return true;
}

static lbr_status read_channel(const lbr_columns *c, size_t k, int64_t first,
                               size_t count, double *out) {
  const lbr_columns_channel *ch = &c->channel[k];
  char buffer[BUFFER];
  size_t lines = BUFFER / ch->line;
  for (size_t done = 0; done < count;) {
    int64_t next = first + (int64_t)done;
    size_t skip = (size_t)(next % (int64_t)ch->per_line);
    size_t room = lines * ch->per_line - skip;
    size_t n = count - done < room ? count - done : room;
    size_t last = skip + n - 1; /* of the buffer */
    size_t bytes = last / ch->per_line * ch->line +
                   (last % ch->per_line + 1) * ch->width;
    int64_t at = ch->at + next / (int64_t)ch->per_line * (int64_t)ch->line;
    lbr_status status = lbr_file_read(c->fd, at, buffer, bytes);
    if (status != LBR_OK) return status;
    if (!take_lines(ch, buffer, skip, n, out + done)) return LBR_FORMAT;
    done += n;
  }
  return LBR_OK;
}

static lbr_status read_columns(void *context, int64_t first, size_t count,
                               size_t wanted, const int *channel,
                               double *const *out) {
  const lbr_columns *c = context;
  for (size_t k = 0; k < wanted; k++) {
    lbr_status status = read_channel(c, (size_t)channel[k], first, count,
                                     out[k]);
    if (status != LBR_OK) return status;
  }
  return LBR_OK;
}

lbr_feed lbr_columns_feed(lbr_columns *c) {
  return (lbr_feed){.context = c, .channels = c->channels,
                    .samples = c->samples, .is_parallel = true,
                    .read = read_columns};
}
