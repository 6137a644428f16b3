/* Samples as Lua sees them: a view (userdata) of doubles whose memory is held
 * by a block (another userdata) kept alive through the view's user value.
 */
#ifndef LBR_BIND_SAMPLES_H
#define LBR_BIND_SAMPLES_H

#include "bind/bind.h"
#include "samples/raw.h"

#define LBR_SAMPLES_CLASS "libration.samples"
#define LBR_RAW_CLASS "libration.raw"

typedef struct lbr_view {
  double *data; /* first sample of the view */
  size_t n;     /* samples in the view */
} lbr_view;

/* Pushes a view of a new zeroed block of n samples; raises when it cannot be
 * had.  The pointer stays valid while the view is reachable from Lua. */
double *lbr_push_samples(lua_State *L, size_t n);

/* The same with whatever the memory held: the caller writes every sample. */
double *lbr_push_unset_samples(lua_State *L, size_t n);

/* Argument `arg` as samples; raises an argument error otherwise. */
const double *lbr_check_samples(lua_State *L, int arg, size_t *n);

/* The same for a function that writes into them. */
double *lbr_check_writable_samples(lua_State *L, int arg, size_t *n);

/* Arguments first and last (both may be absent, negative ones count from the
 * end) as a range of a sequence of n: *from counts from 0, *count may be 0.
 * Raises when they leave 1 .. n. */
void lbr_check_range(lua_State *L, int first, int last, size_t n, size_t *from,
                     size_t *count);

/* Methods that live in samples_math.c, NULL-ended, and their metamethods. */
extern const luaL_Reg lbr_samples_math_methods[];
extern const luaL_Reg lbr_samples_math_meta[];

/* Methods that live in samples_stats.c, samples_shape.c, samples_angle.c and
 * spectrum_calculus.c, NULL-ended. */
extern const luaL_Reg lbr_samples_stats_methods[];
extern const luaL_Reg lbr_samples_shape_methods[];
extern const luaL_Reg lbr_samples_angle_methods[];
extern const luaL_Reg lbr_samples_calculus_methods[];

/* More functions and metamethods of samples_shape.c. */
extern const luaL_Reg lbr_samples_shape_functions[];
extern const luaL_Reg lbr_samples_shape_meta[];

/* Counts codes of raw samples from argument 2 to 3 and pushes the counts, how
 * many lie below and how many above (samples_stats.c). */
int lbr_raw_codes(lua_State *L, const void *data, size_t n, lbr_raw_kind kind);

/* Registers the raw class; its functions go into the table at the top. */
void lbr_open_raw(lua_State *L);

#endif
