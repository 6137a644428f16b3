/* core.base: the clock and the cores of this machine. */
#include <time.h>

#include "base/workers.h"
#include "bind/bind.h"
#include "bind/fraction.h"

/*** Reads a clock that only runs forwards, for measuring durations.
 * Its zero is arbitrary; differences are what counts.
 * @return number: seconds
 * @usage
 * local started = core.base.clock()
 * assert(core.base.clock() >= started)
 */
static int base_clock(lua_State *L) {
  struct timespec now;
  if (clock_gettime(CLOCK_MONOTONIC, &now) != 0)
    return luaL_error(L, "clock: this machine has no monotonic clock");
  lua_pushnumber(L, (lua_Number)now.tv_sec + 1e-9 * (lua_Number)now.tv_nsec);
  return 1;
}

/*** Counts the cores that this process may use.
 * What "all cores" means wherever work is shared out: an affinity mask set
 * from outside counts.
 * @return integer: cores, at least 1
 * @usage
 * assert(core.base.cores() >= 1)
 */
static int base_cores(lua_State *L) {
  lua_pushinteger(L, (lua_Integer)lbr_cores());
  return 1;
}

static const luaL_Reg functions[] = {
    {"clock", base_clock},
    {"cores", base_cores},
    {NULL, NULL},
};

int lbr_open_base(lua_State *L) {
  luaL_newlib(L, functions);
  lbr_add_numbers(L);
  return 1;
}
