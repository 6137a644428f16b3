/* An allocator that fails on demand, linked into core.so of `make check-alloc`
 * with -Wl,--wrap, so that only what the module itself asks for can fail.
 *
 * luaopen_libration_alloc gives Lua:
 *   fail_after(n)  the next n requests succeed, all later ones fail; a
 *                  negative n ends the failing
 *   failed()       requests that have failed since fail_after was called
 *   asked()        requests seen since fail_after was called
 *   live()         blocks that the module holds
 */
#include <errno.h>
#include <lauxlib.h>
#include <lua.h>
#include <pthread.h>
#include <stdatomic.h>
#include <stddef.h>
#include <string.h>

void *__real_malloc(size_t size);
void *__real_calloc(size_t count, size_t size);
void *__real_realloc(void *block, size_t size);
void *__real_aligned_alloc(size_t alignment, size_t size);
int __real_posix_memalign(void **out, size_t alignment, size_t size);
void __real_free(void *block);
char *__real_strdup(const char *text);
void *__real_fftw_malloc(size_t size);
void __real_fftw_free(void *block);
int __real_pthread_create(pthread_t *thread, const pthread_attr_t *attributes,
                          void *(*run)(void *), void *argument);

void *__wrap_malloc(size_t size);
void *__wrap_calloc(size_t count, size_t size);
void *__wrap_realloc(void *block, size_t size);
void *__wrap_aligned_alloc(size_t alignment, size_t size);
int __wrap_posix_memalign(void **out, size_t alignment, size_t size);
void __wrap_free(void *block);
char *__wrap_strdup(const char *text);
void *__wrap_fftw_malloc(size_t size);
void __wrap_fftw_free(void *block);
int __wrap_pthread_create(pthread_t *thread, const pthread_attr_t *attributes,
                          void *(*run)(void *), void *argument);

static atomic_llong allowance = -1; /* requests that still succeed; < 0: all */
static atomic_llong asked_for;
static atomic_llong refused;
static atomic_llong held;

/* Whether this request is to succeed. */
static int granted(void) {
  atomic_fetch_add(&asked_for, 1);
  long long left = atomic_load(&allowance);
  while (left > 0)
    if (atomic_compare_exchange_weak(&allowance, &left, left - 1)) return 1;
  if (left < 0) return 1;
  atomic_fetch_add(&refused, 1);
  errno = ENOMEM;
  return 0;
}

static void *counted(void *block) {
  if (block) atomic_fetch_add(&held, 1);
  return block;
}

static void released(const void *block) {
  if (block) atomic_fetch_sub(&held, 1);
}

void *__wrap_malloc(size_t size) {
  return granted() ? counted(__real_malloc(size)) : NULL;
}

void *__wrap_calloc(size_t count, size_t size) {
  return granted() ? counted(__real_calloc(count, size)) : NULL;
}

void *__wrap_realloc(void *block, size_t size) {
  if (!granted()) return NULL;
  void *moved = __real_realloc(block, size);
  if (!block) counted(moved);
  return moved;
}

void *__wrap_aligned_alloc(size_t alignment, size_t size) {
  return granted() ? counted(__real_aligned_alloc(alignment, size)) : NULL;
}

int __wrap_posix_memalign(void **out, size_t alignment, size_t size) {
  if (!granted()) return ENOMEM;
  int error = __real_posix_memalign(out, alignment, size);
  if (error == 0) counted(*out);
  return error;
}

void __wrap_free(void *block) {
  released(block);
  __real_free(block);
}

char *__wrap_strdup(const char *text) {
  return granted() ? counted(__real_strdup(text)) : NULL;
}

void *__wrap_fftw_malloc(size_t size) {
  return granted() ? counted(__real_fftw_malloc(size)) : NULL;
}

void __wrap_fftw_free(void *block) {
  released(block);
  __real_fftw_free(block);
}

/* A thread needs memory too; where it cannot be had, EAGAIN says so. */
int __wrap_pthread_create(pthread_t *thread, const pthread_attr_t *attributes,
                          void *(*run)(void *), void *argument) {
  return granted() ? __real_pthread_create(thread, attributes, run, argument)
                   : EAGAIN;
}

static int fail_after(lua_State *L) {
  atomic_store(&allowance, (long long)luaL_checkinteger(L, 1));
  atomic_store(&asked_for, 0);
  atomic_store(&refused, 0);
  return 0;
}

static int failed(lua_State *L) {
  lua_pushinteger(L, (lua_Integer)atomic_load(&refused));
  return 1;
}

static int asked(lua_State *L) {
  lua_pushinteger(L, (lua_Integer)atomic_load(&asked_for));
  return 1;
}

static int live(lua_State *L) {
  lua_pushinteger(L, (lua_Integer)atomic_load(&held));
  return 1;
}

static const luaL_Reg functions[] = {
    {"fail_after", fail_after}, {"failed", failed}, {"asked", asked},
    {"live", live},             {NULL, NULL},
};

__attribute__((visibility("default"))) int luaopen_libration_alloc(
    lua_State *L);

int luaopen_libration_alloc(lua_State *L) {
  luaL_newlib(L, functions);
  return 1;
}
