/* A planning problem as a Lua handle: the scene, the front end, the rates and
 * the modes, copied out of tables that the library has already checked.
 */
#ifndef LBR_BIND_PROBLEM_H
#define LBR_BIND_PROBLEM_H

#include "bind/bind.h"
#include "plan/problem.h"

#define LBR_PROBLEM_CLASS "libration.problem"

typedef struct lbr_problem_handle {
  lbr_scene scene;       /* arrays below are owned by the handle */
  lbr_source *sources;
  lbr_line *lines;
  double *spread;
  lbr_front_end front;
  lbr_rates rates;
  lbr_mode *modes;
  size_t n_modes;
  lbr_problem problem;   /* points into the fields above */
} lbr_problem_handle;

/* Pushes a handle filled from the table at `arg`; raises naming the field. */
lbr_problem_handle *lbr_push_problem(lua_State *L, int arg);

/* Argument `arg` as a problem; raises otherwise. */
lbr_problem_handle *lbr_check_problem(lua_State *L, int arg);

/* Argument `arg` as a positive finite number; raises otherwise. */
double lbr_check_positive(lua_State *L, int arg);

/* Adds folding and coherence to the table at the top of the stack. */
void lbr_add_folds(lua_State *L);

/* Fields of the table at `arg`; the first raises when the field is missing
 * or not a finite number. */
double lbr_field_number(lua_State *L, int arg, const char *name);
double lbr_field_or(lua_State *L, int arg, const char *name, double fallback);

#endif
