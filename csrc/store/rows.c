#include "store/rows.h"

#include <math.h>
#include <pthread.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/checked.h"
#include "base/decimal.h"
#include "base/workers.h"
#include "store/file.h"

#define PIECE 131072 /* bytes whose line starts are counted together */
#define HOT __attribute__((target_clones("avx512f", "avx2", "default")))

struct lbr_rows {
  int fd;
  int64_t from, end; /* bytes of the rows, without blank lines at the end */
  lbr_rows_spec spec;
  size_t pieces;
  int64_t *row;      /* pieces + 1: rows that start before each piece */
  pthread_mutex_t lock; /* of what follows */
  lbr_why why;       /* what failed last */
  int64_t why_row;   /* its row; -1: nothing failed */
};

/* Bytes of a piece and what a row that starts in it may have beyond. */
typedef struct window {
  char bytes[1 + PIECE + LBR_ROWS_MOST_LINE];
  const char *start, *stop; /* rows start at start .. stop - 1 */
  const char *end;          /* of the bytes that are there */
  bool is_last;             /* the file ends at `end` */
} window;

HOT static int64_t count_feeds(const char *p, size_t n) {
  int64_t count = 0;
  for (size_t i = 0; i < n; i++) count += p[i] == '\n';
  return count;
}

static int64_t piece_from(const lbr_rows *r, size_t piece) {
  return r->from + (int64_t)piece * PIECE;
}

static int64_t piece_end(const lbr_rows *r, size_t piece) {
  int64_t end = piece_from(r, piece) + PIECE;
  return end < r->end ? end : r->end;
}

/* A row starts behind each line feed but the file's last, and the first row
 * at the front. */
static lbr_status count_piece(void *context, size_t piece, unsigned worker) {
  lbr_rows *r = context;
  char bytes[PIECE + 1];
  (void)worker;
  int64_t from = piece_from(r, piece) - (piece > 0);
  size_t n = (size_t)(piece_end(r, piece) - 1 - from);
  lbr_status status = lbr_file_read(r->fd, from, bytes, n);
  if (status == LBR_OK)
    r->row[piece + 1] = count_feeds(bytes, n) + (piece == 0);
  return status;
}

/* Blanks and line ends behind the last row are none of it. */
static lbr_status trim(lbr_rows *r) {
  char bytes[4096];
  while (r->end > r->from) {
    int64_t n = r->end - r->from < 4096 ? r->end - r->from : 4096;
    lbr_status status = lbr_file_read(r->fd, r->end - n, bytes, (size_t)n);
    if (status != LBR_OK) return status;
    int64_t left = n;
    while (left > 0 && memchr("\r\n ", bytes[left - 1], 3)) left--;
    r->end -= n - left;
    if (left > 0) break;
  }
  return LBR_OK;
}

static lbr_status count_rows(lbr_rows *r, lbr_why *why) {
  lbr_status status = trim(r);
  if (status != LBR_OK) return lbr_because(why, status, "cannot be read");
  r->pieces = (size_t)((r->end - r->from + PIECE - 1) / PIECE);
  r->row = lbr_alloc(r->pieces + 1, sizeof *r->row);
  if (!r->row) return lbr_because(why, LBR_NO_MEMORY, "does not fit memory");
  status = lbr_workers_run(count_piece, r, r->pieces, r->pieces < 8 ? 1 : 0);
  if (status != LBR_OK)
    return lbr_because(why, status, "became shorter while it was read");
  for (size_t i = 0; i < r->pieces; i++) r->row[i + 1] += r->row[i];
  return LBR_OK;
}

lbr_status lbr_rows_open(const char *path, const lbr_rows_spec *spec,
                         lbr_rows **out, int64_t *count, lbr_why *why) {
  int fd = -1;
  int64_t bytes = 0;
  lbr_status status = lbr_file_open(path, &fd, &bytes, why);
  if (status != LBR_OK) return status;
  lbr_rows *r = lbr_alloc(1, sizeof *r);
  if (!r || pthread_mutex_init(&r->lock, NULL) != 0) {
    free(r);
    close(fd);
    return lbr_because(why, LBR_NO_MEMORY, "does not fit memory");
  }
  r->fd = fd;
  r->spec = *spec;
  r->from = spec->data_at < bytes ? spec->data_at : bytes;
  r->end = bytes;
  r->why_row = -1;
  status = count_rows(r, why);
  if (status != LBR_OK) {
    lbr_rows_close(r);
    return status;
  }
  *count = r->row[r->pieces];
  *out = r;
  return LBR_OK;
}

void lbr_rows_close(lbr_rows *r) {
  if (!r) return;
  close(r->fd);
  free(r->row);
  pthread_mutex_destroy(&r->lock);
  free(r);
}

/* Keeps the words of the failure that stands first in the file. */
static lbr_status failed(lbr_rows *r, int64_t row, lbr_status status,
                         const char *words, size_t column, const char *text,
                         size_t n) {
  int64_t line = r->spec.first_line + row;
  pthread_mutex_lock(&r->lock);
  if (r->why_row < 0 || row <= r->why_row) {
    r->why_row = row;
    if (text)
      lbr_because(&r->why, status, "line %lld, column %zu: \"%.*s\" %s",
                  (long long)line, column + 1, n > 24 ? 24 : (int)n, text,
                  words);
    else
      lbr_because(&r->why, status, "line %lld %s; there are %zu columns",
                  (long long)line, words, r->spec.columns);
  }
  pthread_mutex_unlock(&r->lock);
  return status;
}

static const char *why_of(void *context) {
  lbr_rows *r = context;
  return r->why_row < 0 ? NULL : r->why.text;
}

static const char *skip_blanks(const char *p, const char *end) {
  while (p < end && *p == ' ') p++;
  return p;
}

static const char *special(const char *p, const char *end, double *out) {
  static const struct {
    const char *word;
    double value;
  } rows[] = {{"nan", NAN}, {"inf", INFINITY}, {"-inf", -INFINITY},
              {"NaN", NAN}};
  for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
    size_t n = strlen(rows[i].word);
    if ((size_t)(end - p) >= n && memcmp(p, rows[i].word, n) == 0) {
      *out = rows[i].value;
      return p + n;
    }
  }
  return NULL;
}

/* One field, to the separator behind it or the end of the line; NULL: none. */
static const char *take_field(const char *p, const char *end, double *out) {
  bool quoted = false;
  p = skip_blanks(p, end);
  if (p < end && *p == '"') {
    quoted = true;
    p = skip_blanks(p + 1, end);
  }
  const char *next = lbr_decimal(p, end, out);
  if (!next) next = special(p, end, out);
  if (!next) return NULL;
  next = skip_blanks(next, end);
  if (quoted) {
    if (next == end || *next != '"') return NULL;
    next = skip_blanks(next + 1, end);
  }
  return next;
}

static lbr_status bad_field(lbr_rows *r, int64_t row, size_t column,
                            const char *p, const char *end) {
  const char *stop = memchr(p, r->spec.separator, (size_t)(end - p));
  size_t n = (size_t)((stop ? stop : end) - p);
  const char *words = "is no number (a point between the digits, no blanks)";
  if (n > 0 && p[n - 1] == '\r') n--;
  if (memchr(p, ',', n))
    words = "has a decimal comma; numbers are written with a point here";
  return failed(r, row, LBR_FORMAT, words, column, p, n);
}

/* A line p .. end - 1 into to[column][at], where that is wanted. */
static lbr_status take_row(lbr_rows *r, int64_t row, const char *p,
                           const char *end, double *const *to, size_t at) {
  size_t last = r->spec.columns - 1;
  if (end > p && end[-1] == '\r') end--;
  for (size_t column = 0; column <= last; column++) {
    double value;
    const char *next = take_field(p, end, &value);
    if (!next) return bad_field(r, row, column, p, end);
    if (to[column]) to[column][at] = value;
    if (next == end) {
      if (column == last) return LBR_OK;
      return failed(r, row, LBR_FORMAT, "has too few fields", 0, NULL, 0);
    }
    if (*next != r->spec.separator) return bad_field(r, row, column, p, end);
    p = next + 1;
  }
  return failed(r, row, LBR_FORMAT, "has too many fields", 0, NULL, 0);
}

static lbr_status fill(const lbr_rows *r, size_t piece, window *w) {
  int64_t from = piece_from(r, piece) - (piece > 0);
  int64_t stop = piece_end(r, piece), end = stop + LBR_ROWS_MOST_LINE;
  if (end > r->end) end = r->end;
  lbr_status status = lbr_file_read(r->fd, from, w->bytes,
                                    (size_t)(end - from));
  if (status != LBR_OK) return status;
  w->start = w->bytes;
  w->stop = w->bytes + (stop - from);
  w->end = w->bytes + (end - from);
  w->is_last = end == r->end;
  if (piece > 0) {
    const char *line = memchr(w->start, '\n', (size_t)(w->stop - w->start));
    w->start = line ? line + 1 : w->stop;
  }
  return LBR_OK;
}

typedef struct job {
  lbr_rows *rows;
  size_t piece;       /* of task 0 */
  int64_t first, end; /* rows wanted */
  double *const *to;  /* by column; NULL: not wanted */
} job;

static lbr_status read_piece(void *context, size_t task, unsigned worker) {
  const job *j = context;
  lbr_rows *r = j->rows;
  window w;
  (void)worker;
  int64_t row = r->row[j->piece + task];
  lbr_status status = fill(r, j->piece + task, &w);
  if (status != LBR_OK)
    return failed(r, row, status, "cannot be read", 0, NULL, 0);
  for (const char *p = w.start; p < w.stop && row < j->end; row++) {
    const char *end = memchr(p, '\n', (size_t)(w.end - p));
    if (!end && !w.is_last)
      return failed(r, row, LBR_FORMAT, "is longer than 64 KiB", 0, NULL, 0);
    if (!end) end = w.end;
    if (row >= j->first)
      status = take_row(r, row, p, end, j->to, (size_t)(row - j->first));
    if (status != LBR_OK) return status;
    p = end + 1;
  }
  return LBR_OK;
}

/* The piece in which a row starts. */
static size_t piece_of(const lbr_rows *r, int64_t row) {
  size_t low = 0, high = r->pieces - 1;
  while (low < high) {
    size_t middle = low + (high - low) / 2;
    if (r->row[middle + 1] > row)
      high = middle;
    else
      low = middle + 1;
  }
  return low;
}

static lbr_status read_rows(void *context, int64_t first, size_t count,
                            size_t wanted, const int *channel,
                            double *const *out) {
  lbr_rows *r = context;
  double **to = lbr_alloc(r->spec.columns, sizeof *to);
  if (!to) return LBR_NO_MEMORY;
  for (size_t k = 0; k < wanted; k++) to[channel[k]] = out[k];
  job j = {r, piece_of(r, first), first, first + (int64_t)count, to};
  size_t tasks = piece_of(r, j.end - 1) - j.piece + 1;
  lbr_status status = lbr_workers_run(read_piece, &j, tasks,
                                      tasks < 8 ? 1 : 0);
  for (size_t k = 0; k < wanted && status == LBR_OK; k++)
    if (to[channel[k]] != out[k]) /* a column asked for more than once */
      memcpy(out[k], to[channel[k]], count * sizeof(double));
  free(to);
  return status;
}

lbr_feed lbr_rows_feed(lbr_rows *r) {
  return (lbr_feed){.context = r, .channels = r->spec.columns,
                    .samples = r->row[r->pieces], .is_parallel = true,
                    .read = read_rows, .why = why_of};
}
