/* core.proof: plans on trial. */
#include <math.h>
#include <string.h>
#include <unistd.h>

#include "base/checked.h"
#include "bind/bind.h"
#include "bind/proof_setup.h"
#include "bind/samples.h"
#include "proof/adversary.h"
#include "proof/tally.h"

#define PROOF_CLASS "libration.proof"
#define MOST_WORKERS 256

typedef struct handle {
  lbr_setup setup;
  unsigned workers;
  lbr_tallier *tallier;
  lbr_bench *bench;       /* for replays */
  lbr_response *response; /* for attacks of one line */
  lbr_tally *tallies;     /* n_lines */
  lbr_outcome *outcomes;  /* n_lines */
  lbr_attack *attacks;    /* 2 n_lines */
} handle;

/*** Gives back all memory; a closed proof runs nothing more.
 * Closing again does nothing; collection closes too.
 * @usage
 * local w = core.samples.from { 1, 1, 1, 1 }
 * local proof = core.proof.new {
 *   rate = 4, window = w, spread = { 0 }, front = {},
 *   sources = { { hz = 1, least = 1, most = 2, driver = 1 } },
 *   claims = { { own = 0.1, others = 0, f_lo = 1, f_hi = 1, gain = 1 } },
 * }
 * proof:close()
 */
static int proof_close(lua_State *L) {
  handle *h = luaL_checkudata(L, 1, PROOF_CLASS);
  lbr_tallier_free(h->tallier);
  lbr_bench_free(h->bench);
  lbr_response_free(h->response);
  free(h->tallies);
  free(h->outcomes);
  free(h->attacks);
  lbr_setup_free(&h->setup);
  memset(h, 0, sizeof *h);
  return 0;
}

static handle *check_open(lua_State *L) {
  handle *h = luaL_checkudata(L, 1, PROOF_CLASS);
  luaL_argcheck(L, h->tallies != NULL, 1, "the proof is closed");
  return h;
}

static uint64_t check_key(lua_State *L, int arg) {
  return (uint64_t)luaL_checkinteger(L, arg);
}

static void set_number(lua_State *L, const char *name, double value) {
  lua_pushnumber(L, value);
  lua_setfield(L, -2, name);
}

static void set_count(lua_State *L, const char *name, uint64_t value) {
  lua_pushinteger(L, (lua_Integer)value);
  lua_setfield(L, -2, name);
}

static void push_tally(lua_State *L, const lbr_tally *t) {
  lua_createtable(L, 0, 9);
  set_count(L, "trials", t->trials);
  set_count(L, "violations", t->violations);
  set_count(L, "violations_hz", t->violations_hz);
  set_number(L, "worst", t->worst);
  set_number(L, "worst_hz", t->worst_hz);
  set_count(L, "worst_trial", t->worst_trial);
  set_count(L, "worst_hz_trial", t->worst_hz_trial);
  set_count(L, "beyond", t->beyond);
  set_number(L, "squares", t->squares);
}

/*** Runs random trials and adds them to what was run before.
 * Trial t of seed s is the same whenever and wherever it is run.
 * @param seed integer: key of all random numbers
 * @param first integer: number of the first trial
 * @param count integer: how many trials, 0 to 4096
 * @param noise boolean: also with noise, jitter, limits and codes
 * @return table: per line the sums over all trials so far: trials, violations,
 *   violations_hz, worst, worst_hz (deviation over claim), worst_trial,
 *   worst_hz_trial, beyond (deviations of more than coverage sigma), squares
 * @usage
 * local w = lb.window("hann"):samples(256)
 * local proof = core.proof.new {
 *   rate = 256, window = w, spread = { 0 }, front = {},
 *   sources = { { hz = 20.25, least = 1, most = 2, driver = 1 } },
 *   claims = { { own = 0.1, others = 0, f_lo = 20, f_hi = 21, gain = 1 } },
 * }
 * assert(proof:run(1, 0, 10, false)[1].violations == 0)
 */
static int proof_run(lua_State *L) {
  handle *h = check_open(L);
  uint64_t seed = check_key(L, 2), first = check_key(L, 3);
  size_t count = lbr_check_count(L, 4, 0, LBR_TALLY_CHUNK);
  int noise = lua_toboolean(L, 5);
  lbr_status status = LBR_OK;
  if (!h->tallier)
    status = lbr_tallier_new(&h->setup.proof, h->workers, &h->tallier);
  if (status == LBR_OK)
    status = lbr_tallier_run(h->tallier, seed, first, count, noise,
                             h->tallies);
  if (status != LBR_OK) return lbr_raise(L, status, "trials");
  size_t lines = h->setup.scene.n_lines;
  lua_createtable(L, (int)lines, 0);
  for (size_t i = 0; i < lines; i++) {
    push_tally(L, &h->tallies[i]);
    lua_seti(L, -2, (lua_Integer)i + 1);
  }
  return 1;
}

static void push_attack(lua_State *L, const lbr_attack *a) {
  lua_createtable(L, 0, 6);
  set_count(L, "line", a->line + 1);
  lua_pushstring(L, a->side > 0 ? "high" : "low");
  lua_setfield(L, -2, "side");
  set_number(L, "predicted", a->predicted);
  set_number(L, "reached", a->reached);
  set_number(L, "amplitude", a->true_amplitude);
  set_number(L, "read", a->read);
}

/*** Attacks every line from both sides.
 * Climbs towards the worst case that the scene allows, makes that record and
 * reads it. Refused beyond records of 2^22 samples.
 * @param seed integer: key of the starting places
 * @return table: two per line, high and low: line, side, predicted and reached
 *   (deviation over claim), amplitude (true), read; or nil, message, code
 * @usage
 * local w = lb.window("hann"):samples(256)
 * local proof = core.proof.new {
 *   rate = 256, window = w, spread = { 0 }, front = {},
 *   sources = { { hz = 20.25, least = 1, most = 2, driver = 1 } },
 *   claims = { { own = 0.1, others = 0, f_lo = 20, f_hi = 21, gain = 1 } },
 * }
 * assert(#proof:attack(1) == 2)
 */
static int proof_attack(lua_State *L) {
  handle *h = check_open(L);
  uint64_t seed = check_key(L, 2);
  size_t count = 2 * h->setup.scene.n_lines;
  lbr_status status =
      lbr_attack_all(&h->setup.proof, seed, h->workers, h->attacks);
  if (status == LBR_DOMAIN)
    return lbr_refuse(L, status, "the adversary takes up to 2^22 samples");
  if (status != LBR_OK) return lbr_raise(L, status, "adversary");
  lua_createtable(L, (int)count, 0);
  for (size_t i = 0; i < count; i++) {
    push_attack(L, &h->attacks[i]);
    lua_seti(L, -2, (lua_Integer)i + 1);
  }
  return 1;
}

static void push_source(lua_State *L, const lbr_particulars *p, size_t i) {
  const lbr_actual *a = &p->actual[i];
  lua_createtable(L, 0, 8);
  set_number(L, "hz", a->hz);
  set_number(L, "amplitude", a->amplitude);
  set_number(L, "phase", a->phase);
  set_number(L, "gain", a->gain);
  set_number(L, "wander", a->wander);
  set_number(L, "wander_phase", a->wander_phase);
  set_number(L, "free_hz", p->free_hz[i]);
  set_number(L, "flatness", p->flatness[i]);
}

/* Everything about the record that is in the bench. */
static void push_particulars(lua_State *L, const handle *h) {
  const lbr_particulars *p = h->bench->particulars;
  lua_createtable(L, 0, 6);
  set_number(L, "timebase", p->timebase);
  set_number(L, "accuracy", p->accuracy);
  set_number(L, "offset", p->offset);
  lua_createtable(L, (int)h->setup.scene.n_drivers, 0);
  for (size_t d = 0; d < h->setup.scene.n_drivers; d++) {
    lua_pushnumber(L, p->deviation[d]);
    lua_seti(L, -2, (lua_Integer)d + 1);
  }
  lua_setfield(L, -2, "deviation");
  lua_createtable(L, (int)h->setup.scene.n_sources, 0);
  for (size_t i = 0; i < h->setup.scene.n_sources; i++) {
    push_source(L, p, i);
    lua_seti(L, -2, (lua_Integer)i + 1);
  }
  lua_setfield(L, -2, "sources");
}

static void push_outcomes(lua_State *L, const handle *h) {
  lua_createtable(L, (int)h->setup.scene.n_lines, 0);
  for (size_t i = 0; i < h->setup.scene.n_lines; i++) {
    const lbr_outcome *o = &h->outcomes[i];
    lua_createtable(L, 0, 6);
    set_number(L, "amplitude", h->bench->particulars->actual[i].amplitude);
    set_number(L, "read", o->read);
    set_number(L, "read_hz", o->read_hz);
    set_number(L, "ratio", o->ratio);
    set_number(L, "ratio_hz", o->ratio_hz);
    set_number(L, "deviation", o->deviation);
    lua_seti(L, -2, (lua_Integer)i + 1);
  }
}

static void need_bench(lua_State *L, handle *h) {
  if (h->bench) return;
  lbr_status status = lbr_bench_new(&h->setup.proof, &h->bench);
  if (status != LBR_OK) lbr_raise(L, status, "replay");
}

static int push_replay(lua_State *L, const handle *h, const double *record) {
  double *x = lbr_push_samples(L, h->setup.proof.n);
  memcpy(x, record, h->setup.proof.n * sizeof *x);
  push_particulars(L, h);
  push_outcomes(L, h);
  return 3;
}

/*** Makes one trial again, bit for bit.
 * @param seed integer: key of all random numbers
 * @param trial integer: number of the trial
 * @param noise boolean: the record with noise, jitter, limits and codes
 * @return samples: the record
 * @return table: its particulars: timebase, accuracy, offset, deviation (of
 *   every driver), sources (hz, amplitude, phase, gain, wander ...)
 * @return table: per line amplitude (true), read, read_hz, ratio, ratio_hz,
 *   deviation (of the reading with noise, in sigma)
 * @usage
 * local w = lb.window("hann"):samples(256)
 * local proof = core.proof.new {
 *   rate = 256, window = w, spread = { 0 }, front = {},
 *   sources = { { hz = 20.25, least = 1, most = 2, driver = 1 } },
 *   claims = { { own = 0.1, others = 0, f_lo = 20, f_hi = 21, gain = 1 } },
 * }
 * local x, particulars = proof:replay(1, 7, false)
 * assert(#x == 256 and particulars.sources[1].hz == 20.25)
 */
static int proof_replay(lua_State *L) {
  handle *h = check_open(L);
  uint64_t seed = check_key(L, 2), trial = check_key(L, 3);
  int noise = lua_toboolean(L, 4);
  need_bench(L, h);
  lbr_status status =
      lbr_trial_run(h->bench, seed, trial, noise, h->outcomes);
  if (status != LBR_OK) return lbr_raise(L, status, "replay");
  return push_replay(L, h, noise ? h->bench->noisy : h->bench->clean);
}

/*** Makes the worst record that the adversary finds for one line.
 * @param seed integer: the seed of the attack
 * @param line integer: the line, from 1
 * @param side string: "high" or "low"
 * @return samples: the record, without noise; or nil, message, code
 * @return table: its particulars, as replay gives them
 * @return table: per line what was read, as replay gives it
 * @usage
 * local w = lb.window("hann"):samples(256)
 * local proof = core.proof.new {
 *   rate = 256, window = w, spread = { 0 }, front = {},
 *   sources = { { hz = 20.25, least = 1, most = 2, driver = 1 } },
 *   claims = { { own = 0.1, others = 0, f_lo = 20, f_hi = 21, gain = 1 } },
 * }
 * local x, particulars, lines = proof:replay_attack(1, 1, "high")
 * assert(#x == 256 and lines[1].ratio < 1)
 */
static int proof_replay_attack(lua_State *L) {
  static const char *const sides[] = {"high", "low", NULL};
  handle *h = check_open(L);
  uint64_t seed = check_key(L, 2);
  size_t line = lbr_check_count(L, 3, 1, h->setup.scene.n_lines) - 1;
  int side = luaL_checkoption(L, 4, NULL, sides) == 0 ? 1 : -1;
  const lbr_proof *proof = &h->setup.proof;
  lbr_attack attack;
  need_bench(L, h);
  lbr_status status = LBR_OK;
  if (!h->response)
    status = lbr_response_new(proof->window, proof->n, &h->response);
  if (status == LBR_DOMAIN)
    return lbr_refuse(L, status, "the adversary takes up to 2^22 samples");
  if (status == LBR_OK)
    status = lbr_attack_run(h->bench, h->response, line, side, seed, &attack);
  if (status != LBR_OK) return lbr_raise(L, status, "adversary");
  lbr_bench_read(h->bench, h->outcomes);
  return push_replay(L, h, h->bench->clean);
}

static const luaL_Reg methods[] = {{"attack", proof_attack},
                                   {"close", proof_close},
                                   {"replay", proof_replay},
                                   {"replay_attack", proof_replay_attack},
                                   {"run", proof_run},
                                   {NULL, NULL}};
static const luaL_Reg meta[] = {
    {"__close", proof_close}, {"__gc", proof_close}, {NULL, NULL}};

/*** Puts a plan on trial.
 * The table says what may be in a record and what is claimed about reading it:
 * rate (S/s), coverage (default 3), window (samples, as many as a record has),
 * spread (relative half-widths of the drivers), sources (hz, lock_hz, free_hz,
 * wander, least, most, driver; the lines first), offset, noise, front (filter,
 * flatness, accuracy, timebase, jitter_s, range, step, noise) and claims, one
 * a line (own, others, sigma, hz, f_lo, f_hi, gain). Absent numbers are 0, an
 * absent front.range or claim hz is unlimited. Raises with the path of the
 * field that is wrong.
 * @param setup table: see above
 * @param workers integer: threads, 0 (default) for one per core
 * @return proof: with the methods run, attack, replay, replay_attack, close
 * @usage
 * local w = lb.window("hann"):samples(64)
 * core.proof.new({
 *   rate = 64, window = w, spread = { 0 }, front = {},
 *   sources = { { hz = 9, least = 1, most = 2, driver = 1 } },
 *   claims = { { own = 0.1, others = 0, f_lo = 9, f_hi = 9, gain = 1 } },
 * }, 1):close()
 */
static int proof_new(lua_State *L) {
  unsigned workers = 0;
  if (!lua_isnoneornil(L, 2))
    workers = (unsigned)lbr_check_count(L, 2, 0, MOST_WORKERS);
  handle *h = lua_newuserdatauv(L, sizeof *h, 0);
  memset(h, 0, sizeof *h);
  lbr_set_class(L, PROOF_CLASS, methods, meta);
  lbr_check_setup(L, 1, &h->setup);
  size_t lines = h->setup.scene.n_lines;
  h->workers = workers;
  h->outcomes = lbr_alloc(lines, sizeof *h->outcomes);
  h->attacks = lbr_alloc(2 * lines, sizeof *h->attacks);
  h->tallies = lbr_alloc(lines, sizeof *h->tallies);
  if (!h->outcomes || !h->attacks || !h->tallies)
    return lbr_raise(L, LBR_NO_MEMORY, "proof");
  return 1;
}

/*** Says whether a person watches the error output.
 * Progress is drawn on a terminal only.
 * @return boolean: whether standard error is a terminal
 * @usage
 * assert(type(core.proof.watched()) == "boolean")
 */
static int proof_watched(lua_State *L) {
  lua_pushboolean(L, isatty(STDERR_FILENO));
  return 1;
}

static const luaL_Reg functions[] = {
    {"new", proof_new}, {"watched", proof_watched}, {NULL, NULL}};

int lbr_open_proof(lua_State *L) {
  luaL_newlib(L, functions);
  return 1;
}
