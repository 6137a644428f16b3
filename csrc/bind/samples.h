/* Samples as Lua sees them: a view (userdata) of doubles whose memory is held
 * by a block (another userdata) kept alive through the view's user value.
 */
#ifndef LBR_BIND_SAMPLES_H
#define LBR_BIND_SAMPLES_H

#include "bind/bind.h"

#define LBR_SAMPLES_CLASS "libration.samples"

typedef struct lbr_view {
  double *data; /* first sample of the view */
  size_t n;     /* samples in the view */
} lbr_view;

/* Pushes a view of a new zeroed block of n samples; raises when it cannot be
 * had.  The pointer stays valid while the view is reachable from Lua. */
double *lbr_push_samples(lua_State *L, size_t n);

/* Argument `arg` as samples; raises an argument error otherwise. */
const double *lbr_check_samples(lua_State *L, int arg, size_t *n);

#endif
