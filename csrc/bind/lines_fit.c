/* core.lines: least squares fits of sines. */
#include <math.h>

#include "base/checked.h"
#include "bind/lines.h"
#include "bind/samples.h"
#include "lines/joint.h"
#include "lines/project.h"
#include "lines/sine.h"

#define JOINT_CLASS "libration.joint"
#define WORKERS_MOST 256

void lbr_put_number(lua_State *L, const char *field, double value) {
  lua_pushnumber(L, value);
  lua_setfield(L, -2, field);
}

static int push_sine(lua_State *L, const lbr_sine *s) {
  lua_createtable(L, 0, 12);
  lbr_put_number(L, "amplitude", s->amplitude);
  lbr_put_number(L, "frequency", s->frequency);
  lbr_put_number(L, "phase", s->phase);
  lbr_put_number(L, "start_phase", s->start_phase);
  lbr_put_number(L, "offset", s->offset);
  lbr_put_number(L, "rms", s->rms);
  lbr_put_number(L, "u_amplitude", s->u_amplitude);
  lbr_put_number(L, "u_frequency", s->u_frequency);
  lbr_put_number(L, "u_phase", s->u_phase);
  lbr_put_number(L, "u_start_phase", s->u_start_phase);
  lbr_put_number(L, "u_offset", s->u_offset);
  lbr_put_number(L, "rounds", s->rounds);
  return 1;
}

static const double *check_record(lua_State *L, int arg, size_t *n) {
  const double *x = lbr_check_samples(L, arg, n);
  if (*n < LBR_SINE_LEAST)
    luaL_argerror(L, arg, lua_pushfstring(L, "%I samples; a fit needs %d",
                                          (LUAI_UACINT)*n, LBR_SINE_LEAST));
  return x;
}

static double check_frequency(lua_State *L, int arg) {
  double f = luaL_checknumber(L, arg);
  if (!isfinite(f) || fabs(f) >= 1e6 || 2 * f == nearbyint(2 * f))
    luaL_argerror(L, arg, "not a frequency between 0 and half the rate (or "
                          "aliased to one), cycles per sample");
  return f;
}

/*** Fits a sine of known frequency and an offset (three parameters).
 * The uncertainties are standard ones, from the residual, which is taken for
 * independent errors of equal variance.  Source: IEEE Std 1057-2017.
 * @param x samples: the record, 8 samples or more
 * @param f number: cycles per sample; not a multiple of 1/2
 * @return table: amplitude (peak), frequency, phase (rad, of the cosine at the
 *   record's centre), start_phase (at the first sample), offset, rms (of the
 *   residual), u_amplitude, u_phase, u_start_phase, u_offset, u_frequency (0),
 *   rounds (0); or nil, message, code
 * @usage
 * local x = core.samples.from { 3, 2, 1, 2, 3, 2, 1, 2 }
 * local fit = core.lines.sine3(x, 0.25)
 * assert(math.abs(fit.amplitude - 1) < 1e-12)
 * assert(math.abs(fit.offset - 2) < 1e-12)
 */
static int sine3(lua_State *L) {
  size_t n;
  lbr_sine fit;
  const double *x = check_record(L, 1, &n);
  double f = check_frequency(L, 2);
  lbr_status status = lbr_sine_fit3(x, n, f, &fit);
  if (status != LBR_OK) return lbr_refuse(L, status, "three-parameter fit");
  return push_sine(L, &fit);
}

static lbr_status find_start(const double *x, size_t n, double *start) {
  lbr_finder *finder;
  lbr_status status = lbr_finder_new(n, &finder);
  if (status != LBR_OK) return status;
  *start = lbr_finder_run(finder, x);
  lbr_finder_free(finder);
  return LBR_OK;
}

/*** Fits a sine and an offset, the frequency too (four parameters).
 * Source: IEEE Std 1057-2017.  Without a start the strongest line of the
 * record's transform is fitted.
 * @param x samples: the record, 8 samples or more
 * @param start number: cycles per sample, within half a bin; default found
 * @return table: as of sine3, with u_frequency and rounds of the iteration; or
 *   nil, message, code ("no_converge", "domain")
 * @usage
 * local x = lb.samples.make(100, function(i) return math.cos(0.3 * i) end)
 * local fit = core.lines.sine4(x)
 * assert(math.abs(fit.frequency - 0.3 / (2 * math.pi)) < 1e-12)
 */
static int sine4(lua_State *L) {
  size_t n;
  lbr_sine fit;
  double start = 0;
  const double *x = check_record(L, 1, &n);
  lbr_status status = LBR_OK;
  if (lua_isnoneornil(L, 2))
    status = find_start(x, n, &start);
  else
    start = check_frequency(L, 2);
  if (status == LBR_OK) status = lbr_sine_fit4(x, n, start, &fit);
  if (status != LBR_OK) return lbr_refuse(L, status, "four-parameter fit");
  return push_sine(L, &fit);
}

static unsigned check_workers(lua_State *L, int arg) {
  if (lua_isnoneornil(L, arg)) return 0;
  return (unsigned)lbr_check_count(L, arg, 0, WORKERS_MOST);
}

/* Argument 1 as whole records of argument 2 samples each. */
static const double *check_records(lua_State *L, size_t *n, size_t *records) {
  size_t all;
  const double *x = lbr_check_samples(L, 1, &all);
  *n = lbr_check_count(L, 2, LBR_SINE_LEAST, SIZE_MAX / 64);
  if (all == 0 || all % *n != 0)
    luaL_argerror(L, 2, lua_pushfstring(L, "%I samples are not whole records "
                                        "of %I", (LUAI_UACINT)all,
                                        (LUAI_UACINT)*n));
  *records = all / *n;
  return x;
}

/*** Four-parameter fits of many records, one after the other in one block.
 * The results do not depend on the number of workers.
 * @param x samples: records times n samples
 * @param n integer: samples of a record, 8 or more
 * @param starts samples: a start for each record, cycles per sample, or nil
 * @param workers integer: threads; default one per core
 * @return samples: 12 values for each record: amplitude, frequency, phase,
 *   start_phase, offset, rms, u_amplitude, u_frequency, u_phase, u_start_phase,
 *   u_offset, rounds; not numbers where a record has no fit
 * @usage
 * local x = lb.samples.make(200, function(i) return math.cos(0.3 * i) end)
 * local fits = core.lines.sine_batch(x, 100)
 * assert(#fits == 24 and math.abs(fits[13] - 1) < 1e-12)
 */
static int sine_batch(lua_State *L) {
  size_t n, records, m;
  const double *x = check_records(L, &n, &records), *starts = NULL;
  if (!lua_isnoneornil(L, 3)) {
    starts = lbr_check_samples(L, 3, &m);
    luaL_argcheck(L, m == records, 3, "not one start for each record");
  }
  unsigned workers = check_workers(L, 4);
  size_t fields = sizeof(lbr_sine) / sizeof(double);
  luaL_argcheck(L, records <= SIZE_MAX / 256, 1, "too many records");
  double *out = lbr_push_unset_samples(L, records * fields);
  lbr_status status =
      lbr_sine_batch(x, n, records, starts, workers, (lbr_sine *)(void *)out);
  if (status != LBR_OK) return lbr_refuse(L, status, "sine fits");
  return 1;
}

typedef struct holder {
  lbr_joint *joint;
  size_t n, count;
  double *f;             /* count */
  lbr_joint_line *lines; /* count, results of a run */
} holder;

/*** Gives back all memory; a closed fit reads nothing more.
 * Closing again does nothing; collection closes too.
 * @usage
 * core.lines.joint(8, { 0.25 }):close()
 */
static int joint_close(lua_State *L) {
  holder *h = luaL_checkudata(L, 1, JOINT_CLASS);
  lbr_joint_free(h->joint);
  free(h->f);
  free(h->lines);
  *h = (holder){NULL, 0, 0, NULL, NULL};
  return 0;
}

/*** Fits all lines and the offset to a record.
 * @param x samples: the record; as many samples as the fit was made for
 * @param first integer: number of the first sample, from 1, default 1
 * @return table: amplitude (peak), phase (rad, of the cosine at the centre),
 *   u_amplitude and u_phase (standard uncertainties) of line 1, then of line 2
 *   ... in one flat sequence
 * @return table: offset, u_offset, rms (of the residual)
 * @usage
 * local x = lb.samples.make(64, function(i) return 2 + math.cos(i) end)
 * local flat, rest = core.lines.joint(64, { 0.5 / math.pi }):run(x)
 * assert(math.abs(flat[1] - 1) < 1e-12)
 * assert(math.abs(rest.offset - 2) < 1e-12)
 */
static int joint_run(lua_State *L) {
  holder *h = luaL_checkudata(L, 1, JOINT_CLASS);
  size_t n;
  lbr_joint_rest rest;
  const double *x = lbr_check_samples(L, 2, &n);
  luaL_argcheck(L, h->joint != NULL, 1, "the fit is closed");
  if (n < h->n)
    luaL_argerror(L, 2, lua_pushfstring(L, "%I samples, the fit needs %I",
                                        (LUAI_UACINT)n, (LUAI_UACINT)h->n));
  size_t first = lua_isnoneornil(L, 3)
                     ? 1 : lbr_check_count(L, 3, 1, n - h->n + 1);
  lbr_joint_run(h->joint, x + first - 1, h->lines, &rest);
  lua_createtable(L, (int)(4 * h->count), 0);
  for (size_t i = 0; i < h->count; i++) {
    const double row[4] = {h->lines[i].amplitude, h->lines[i].phase,
                           h->lines[i].u_amplitude, h->lines[i].u_phase};
    for (size_t k = 0; k < 4; k++) {
      lua_pushnumber(L, row[k]);
      lua_seti(L, -2, (lua_Integer)(4 * i + k + 1));
    }
  }
  lua_createtable(L, 0, 3);
  lbr_put_number(L, "offset", rest.offset);
  lbr_put_number(L, "u_offset", rest.u_offset);
  lbr_put_number(L, "rms", rest.rms);
  return 2;
}

static const luaL_Reg joint_methods[] = {
    {"close", joint_close}, {"run", joint_run}, {NULL, NULL}};
static const luaL_Reg joint_meta[] = {
    {"__close", joint_close}, {"__gc", joint_close}, {NULL, NULL}};

static void read_frequencies(lua_State *L, int arg, double *f, size_t count) {
  for (size_t i = 0; i < count; i++) {
    int is_number;
    lua_geti(L, arg, (lua_Integer)i + 1);
    f[i] = lua_tonumberx(L, -1, &is_number);
    lua_pop(L, 1);
    if (!is_number)
      luaL_argerror(L, arg, lua_pushfstring(L, "[%I] is not a number",
                                            (LUAI_UACINT)i + 1));
  }
}

/* nil, message, code for frequencies that have no fit. */
static int refuse_aim(lua_State *L, lbr_status status, size_t line) {
  if (status != LBR_DOMAIN) return lbr_refuse(L, status, "joint fit");
  lua_pushnil(L);
  lua_pushfstring(L, "joint fit: line %I has a frequency that is 0 or half "
                  "the rate, or that the record is too short to tell from "
                  "another's", (LUAI_UACINT)line + 1);
  lua_pushstring(L, lbr_status_code(status));
  return 3;
}

/*** A least squares fit of many lines of known frequencies and an offset.
 * Made once and run on many records.  Its standard uncertainties come from the
 * residual, which is taken for independent errors of equal variance.
 * @param n integer: samples of a record, 2 #f + 2 or more
 * @param f table: frequencies, cycles per sample, 1 to 512 of them
 * @return joint: with the methods run(x, first) and close(); or nil, message,
 *   code ("domain": two lines that cannot be told apart in n samples, or one
 *   at 0 or half the rate)
 * @usage
 * assert(select(3, core.lines.joint(100, { 0.2, 0.8 })) == "domain")
 */
static int joint(lua_State *L) {
  size_t n = lbr_check_count(L, 1, 4, SIZE_MAX / 64), line = 0;
  luaL_checktype(L, 2, LUA_TTABLE);
  lua_Integer count = luaL_len(L, 2);
  luaL_argcheck(L, count >= 1 && count <= LBR_JOINT_MOST, 2,
                "not 1 to 512 frequencies");
  luaL_argcheck(L, n >= 2 * (size_t)count + 2, 1,
                "fewer than 2 #f + 2 samples");
  holder *h = lua_newuserdatauv(L, sizeof *h, 0);
  *h = (holder){NULL, 0, 0, NULL, NULL};
  lbr_set_class(L, JOINT_CLASS, joint_methods, joint_meta);
  h->n = n;
  h->count = (size_t)count;
  h->f = lbr_alloc(h->count, sizeof *h->f);
  h->lines = lbr_alloc(h->count, sizeof *h->lines);
  if (!h->f || !h->lines) return lbr_refuse(L, LBR_NO_MEMORY, "joint fit");
  read_frequencies(L, 2, h->f, h->count);
  lbr_status status = lbr_joint_new(n, h->count, &h->joint);
  if (status != LBR_OK) return lbr_refuse(L, status, "joint fit");
  status = lbr_joint_aim(h->joint, h->f, &line);
  if (status != LBR_OK) return refuse_aim(L, status, line);
  return 1;
}

/*** Joint fits of many records, one after the other in one block.
 * The results do not depend on the number of workers.
 * @param x samples: records times n samples
 * @param n integer: samples of a record
 * @param f samples: the frequencies of all records, or of record 1, then of
 *   record 2 ..., cycles per sample
 * @param count integer: lines of a record, 1 to 512
 * @param workers integer: threads; default one per core
 * @return samples: amplitude, phase, u_amplitude, u_phase of each line of each
 *   record (not numbers where its samples are not); or nil, message, code
 * @return samples: offset, u_offset, rms of each record
 * @usage
 * local x = lb.samples.make(128, function(i) return math.cos(i) end)
 * local f = core.samples.from { 0.5 / math.pi }
 * local lines, rests = core.lines.joint_batch(x, 64, f, 1)
 * assert(#lines == 8 and #rests == 6 and math.abs(lines[5] - 1) < 1e-12)
 */
static int joint_batch(lua_State *L) {
  size_t n, records, given;
  const double *x = check_records(L, &n, &records);
  const double *f = lbr_check_samples(L, 3, &given);
  size_t count = lbr_check_count(L, 4, 1, LBR_JOINT_MOST);
  unsigned workers = check_workers(L, 5);
  luaL_argcheck(L, records <= SIZE_MAX / 64 / LBR_JOINT_MOST, 1,
                "too many records");
  luaL_argcheck(L, given == count || given == count * records, 3,
                "neither one set of frequencies nor one for each record");
  luaL_argcheck(L, n >= 2 * count + 2, 2, "fewer than 2 count + 2 samples");
  double *lines = lbr_push_unset_samples(L, records * count * 4);
  double *rests = lbr_push_unset_samples(L, records * 3);
  lbr_status status = lbr_joint_batch(
      x, n, records, f, count, given != count, workers,
      (lbr_joint_line *)(void *)lines, (lbr_joint_rest *)(void *)rests);
  if (status != LBR_OK) return lbr_refuse(L, status, "joint fits");
  return 2;
}

/*** A record less an offset and lines.
 * @param x samples: the record
 * @param offset number: to be taken away
 * @param flat table: frequency (cycles per sample), amplitude and phase (rad,
 *   of the cosine at the record's centre) of line 1, then of line 2 ...
 * @return samples: what is left
 * @usage
 * local x = lb.samples.make(101, function(i) return 3 + math.cos(i - 51) end)
 * local left = core.lines.without(x, 3, { 0.5 / math.pi, 1, 0 })
 * assert(left:peak() < 1e-14)
 */
static int without(lua_State *L) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  double offset = luaL_checknumber(L, 2);
  luaL_checktype(L, 3, LUA_TTABLE);
  lua_Integer numbers = luaL_len(L, 3);
  luaL_argcheck(L, numbers % 3 == 0, 3, "not three numbers a line");
  double *y = lbr_push_unset_samples(L, n);
  for (size_t i = 0; i < n; i++) y[i] = x[i] - offset;
  for (lua_Integer i = 1; i <= numbers; i += 3) {
    double row[3];
    for (lua_Integer k = 0; k < 3; k++) {
      lua_geti(L, 3, i + k);
      row[k] = luaL_checknumber(L, -1);
      lua_pop(L, 1);
    }
    lbr_take_away(y, n, row[0], row[1] * cos(row[2]), -row[1] * sin(row[2]));
  }
  return 1;
}

const luaL_Reg lbr_lines_fit_functions[] = {
    {"joint", joint},       {"joint_batch", joint_batch},
    {"sine3", sine3},       {"sine4", sine4},
    {"sine_batch", sine_batch}, {"without", without},
    {NULL, NULL}};
