#include "bind/problem.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "plan/search.h"
#include "reading/budget.h"

double lbr_check_positive(lua_State *L, int arg) {
  double value = luaL_checknumber(L, arg);
  luaL_argcheck(L, value > 0 && isfinite(value), arg,
                "a positive number is needed");
  return value;
}

/*** A planning problem, copied out of a table of bare numbers.
 * Meant for the library's plan module, which makes the table from a demand
 * and a digitizer; csrc/bind/problem.c names the fields.
 * @param t table: sources, lines, spread, offset, noise, front, rates, modes,
 *   limits
 * @return problem: a handle for search, judge, budget and rates
 * @usage
 * local ok, message = pcall(core.plan.problem, {})
 * assert(not ok and message:find "spread")
 */
static int plan_problem(lua_State *L) {
  lua_settop(L, 1);
  lbr_push_problem(L, 1);
  return 1;
}

static void set_number(lua_State *L, const char *name, double value) {
  lua_pushnumber(L, value);
  lua_setfield(L, -2, name);
}

static void set_count(lua_State *L, const char *name, size_t value) {
  lua_pushinteger(L, (lua_Integer)value);
  lua_setfield(L, -2, name);
}

static void push_effort(lua_State *L, const lbr_search_count *count) {
  lua_createtable(L, 0, 5);
  set_count(L, "ranges", count->ranges);
  set_count(L, "candidates", count->candidates);
  set_count(L, "bounds", count->bounds);
  set_number(L, "work", count->work);
  set_number(L, "open_s", count->open);
}

static void push_setting(lua_State *L, const lbr_rate *rate) {
  lua_createtable(L, 3, 0);
  for (int k = 0; k < 3; k++) {
    lua_pushinteger(L, rate->setting[k]);
    lua_rawseti(L, -2, k + 1);
  }
}

static void push_choice(lua_State *L, const lbr_problem *p,
                        const lbr_choice *choice) {
  const lbr_rate *rate = &p->rates->item[choice->rate];
  lua_createtable(L, 0, 4);
  set_number(L, "rate", rate->value);
  set_count(L, "samples", choice->n);
  set_count(L, "mode", choice->mode + 1);
  push_setting(L, rate);
  lua_setfield(L, -2, "setting");
}

/*** One rate of a problem's digitizer.
 * @param problem problem: from core.plan.problem
 * @param index integer: 1 (the lowest) to core.plan.rates(problem)
 * @return number: S/s
 * @return table: setting (three numbers), as in a choice
 * @usage
 * assert(type(core.plan.rate_at) == "function")
 */
static int plan_rate_at(lua_State *L) {
  const lbr_rates *rates = &lbr_check_problem(L, 1)->rates;
  size_t index = lbr_check_count(L, 2, 1, rates->count) - 1;
  const lbr_rate *rate = &rates->item[index];
  lua_pushnumber(L, rate->value);
  push_setting(L, rate);
  return 2;
}

/*** The shortest record that holds a problem's demand.
 * @param problem problem: from core.plan.problem
 * @param t table: share (of the tolerances that errors may take, default 1),
 *   most_duration, least_duration (s; nothing shorter is looked for), most_work
 *   and care_work (about microseconds); absent: the problem's
 * @return table: rate, samples, mode (index), setting (three numbers); or nil,
 *   message, code ("infeasible": nothing fits, "stopped": gave up)
 * @return table: effort: ranges, candidates, bounds, work, open_s (records from
 *   here on were not all looked at; math.huge: all were); after a refusal it is
 *   the fourth value
 * @usage
 * assert(type(core.plan.search) == "function")
 */
static int plan_search(lua_State *L) {
  lbr_problem problem = lbr_check_problem(L, 1)->problem;
  luaL_checktype(L, 2, LUA_TTABLE);
  problem.share = lbr_field_or(L, 2, "share", problem.share);
  problem.most_duration =
      lbr_field_or(L, 2, "most_duration", problem.most_duration);
  problem.least_duration = lbr_field_or(L, 2, "least_duration", 0);
  problem.most_work = lbr_field_or(L, 2, "most_work", problem.most_work);
  problem.care_work = lbr_field_or(L, 2, "care_work", problem.care_work);
  lbr_choice choice;
  lbr_search_count count;
  lbr_status status = lbr_search_run(&problem, &choice, &count);
  if (status != LBR_OK) {
    lbr_refuse(L, status, "search");
    push_effort(L, &count);
    return 4;
  }
  push_choice(L, &problem, &choice);
  push_effort(L, &count);
  return 2;
}

/* A kernel and a path held by Lua while a case is judged. */
typedef struct bench {
  lbr_kernel *kernel;
  lbr_path path;
  lbr_case c;
} bench;

static int bench_free(lua_State *L) {
  bench *b = lua_touserdata(L, 1);
  lbr_kernel_free(b->kernel);
  b->kernel = NULL;
  return 0;
}

/* Arguments problem, rate, mode, samples as a case. */
static bench *push_bench(lua_State *L) {
  const lbr_problem_handle *h = lbr_check_problem(L, 1);
  double rate = lbr_check_positive(L, 2);
  size_t mode = lbr_check_count(L, 3, 1, h->n_modes) - 1;
  size_t n = lbr_check_count(L, 4, 4, (size_t)1 << 40);
  bench *b = lua_newuserdatauv(L, sizeof *b, 1);
  memset(b, 0, sizeof *b);
  if (luaL_newmetatable(L, "libration.bench")) {
    lua_pushcfunction(L, bench_free);
    lua_setfield(L, -2, "__gc");
  }
  lua_setmetatable(L, -2);
  double *memory = lua_newuserdatauv(
      L, (lbr_path_doubles(&h->scene) + 1) * sizeof *memory, 0);
  lua_setiuservalue(L, -2, 1);
  lbr_path_fill(&b->path, &h->scene, &h->front, rate, memory);
  b->c = (lbr_case){.scene = &h->scene, .front = &h->front, .path = &b->path,
                    .reading = h->modes[mode].reading, .n = n,
                    .averages = h->problem.averages,
                    .coverage = h->problem.coverage};
  lbr_status status = lbr_kernel_new(&h->modes[mode].window, n, &b->kernel);
  if (status == LBR_OK)
    status = lbr_second_moment(&h->modes[mode].window, &b->c.second_moment);
  if (status != LBR_OK) lbr_raise(L, status, "window");
  b->c.kernel = b->kernel;
  b->c.noise_bandwidth = lbr_kernel_noise_bandwidth(b->kernel);
  return b;
}

static void push_bound(lua_State *L, const lbr_case *c, size_t line,
                       const lbr_bound *bound) {
  double low, high;
  lbr_bound_search(c, line, &low, &high);
  lua_createtable(L, 0, 16);
  set_number(L, "own", bound->own);
  set_number(L, "others", bound->others);
  set_number(L, "sigma", bound->sigma);
  set_number(L, "hz_bound", bound->hz);
  set_number(L, "sigma_hz", bound->sigma_hz);
  set_number(L, "amplitude", bound->amplitude);
  set_number(L, "error", bound->error);
  set_number(L, "tolerance", bound->tolerance);
  set_number(L, "ratio", bound->ratio);
  set_number(L, "ratio_hz", bound->ratio_hz);
  set_number(L, "search_low_hz", low);
  set_number(L, "search_high_hz", high);
  set_number(L, "gain", c->path->nominal[line]);
}

/*** The bound of every line for one rate, mode and record length.
 * @param problem problem: from core.plan.problem
 * @param rate number: S/s
 * @param mode integer: index into the problem's modes
 * @param samples integer: record length
 * @param care string: "joint" (default: sources of a driver worst at once) or
 *   "plain" (every source at its own worst place: looser, far quicker)
 * @return table: one row a line: own, others, sigma, hz_bound, sigma_hz,
 *   amplitude, error, tolerance, ratio, ratio_hz, search_low_hz,
 *   search_high_hz, gain
 * @usage
 * assert(type(core.plan.judge) == "function")
 */
static int plan_judge(lua_State *L) {
  static const char *const cares[] = {"plain", "joint", NULL};
  lbr_care care = luaL_checkoption(L, 5, "joint", cares) == 0
                      ? LBR_CARE_PLAIN
                      : LBR_CARE_JOINT;
  const bench *b = push_bench(L);
  size_t lines = b->c.scene->n_lines;
  lua_createtable(L, (int)lines, 0);
  for (size_t i = 0; i < lines; i++) {
    lbr_bound bound;
    lbr_bound_line(&b->c, i, care, 0, &bound);
    push_bound(L, &b->c, i, &bound);
    lua_rawseti(L, -2, (lua_Integer)i + 1);
  }
  return 1;
}

/*** Whether every line keeps a share of its tolerance, by plain bounds.
 * @param problem problem: from core.plan.problem
 * @param rate number: S/s
 * @param mode integer: index into the problem's modes
 * @param samples integer: record length
 * @param share number: of the tolerances
 * @return boolean
 * @usage
 * assert(type(core.plan.holds) == "function")
 */
static int plan_holds(lua_State *L) {
  double share = luaL_checknumber(L, 5);
  luaL_argcheck(L, share > 0, 5, "a positive share is needed");
  const bench *b = push_bench(L);
  bool holds = true;
  for (size_t i = 0; holds && i < b->c.scene->n_lines; i++) {
    lbr_bound bound;
    lbr_bound_line(&b->c, i, LBR_CARE_PLAIN, share, &bound);
    holds = bound.ratio <= share;
  }
  lua_pushboolean(L, holds);
  return 1;
}

/*** Every entry of one line's error budget.
 * @param problem problem: from core.plan.problem
 * @param rate number: S/s
 * @param mode integer: index into the problem's modes
 * @param samples integer: record length
 * @param line integer: index of the line
 * @return table: rows { term =, source = (index, leakage only), value =
 *   (demand's unit), random = boolean }
 * @usage
 * assert(type(core.plan.budget) == "function")
 */
static int plan_budget(lua_State *L) {
  const bench *b = push_bench(L);
  const lbr_scene *scene = b->c.scene;
  size_t line = lbr_check_count(L, 5, 1, scene->n_lines) - 1;
  lbr_term *terms = lua_newuserdatauv(
      L, (scene->n_sources + LBR_TERM_KINDS) * sizeof *terms, 0);
  lbr_bound bound;
  lbr_bound_line(&b->c, line, LBR_CARE_JOINT, 0, &bound);
  size_t n = lbr_bound_budget(&b->c, line, &bound, terms);
  lua_createtable(L, (int)n, 0);
  for (size_t k = 0; k < n; k++) {
    lua_createtable(L, 0, 4);
    lua_pushstring(L, lbr_term_text(terms[k].kind));
    lua_setfield(L, -2, "term");
    if (terms[k].kind == LBR_TERM_LEAKAGE)
      set_count(L, "source", terms[k].source + 1);
    set_number(L, "value", terms[k].value);
    lua_pushboolean(L, terms[k].kind >= LBR_TERM_NOISE);
    lua_setfield(L, -2, "random");
    lua_rawseti(L, -2, (lua_Integer)k + 1);
  }
  return 1;
}

/*** How many rates a problem's digitizer can make, and their limits.
 * @param problem problem: from core.plan.problem
 * @return integer: count
 * @return number: lowest rate, S/s (0 when there is none)
 * @return number: highest rate, S/s
 * @usage
 * assert(type(core.plan.rates) == "function")
 */
static int plan_rates(lua_State *L) {
  const lbr_rates *rates = &lbr_check_problem(L, 1)->rates;
  size_t n = rates->count;
  lua_pushinteger(L, (lua_Integer)n);
  lua_pushnumber(L, n ? rates->item[0].value : 0);
  lua_pushnumber(L, n ? rates->item[n - 1].value : 0);
  return 3;
}

static const luaL_Reg functions[] = {
    {"budget", plan_budget},
    {"holds", plan_holds},
    {"judge", plan_judge},
    {"problem", plan_problem},
    {"rate_at", plan_rate_at},
    {"rates", plan_rates},
    {"search", plan_search},
    {NULL, NULL},
};

int lbr_open_plan(lua_State *L) {
  luaL_newlib(L, functions);
  lbr_add_folds(L);
  return 1;
}
