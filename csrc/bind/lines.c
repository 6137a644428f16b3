/* core.lines: reading lines from samples. */
#include <string.h>

#include "base/checked.h"
#include "bind/bind.h"
#include "bind/lines.h"
#include "bind/samples.h"
#include "lines/tracker.h"

#define TRACKER_CLASS "libration.tracker"
#define MOST_LINES 4096

typedef struct handle {
  lbr_tracker *tracker;
  size_t n, count; /* samples a record; lines */
  lbr_measured *tones; /* count, results of a run */
  lbr_search *searches;
} handle;

/*** Gives back all memory; a closed tracker reads nothing more.
 * Closing again does nothing; collection closes too.
 * @usage
 * local w = core.samples.from { 1, 1, 1, 1 }
 * core.lines.tracker(w, {}):close()
 */
static int tracker_close(lua_State *L) {
  handle *h = luaL_checkudata(L, 1, TRACKER_CLASS);
  lbr_tracker_free(h->tracker);
  free(h->tones);
  free(h->searches);
  *h = (handle){NULL, 0, 0, NULL, NULL};
  return 0;
}

static double number_at(lua_State *L, int arg, lua_Integer i) {
  int is_number;
  lua_geti(L, arg, i);
  double value = lua_tonumberx(L, -1, &is_number);
  if (!is_number)
    luaL_argerror(L, arg, lua_pushfstring(L, "[%I] is not a number",
                                          (LUAI_UACINT)i));
  lua_pop(L, 1);
  return value;
}

/*** Reads every line of a record.
 * As many samples are read as the tracker's window has; all must be there.
 * @param x samples: the record
 * @param first integer: number of the first sample read, from 1, default 1
 * @return table: amplitude, frequency and phase of line 1, then of line 2 ...
 *   in one flat sequence: the record's unit (peak), cycles per sample, and
 *   radians of the cosine at the centre of the record
 * @usage
 * local w = lb.window("hann"):samples(64)
 * local flat = core.lines.tracker(w, { 0.1, 0.1 }):run(w)
 * assert(#flat == 3 and flat[2] == 0.1)
 */
static int tracker_run(lua_State *L) {
  handle *h = luaL_checkudata(L, 1, TRACKER_CLASS);
  size_t n;
  const double *x = lbr_check_samples(L, 2, &n);
  luaL_argcheck(L, h->tracker != NULL, 1, "the tracker is closed");
  if (n < h->n)
    luaL_argerror(L, 2, lua_pushfstring(L, "%I samples, the window has %I",
                                        (LUAI_UACINT)n, (LUAI_UACINT)h->n));
  size_t first = lua_isnoneornil(L, 3)
                     ? 1 : lbr_check_count(L, 3, 1, n - h->n + 1);
  lbr_tracker_run(h->tracker, x + first - 1, h->tones);
  lua_createtable(L, (int)(3 * h->count), 0);
  for (size_t i = 0; i < h->count; i++) {
    const double row[3] = {h->tones[i].amplitude, h->tones[i].frequency,
                           h->tones[i].phase};
    for (size_t k = 0; k < 3; k++) {
      lua_pushnumber(L, row[k]);
      lua_seti(L, -2, (lua_Integer)(3 * i + k + 1));
    }
  }
  return 1;
}

static const luaL_Reg tracker_methods[] = {{"close", tracker_close},
                                           {"run", tracker_run},
                                           {NULL, NULL}};
static const luaL_Reg tracker_meta[] = {
    {"__close", tracker_close}, {"__gc", tracker_close}, {NULL, NULL}};

/*** A reader of several lines, made once and run on many records.
 * Each line has an interval of frequencies in cycles per sample, as two
 * numbers of one flat sequence: equal ones read at that frequency; different
 * ones find the highest point of the windowed transform between them, ends
 * included.  Frequencies beyond 1/2 are the true ones of undersampled lines.
 * Raises when an interval is wider than 1 or not in order, or when the sum of
 * the window vanishes.
 * @param w samples: the window, at least 4 samples
 * @param searches table: low, high, low, high ... of the lines
 * @return tracker: with the methods run(x) and close()
 * @usage
 * local x = core.samples.from { 1, 0, -1, 0, 1, 0, -1, 0 }
 * local w = core.samples.from { 1, 1, 1, 1, 1, 1, 1, 1 }
 * local flat = core.lines.tracker(w, { 0.25, 0.25 }):run(x)
 * assert(math.abs(flat[1] - 1) < 1e-12)
 */
static int tracker(lua_State *L) {
  size_t n;
  const double *w = lbr_check_samples(L, 1, &n);
  luaL_checktype(L, 2, LUA_TTABLE);
  lua_Integer numbers = luaL_len(L, 2);
  luaL_argcheck(L, numbers % 2 == 0 && numbers <= 2 * MOST_LINES, 2,
                "not pairs of low and high, or more than 4096 of them");
  handle *h = lua_newuserdatauv(L, sizeof *h, 0);
  *h = (handle){NULL, 0, 0, NULL, NULL};
  lbr_set_class(L, TRACKER_CLASS, tracker_methods, tracker_meta);
  h->n = n;
  h->count = (size_t)numbers / 2;
  h->tones = lbr_alloc(h->count, sizeof *h->tones);
  h->searches = lbr_alloc(h->count, sizeof *h->searches);
  if (!h->tones || !h->searches) return lbr_raise(L, LBR_NO_MEMORY, "tracker");
  for (size_t i = 0; i < h->count; i++) {
    h->searches[i].lo = number_at(L, 2, (lua_Integer)(2 * i + 1));
    h->searches[i].hi = number_at(L, 2, (lua_Integer)(2 * i + 2));
  }
  lbr_status status =
      lbr_tracker_new(w, n, h->searches, h->count, &h->tracker);
  if (status != LBR_OK) return lbr_raise(L, status, "tracker");
  return 1;
}

static const luaL_Reg functions[] = {{"tracker", tracker}, {NULL, NULL}};

int lbr_open_lines(lua_State *L) {
  luaL_newlib(L, functions);
  luaL_setfuncs(L, lbr_lines_fit_functions, 0);
  luaL_setfuncs(L, lbr_lines_list_functions, 0);
  luaL_setfuncs(L, lbr_lines_shaft_functions, 0);
  return 1;
}
