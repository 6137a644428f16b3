/* A door for the tests to what base/ offers to C alone. */
#include <lauxlib.h>
#include <lua.h>
#include <sched.h>
#include <stdatomic.h>
#include <stdint.h>
#include <stdlib.h>

#include "base/checked.h"
#include "base/status.h"
#include "base/workers.h"

#define MOST_TASKS 4096

typedef struct book {
  atomic_uint runs[MOST_TASKS];         /* times that a task has run */
  lbr_status status[MOST_TASKS];        /* what it is to return */
  atomic_uint busy[256];                /* tasks that a worker is in now */
  atomic_uint most_worker;              /* highest worker number seen */
  atomic_uint shared;                   /* times a worker was in two tasks */
} book;

static lbr_status task(void *context, size_t number, unsigned worker) {
  book *b = context;
  if (atomic_fetch_add(&b->busy[worker], 1) != 0)
    atomic_fetch_add(&b->shared, 1);
  atomic_fetch_add(&b->runs[number], 1);
  unsigned most = atomic_load(&b->most_worker);
  while (worker > most)
    if (atomic_compare_exchange_weak(&b->most_worker, &most, worker)) break;
  for (size_t i = 0; i < number % 7; i++) sched_yield();
  atomic_fetch_sub(&b->busy[worker], 1);
  return b->status[number];
}

static void push_book(lua_State *L, book *b, size_t tasks) {
  lua_newtable(L);
  for (size_t i = 0; i < tasks; i++) {
    lua_pushinteger(L, (lua_Integer)atomic_load(&b->runs[i]));
    lua_seti(L, -2, (lua_Integer)i + 1);
  }
  lua_pushinteger(L, (lua_Integer)atomic_load(&b->most_worker));
  lua_pushinteger(L, (lua_Integer)atomic_load(&b->shared));
}

/* run(tasks, workers, {[task number from 1] = status number}) gives the status
 * number, runs of each task, the highest worker number, and how often one
 * worker was in two tasks at once. */
static int run(lua_State *L) {
  size_t tasks = (size_t)luaL_checkinteger(L, 1);
  unsigned workers = (unsigned)luaL_checkinteger(L, 2);
  luaL_argcheck(L, tasks <= MOST_TASKS, 1, "too many tasks");
  book *b = lua_newuserdatauv(L, sizeof *b, 0);
  for (size_t i = 0; i < MOST_TASKS; i++) {
    atomic_init(&b->runs[i], 0);
    lua_geti(L, 3, (lua_Integer)i + 1);
    b->status[i] = (lbr_status)lua_tointeger(L, -1);
    lua_pop(L, 1);
  }
  for (size_t i = 0; i < 256; i++) atomic_init(&b->busy[i], 0);
  atomic_init(&b->most_worker, 0);
  atomic_init(&b->shared, 0);
  lua_pushinteger(L, (lua_Integer)lbr_workers_run(task, b, tasks, workers));
  push_book(L, b, tasks);
  return 4;
}

static int status_words(lua_State *L) {
  lbr_status status = (lbr_status)luaL_checkinteger(L, 1);
  lua_pushstring(L, lbr_status_code(status));
  lua_pushstring(L, lbr_status_text(status));
  return 2;
}

/* size(count, size): bytes, or nil and the code. */
static int size(lua_State *L) {
  size_t bytes;
  lbr_status status = lbr_size((size_t)luaL_checkinteger(L, 1),
                               (size_t)luaL_checkinteger(L, 2), &bytes);
  if (status == LBR_OK) lua_pushinteger(L, (lua_Integer)bytes);
  else lua_pushnil(L);
  lua_pushstring(L, lbr_status_code(status));
  return 2;
}

/* alloc(count, size): whether memory was had, and whether it is all zero. */
static int alloc(lua_State *L) {
  size_t count = (size_t)luaL_checkinteger(L, 1);
  size_t each = (size_t)luaL_checkinteger(L, 2);
  unsigned char *block = lbr_alloc(count, each);
  int zero = block != NULL;
  for (size_t i = 0; block && i < count * each; i++) zero = zero && !block[i];
  free(block);
  lua_pushboolean(L, block != NULL);
  lua_pushboolean(L, zero);
  return 2;
}

/* plant(fault): does what the sanitizers and memcheck are there to see:
 * "overrun" reads behind a block, "leak" loses one, "signed" leaves the range
 * of an int. */
static int plant(lua_State *L) {
  static const char *const faults[] = {"overrun", "leak", "signed", NULL};
  int fault = luaL_checkoption(L, 1, NULL, faults);
  volatile int big = 0x7fffffff;
  unsigned char *volatile block = malloc(16);
  volatile size_t behind = 16;
  if (block && fault == 0) lua_pushinteger(L, block[behind]);
  if (fault == 2) lua_pushinteger(L, big + 1);
  if (fault != 1) free(block);
  block = NULL;
  return 0;
}

static const luaL_Reg functions[] = {{"run", run},
                                     {"status_words", status_words},
                                     {"size", size},
                                     {"alloc", alloc},
                                     {"plant", plant},
                                     {NULL, NULL}};

__attribute__((visibility("default"))) int luaopen_probe(lua_State *L);

int luaopen_probe(lua_State *L) {
  luaL_newlib(L, functions);
  lua_pushinteger(L, LBR_STATUS_COUNT);
  lua_setfield(L, -2, "statuses");
  return 1;
}
