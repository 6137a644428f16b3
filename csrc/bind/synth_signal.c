/* Signals and records from option tables. */
#include <math.h>
#include <stdbool.h>

#include "bind/filter.h"
#include "bind/samples.h"
#include "bind/synth.h"
#include "synth/digitizer.h"
#include "synth/signal.h"

#define BANK_CLASS "libration.synth.bank"
#define WORK_CLASS "libration.synth.work"

/* A field that is the taps of a shape, or nil (false). */
static bool shape_field(lua_State *L, int table, const char *name,
                        lbr_shape *shape) {
  lua_pushstring(L, name);
  int kind = lua_rawget(L, table);
  const lbr_view *view = luaL_testudata(L, -1, LBR_SAMPLES_CLASS);
  lua_pop(L, 1);
  if (kind == LUA_TNIL) return false;
  if (!view || view->n < 1 || view->n > LBR_MOST_HALF_TAPS + 1)
    luaL_error(L, "%s is not samples of 1 to %d taps", name,
               LBR_MOST_HALF_TAPS + 1);
  *shape = (lbr_shape){view->n - 1, view->data};
  return true;
}

static int close_bank(lua_State *L) {
  lbr_bank **handle = luaL_checkudata(L, 1, BANK_CLASS);
  lbr_bank_free(*handle);
  *handle = NULL;
  return 0;
}

static int close_work(lua_State *L) {
  lbr_record_work **handle = luaL_checkudata(L, 1, WORK_CLASS);
  lbr_record_work_free(*handle);
  *handle = NULL;
  return 0;
}

static const luaL_Reg no_methods[] = {{NULL, NULL}};
static const luaL_Reg bank_meta[] = {{"__gc", close_bank}, {NULL, NULL}};
static const luaL_Reg work_meta[] = {{"__gc", close_work}, {NULL, NULL}};

static lbr_tone tone_at_top(lua_State *L) {
  int t = lua_gettop(L);
  return (lbr_tone){.amplitude = lbr_field(L, t, "amplitude", 0),
                    .cycles = lbr_field(L, t, "cycles", 0),
                    .phase = lbr_field(L, t, "phase", 0),
                    .ramp = lbr_field(L, t, "ramp", 0),
                    .swing = lbr_field(L, t, "swing", 0),
                    .beat = lbr_field(L, t, "beat", 0),
                    .swing_phase = lbr_field(L, t, "swing_phase", 0)};
}

/* Pushes a handle that holds a bank of the tones of the table at `table`;
 * their memory until then is a userdata as well. */
static lbr_bank **push_bank(lua_State *L, int table) {
  size_t n = lbr_list_field(L, table, "tones", LBR_MOST_TONES);
  lbr_tone *tones = lua_newuserdatauv(L, n * sizeof *tones + 1, 0);
  lua_insert(L, -2);
  for (size_t i = 0; i < n; i++) {
    lbr_push_item(L, i + 1, "tones");
    tones[i] = tone_at_top(L);
    lua_pop(L, 1);
  }
  lua_pop(L, 1);
  lbr_bank **handle = lua_newuserdatauv(L, sizeof *handle, 0);
  *handle = NULL;
  lbr_set_class(L, BANK_CLASS, no_methods, bank_meta);
  lbr_status status = lbr_bank_make(n, handle);
  if (status == LBR_OK) status = lbr_bank_set(*handle, tones, n);
  if (status != LBR_OK) lbr_raise(L, status, "tones");
  return handle;
}

static lbr_key key_fields(lua_State *L, int table) {
  return lbr_key_of(
      (uint64_t)lbr_whole_field(L, table, "seed", 0),
      (uint64_t)lbr_whole_field(L, table, "trial", 0),
      (uint64_t)lbr_whole_field(L, table, "channel", 0),
      (uint64_t)lbr_whole_field(L, table, "purpose", LBR_PURPOSE_INPUT_NOISE));
}

/***
 * Fills samples with a signal: offset, tones and keyed noise.
 * @param into samples: filled; what they held is lost
 * @param signal table: tones, a list of { amplitude, cycles (per sample),
 *   phase (rad), ramp (cycles per sample^2), swing, beat (cycles per sample),
 *   swing_phase (rad) }; offset; sigma of the noise; taps (samples, shape of
 *   the noise); seed, trial, channel, purpose (integers, key of the noise);
 *   first (number of the first sample); workers (threads, 0: one per core).
 *   All default to 0.
 * @return samples: the same; raises where a field is out of range
 * @usage
 * local x = core.synth.fill(core.samples.new(4), {
 *   tones = { { amplitude = 2, cycles = 0.25 } } })
 * assert(math.abs(x[1] - 2) < 1e-15 and math.abs(x[3] + 2) < 1e-15)
 */
static int synth_fill(lua_State *L) {
  size_t n;
  lbr_shape shape;
  double *x = lbr_check_writable_samples(L, 1, &n);
  luaL_checktype(L, 2, LUA_TTABLE);
  lbr_signal s = {.offset = lbr_field(L, 2, "offset", 0),
                  .sigma = lbr_field(L, 2, "sigma", 0),
                  .key = key_fields(L, 2)};
  uint64_t first = (uint64_t)lbr_whole_field(L, 2, "first", 0);
  unsigned workers = lbr_workers_field(L, 2);
  if (shape_field(L, 2, "taps", &shape)) s.shape = &shape;
  lbr_bank **bank = push_bank(L, 2);
  s.bank = *bank;
  lbr_status status = lbr_signal_fill(&s, first, x, n, workers);
  lbr_bank_free(*bank);
  *bank = NULL;
  if (status != LBR_OK) return lbr_raise(L, status, "fill");
  lua_settop(L, 1);
  return 1;
}

static lbr_input_tone input_tone_at_top(lua_State *L) {
  int t = lua_gettop(L);
  return (lbr_input_tone){.hz = lbr_field(L, t, "hz", 0),
                          .amplitude = lbr_field(L, t, "amplitude", 0),
                          .phase = lbr_field(L, t, "phase", 0),
                          .ramp = lbr_field(L, t, "ramp", 0),
                          .swing_hz = lbr_field(L, t, "swing_hz", 0),
                          .swing_s = lbr_field(L, t, "swing_s", 0),
                          .swing_phase = lbr_field(L, t, "swing_phase", 0)};
}

/* Leaves the memory of the tones on the stack. */
static void push_input_tones(lua_State *L, int table, lbr_record_model *m) {
  size_t n = lbr_list_field(L, table, "tones", LBR_MOST_TONES);
  lbr_input_tone *tones = lua_newuserdatauv(L, n * sizeof *tones + 1, 0);
  lua_insert(L, -2);
  for (size_t i = 0; i < n; i++) {
    lbr_push_item(L, i + 1, "tones");
    tones[i] = input_tone_at_top(L);
    lua_pop(L, 1);
  }
  lua_pop(L, 1);
  m->tones = tones;
  m->n_tones = n;
}

static void model_fields(lua_State *L, int t, lbr_record_model *m) {
  lua_Integer bits = lbr_whole_field(L, t, "bits", 0);
  if (bits < 0 || bits > 32) luaL_error(L, "bits is outside 0 .. 32");
  m->bits = (int)bits;
  m->offset = lbr_field(L, t, "offset", 0);
  m->rate = lbr_field(L, t, "rate", 0);
  m->timebase = lbr_field(L, t, "timebase", 0);
  m->delay_s = lbr_field(L, t, "delay_s", 0);
  m->jitter_s = lbr_field(L, t, "jitter_s", 0);
  m->gain_error = lbr_field(L, t, "gain_error", 0);
  m->input_noise = lbr_field(L, t, "input_noise", 0);
  m->own_noise = lbr_field(L, t, "own_noise", 0);
  m->range = lbr_loose_field(L, t, "range", INFINITY);
  m->seed = (uint64_t)lbr_whole_field(L, t, "seed", 0);
  m->trial = (uint64_t)lbr_whole_field(L, t, "trial", 0);
  m->channel = (uint64_t)lbr_whole_field(L, t, "channel", 0);
}

/* Pushes room for n codes where the field `codes`, samples, asks for them. */
static int32_t *push_codes(lua_State *L, int table, size_t n, double **codes) {
  lua_pushliteral(L, "codes");
  int kind = lua_rawget(L, table);
  const lbr_view *view = luaL_testudata(L, -1, LBR_SAMPLES_CLASS);
  if (kind == LUA_TNIL) return NULL;
  if (!view || view->n != n)
    luaL_error(L, "codes is not samples, as many as the record has");
  *codes = view->data;
  return lua_newuserdatauv(L, n * sizeof(int32_t) + 1, 0);
}

static lbr_record_work **push_work(lua_State *L, size_t tones) {
  lbr_record_work **handle = lua_newuserdatauv(L, sizeof *handle, 0);
  *handle = NULL;
  lbr_set_class(L, WORK_CLASS, no_methods, work_meta);
  lbr_status status = lbr_record_work_make(tones, handle);
  if (status != LBR_OK) lbr_raise(L, status, "record");
  return handle;
}

/***
 * Fills samples with what a digitizer makes of tones and noise.
 * @param into samples: filled with the record, in the unit of the tones
 * @param model table: tones, a list of { hz, amplitude, phase (rad), ramp
 *   (Hz/s), swing_hz, swing_s, swing_phase }; offset; rate (S/s); timebase
 *   (relative); filter (as core.filter.prepare takes it); delay_s; jitter_s;
 *   gain_error (relative); input_noise, own_noise (unit/sqrt(Hz)); input_shape
 *   (taps of core.synth.input_shape); bits (0: no quantiser); range; seed,
 *   trial, channel (integers); first (number of the first sample); codes
 *   (samples, as many: filled with the integer codes; needs bits)
 * @return integer: samples that the rails changed; raises where a field is out
 *   of range
 * @usage
 * local x = core.samples.new(100)
 * local clipped = core.synth.record(x, { rate = 1000, bits = 8, range = 1,
 *   tones = { { hz = 50, amplitude = 1.5 } } })
 * assert(clipped > 0 and x:max() == 127 / 128 and x:min() == -1)
 */
static int synth_record(lua_State *L) {
  size_t n;
  lbr_shape shape;
  lbr_filter filter;
  lbr_record_facts facts = {0};
  double *codes = NULL, *x = lbr_check_writable_samples(L, 1, &n);
  luaL_checktype(L, 2, LUA_TTABLE);
  lbr_record_model m = {0};
  model_fields(L, 2, &m);
  uint64_t first = (uint64_t)lbr_whole_field(L, 2, "first", 0);
  if (shape_field(L, 2, "input_shape", &shape)) m.input_shape = &shape;
  lua_getfield(L, 2, "filter");
  lbr_check_filter(L, lua_gettop(L), &filter);
  m.filter = &filter;
  push_input_tones(L, 2, &m);
  int32_t *whole = push_codes(L, 2, n, &codes);
  lbr_record_work **work = push_work(L, m.n_tones);
  lbr_status status = lbr_synth_record(&m, first, x, whole, n, *work, &facts);
  lbr_record_work_free(*work);
  *work = NULL;
  if (status != LBR_OK) return lbr_raise(L, status, "record");
  for (size_t i = 0; whole && i < n; i++) codes[i] = whole[i];
  lua_pushinteger(L, (lua_Integer)facts.clipped);
  return 1;
}

const luaL_Reg lbr_synth_signal_functions[] = {
    {"fill", synth_fill}, {"record", synth_record}, {NULL, NULL}};
