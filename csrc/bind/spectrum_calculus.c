/* Integration and differentiation of samples in the frequency domain.
 */
#include <math.h>
#include <string.h>

#include "bind/samples.h"
#include "spectrum/calculus.h"

#define JOB_CLASS "libration.calculus_job"

typedef struct job {
  lbr_transform *transform;
  double *record;
  double complex *bins;
} job;

static int job_close(lua_State *L) {
  job *j = luaL_checkudata(L, 1, JOB_CLASS);
  lbr_transform_put(j->transform);
  lbr_transform_drop(j->record);
  lbr_transform_drop(j->bins);
  *j = (job){NULL, NULL, NULL};
  return 0;
}

static const luaL_Reg job_meta[] = {
    {"__gc", job_close}, {"__close", job_close}, {NULL, NULL}};

static job *push_job(lua_State *L, size_t n) {
  static const luaL_Reg none[] = {{NULL, NULL}};
  job *j = lua_newuserdatauv(L, sizeof *j, 0);
  *j = (job){NULL, NULL, NULL};
  lbr_set_class(L, JOB_CLASS, none, job_meta);
  lua_toclose(L, -1);
  lbr_status status = lbr_transform_get(n, &j->transform);
  if (status != LBR_OK) lbr_raise(L, status, "transform");
  j->record = lbr_transform_buffer(n);
  j->bins = (double complex *)lbr_transform_buffer(2 * (n / 2 + 1));
  if (!j->record || !j->bins) lbr_raise(L, LBR_NO_MEMORY, "transform");
  return j;
}

/* Fields that the options at index 2 may have. */
static void check_fields(lua_State *L, const char *const *names,
                         const char *listed) {
  luaL_checktype(L, 2, LUA_TTABLE);
  lua_pushnil(L);
  while (lua_next(L, 2)) {
    lua_pop(L, 1);
    int known = 0;
    for (int i = 0; names[i] && lua_type(L, -1) == LUA_TSTRING; i++)
      known |= strcmp(lua_tostring(L, -1), names[i]) == 0;
    if (!known)
      luaL_argerror(L, 2, lua_pushfstring(L, "no such field: %s; fields: %s",
                                          luaL_tolstring(L, -1, NULL),
                                          listed));
  }
}

/* A number in a field, above `above` and at most `most`. */
static double field(lua_State *L, const char *name, double absent,
                    double above, double most, const char *what) {
  int type = lua_getfield(L, 2, name);
  double value = type == LUA_TNIL ? absent : lua_tonumber(L, -1);
  int wrong = type == LUA_TNIL ? isnan(absent)
                               : type != LUA_TNUMBER || !(value > above) ||
                                     !(value <= most);
  if (wrong)
    luaL_argerror(L, 2, lua_pushfstring(L, "%s is %s; it must be %s", name,
                                        luaL_tolstring(L, -1, NULL), what));
  lua_pop(L, 1);
  return value;
}

static int check_times(lua_State *L) {
  double times = field(L, "times", 1, 0, 4, "1, 2, 3 or 4");
  if (times != floor(times))
    luaL_argerror(L, 2, "times must be 1, 2, 3 or 4");
  return (int)times;
}

static int calculate(lua_State *L, const lbr_calculus *c) {
  size_t n;
  const double *x = lbr_check_samples(L, 1, &n);
  luaL_argcheck(L, n > 0 && n <= LBR_TRANSFORM_MOST, 1,
                "it takes 1 to 2^27 samples");
  double *y = lbr_push_unset_samples(L, n);
  job *j = push_job(L, n);
  memcpy(j->record, x, n * sizeof *x);
  lbr_transform_forward(j->transform, j->record, j->bins);
  lbr_calculus_apply(c, j->bins, n);
  lbr_transform_back(j->transform, j->bins, j->record);
  memcpy(y, j->record, n * sizeof *y);
  lua_pushvalue(L, -2);
  return 1;
}

/***
 * Integral over time, in the frequency domain, with a lower cut-off.
 * The record is taken as one period; what is at or below the cut-off, the mean
 * included, is taken away. Where the ends do not meet, detrend or window it
 * first.
 * @param options table: rate (S/s), low_hz (Hz, above 0: nothing at or below
 *   passes), full_hz (Hz: from here all passes, between the two by half a
 *   period of a cosine; default low_hz), times (1 to 4, default 1)
 * @return samples: as many, in unit s^times
 * @usage
 * local x = core.samples.new(8)
 * for i = 1, 8 do x[i] = math.cos(math.pi / 4 * (i - 1)) end
 * local y = x:integrate { rate = 8, low_hz = 0.5 }
 * assert(math.abs(y[3] - 1 / (2 * math.pi)) < 1e-15)
 */
static int samples_integrate(lua_State *L) {
  static const char *const names[] = {"rate", "low_hz", "full_hz", "times",
                                      NULL};
  check_fields(L, names, "rate, low_hz, full_hz, times");
  lbr_calculus c = {0, 0, 0, 0, INFINITY};
  c.rate = field(L, "rate", NAN, 0, 1e300, "a sample rate in S/s, above 0");
  c.low = field(L, "low_hz", NAN, 0, c.rate / 2,
                "a frequency in Hz, above 0, at most half the rate");
  c.full = field(L, "full_hz", c.low, c.low, c.rate / 2,
                 "a frequency in Hz above low_hz, at most half the rate");
  c.times = -check_times(L);
  return calculate(L, &c);
}

/***
 * Derivative by time, in the frequency domain.
 * The record is taken as one period; where the ends do not meet, detrend or
 * window it first. Noise grows with the frequency: give high_hz.
 * @param options table: rate (S/s), high_hz (Hz: nothing above passes,
 *   default everything passes), times (1 to 4, default 1)
 * @return samples: as many, in unit / s^times
 * @usage
 * local x = core.samples.new(8)
 * for i = 1, 8 do x[i] = math.sin(math.pi / 4 * (i - 1)) end
 * local y = x:differentiate { rate = 8 }
 * assert(math.abs(y[1] - 2 * math.pi) < 1e-14)
 */
static int samples_differentiate(lua_State *L) {
  static const char *const names[] = {"rate", "high_hz", "times", NULL};
  check_fields(L, names, "rate, high_hz, times");
  lbr_calculus c = {0, 0, -1, -1, 0}; /* all from 0 Hz */
  c.rate = field(L, "rate", NAN, 0, 1e300, "a sample rate in S/s, above 0");
  c.high = field(L, "high_hz", INFINITY, 0, c.rate / 2,
                 "a frequency in Hz, above 0, at most half the rate");
  c.times = check_times(L);
  return calculate(L, &c);
}

const luaL_Reg lbr_samples_calculus_methods[] = {
    {"integrate", samples_integrate},
    {"differentiate", samples_differentiate},
    {NULL, NULL}};
