/* Chirps, orders of a driver, modulated carriers and struck modes. */
#include <string.h>

#include "bind/samples.h"
#include "bind/synth.h"
#include "synth/chirp.h"
#include "synth/modes.h"
#include "synth/modulated.h"
#include "synth/profile.h"

#define MOST_ITEMS 65536

/* A true or false field; absent: false. */
static bool flag(lua_State *L, int table, const char *name) {
  lua_pushstring(L, name);
  lua_rawget(L, table);
  bool value = lua_toboolean(L, -1);
  lua_pop(L, 1);
  return value;
}

/* Memory for the items of list `name`, which it pushes above that memory;
 * *n items. */
static void *push_memory(lua_State *L, int table, const char *name,
                         size_t size, size_t *n) {
  *n = lbr_list_field(L, table, name, MOST_ITEMS);
  void *memory = lua_newuserdatauv(L, *n * size + 1, 0);
  lua_insert(L, -2);
  return memory;
}

/* Adds the signal to argument 1 and leaves argument 1 on the stack. */
static int spread(lua_State *L, lbr_adder add, const void *what,
                  lbr_status checked, const char *name) {
  size_t n;
  double *x = lbr_check_writable_samples(L, 1, &n);
  if (checked != LBR_OK) return lbr_raise(L, checked, name);
  int64_t first = lbr_whole_field(L, 2, "first", 0);
  unsigned workers = lbr_workers_field(L, 2);
  lbr_status status = lbr_spread(add, what, first, x, n, workers);
  if (status != LBR_OK) return lbr_raise(L, status, name);
  lua_settop(L, 1);
  return 1;
}

/***
 * Adds a tone whose frequency runs from one value to another.
 * @param into samples: the chirp is added to them
 * @param chirp table: amplitude, phase (rad), from, to (cycles per sample),
 *   start, length, fade (samples), exponential, repeats, back (booleans),
 *   first (number of the first sample), workers (threads; 0: one per core)
 * @return samples: the same; raises where a field is out of range
 * @usage
 * local x = core.synth.chirp(core.samples.new(9), {
 *   amplitude = 1, from = 0, to = 0.5, length = 8 })
 * assert(x[1] == 1 and math.abs(x[5] + 1) < 1e-15 and x[9] == 0)
 */
static int synth_chirp(lua_State *L) {
  luaL_checktype(L, 2, LUA_TTABLE);
  lbr_chirp c = {.amplitude = lbr_field(L, 2, "amplitude", 0),
                 .phase = lbr_field(L, 2, "phase", 0),
                 .from = lbr_field(L, 2, "from", 0),
                 .to = lbr_field(L, 2, "to", 0),
                 .start = lbr_field(L, 2, "start", 0),
                 .length = lbr_field(L, 2, "length", 0),
                 .fade = lbr_field(L, 2, "fade", 0),
                 .exponential = flag(L, 2, "exponential"),
                 .repeats = flag(L, 2, "repeats"),
                 .back = flag(L, 2, "back")};
  return spread(L, lbr_chirp_add, &c, lbr_chirp_check(&c), "chirp");
}

static void push_knots(lua_State *L, lbr_profile *p) {
  lbr_knot *k = push_memory(L, 2, "knots", sizeof *k, &p->n_knots);
  for (size_t i = 0; i < p->n_knots; i++) {
    lbr_push_item(L, i + 1, "knots");
    int t = lua_gettop(L);
    k[i] = (lbr_knot){lbr_field(L, t, "at", 0), lbr_field(L, t, "speed", 0), 0};
    lua_pop(L, 1);
  }
  lua_pop(L, 1);
  p->knots = k;
  lbr_status status = lbr_profile_set(k, p->n_knots);
  if (status != LBR_OK) lbr_raise(L, status, "knots");
}

static void push_orders(lua_State *L, lbr_profile *p) {
  lbr_order *o = push_memory(L, 2, "orders", sizeof *o, &p->n_orders);
  for (size_t i = 0; i < p->n_orders; i++) {
    lbr_push_item(L, i + 1, "orders");
    int t = lua_gettop(L);
    o[i] = (lbr_order){.times = lbr_field(L, t, "times", 1),
                       .amplitude = lbr_field(L, t, "amplitude", 0),
                       .phase = lbr_field(L, t, "phase", 0),
                       .power = lbr_field(L, t, "power", 0)};
    lua_pop(L, 1);
  }
  lua_pop(L, 1);
  p->orders = o;
}

/***
 * Adds orders of a driver whose speed follows straight lines.
 * @param into samples: the orders are added to them
 * @param profile table: knots, a list of { at (sample), speed (turns per
 *   sample) }; orders, a list of { times (default 1), amplitude, phase (rad at
 *   the first knot), power (of speed over reference; 0) }; reference (turns
 *   per sample, default 1), first, workers
 * @return samples: the same; raises where a field is out of range
 * @usage
 * local x = core.synth.orders(core.samples.new(5), {
 *   knots = { { at = 0, speed = 0.25 } }, orders = { { amplitude = 2 } } })
 * assert(x[1] == 2 and math.abs(x[3] + 2) < 1e-15)
 */
static int synth_orders(lua_State *L) {
  lbr_profile p = {0};
  luaL_checktype(L, 2, LUA_TTABLE);
  p.reference = lbr_field(L, 2, "reference", 1);
  push_knots(L, &p);
  push_orders(L, &p);
  return spread(L, lbr_profile_add, &p, lbr_profile_check(&p), "orders");
}

static const lbr_sway *push_sways(lua_State *L, const char *name, size_t *n) {
  lbr_sway *s = push_memory(L, 2, name, sizeof *s, n);
  for (size_t i = 0; i < *n; i++) {
    lbr_push_item(L, i + 1, name);
    int t = lua_gettop(L);
    s[i] = (lbr_sway){lbr_field(L, t, "depth", 0), lbr_field(L, t, "cycles", 0),
                      lbr_field(L, t, "phase", 0)};
    lua_pop(L, 1);
  }
  lua_pop(L, 1);
  return s;
}

/***
 * Adds a carrier whose amplitude and phase are modulated.
 * @param into samples: the carrier is added to them
 * @param carrier table: amplitude, cycles (per sample), phase (rad); am and
 *   pm, lists of { depth (relative; rad for pm), cycles, phase }; first,
 *   workers
 * @return samples: the same; raises where a field is out of range
 * @usage
 * local x = core.synth.modulated(core.samples.new(3), { amplitude = 1,
 *   cycles = 0.5, am = { { depth = 0.5, cycles = 0.5 } } })
 * assert(x[1] == 1.5 and x[2] == -0.5)
 */
static int synth_modulated(lua_State *L) {
  lbr_modulated m = {0};
  luaL_checktype(L, 2, LUA_TTABLE);
  m.amplitude = lbr_field(L, 2, "amplitude", 0);
  m.cycles = lbr_field(L, 2, "cycles", 0);
  m.phase = lbr_field(L, 2, "phase", 0);
  m.am = push_sways(L, "am", &m.n_am);
  m.pm = push_sways(L, "pm", &m.n_pm);
  return spread(L, lbr_modulated_add, &m, lbr_modulated_check(&m), "modulated");
}

static void push_modes(lua_State *L, lbr_struck *s) {
  lbr_mode *m = push_memory(L, 2, "modes", sizeof *m, &s->n_modes);
  for (size_t i = 0; i < s->n_modes; i++) {
    lbr_push_item(L, i + 1, "modes");
    int t = lua_gettop(L);
    m[i] = (lbr_mode){lbr_field(L, t, "amplitude", 1),
                      lbr_field(L, t, "cycles", 0), lbr_field(L, t, "decay", 0),
                      lbr_field(L, t, "phase", 0)};
    lua_pop(L, 1);
  }
  lua_pop(L, 1);
  s->modes = m;
}

/***
 * Adds damped modes that are struck by impulses.
 * @param into samples: the decays are added to them
 * @param struck table: modes, a list of { amplitude (per strength, default 1),
 *   cycles (per sample), decay (nepers per sample), phase (rad) }; at, strength
 *   (samples: instants in samples, not decreasing; as many strengths); first,
 *   workers
 * @return samples: the same; raises where a field is out of range
 * @usage
 * local from = core.samples.from
 * local x = core.synth.struck(core.samples.new(4), { modes = {
 *   { cycles = 0.25, decay = math.log(2) } }, at = from { 0 },
 *   strength = from { 8 } })
 * assert(math.abs(x[2] - 4) < 1e-14 and math.abs(x[4] + 1) < 1e-14)
 */
static int synth_struck(lua_State *L) {
  lbr_struck s = {0};
  size_t strengths;
  luaL_checktype(L, 2, LUA_TTABLE);
  push_modes(L, &s);
  lua_getfield(L, 2, "at");
  s.at = lbr_check_samples(L, lua_gettop(L), &s.n_hits);
  lua_getfield(L, 2, "strength");
  s.strength = lbr_check_samples(L, lua_gettop(L), &strengths);
  if (strengths != s.n_hits)
    return luaL_error(L, "%I instants, but %I strengths",
                      (LUAI_UACINT)s.n_hits, (LUAI_UACINT)strengths);
  return spread(L, lbr_struck_add, &s, lbr_struck_check(&s), "struck");
}

const luaL_Reg lbr_synth_motion_functions[] = {
    {"chirp", synth_chirp},
    {"orders", synth_orders},
    {"modulated", synth_modulated},
    {"struck", synth_struck},
    {NULL, NULL}};
