#include "reading/budget.h"

#include <math.h>

#include "reading/leak.h"
#include "reading/parts.h"

static const char *const texts[LBR_TERM_KINDS] = {
    [LBR_TERM_SCALLOP] = "own scalloping",
    [LBR_TERM_IMAGE] = "own image",
    [LBR_TERM_SMEAR] = "own wander",
    [LBR_TERM_DROOP] = "filter droop",
    [LBR_TERM_ACCURACY] = "sensor and range",
    [LBR_TERM_JITTER_LOSS] = "jitter loss",
    [LBR_TERM_OFFSET] = "offset",
    [LBR_TERM_LEAKAGE] = "leakage",
    [LBR_TERM_PRODUCTS] = "joint terms",
    [LBR_TERM_NOISE] = "noise",
    [LBR_TERM_QUANTISATION] = "quantisation",
    [LBR_TERM_JITTER_NOISE] = "jitter noise",
};

const char *lbr_term_text(lbr_term_kind kind) {
  return (unsigned)kind < LBR_TERM_KINDS ? texts[kind] : "unknown term";
}

size_t lbr_bound_budget(const lbr_case *c, size_t line,
                        const lbr_bound *bound, lbr_term *terms) {
  lbr_parts p = lbr_bound_parts(c, line, bound->steer);
  lbr_variance v = lbr_bound_variance(c, line);
  double a = bound->amplitude, k = c->coverage / sqrt((double)c->averages);
  double systematic = bound->own * a + bound->others;
  const lbr_term own[] = {{LBR_TERM_SCALLOP, line, p.lobe * a},
                          {LBR_TERM_IMAGE, line, p.image * a},
                          {LBR_TERM_SMEAR, line, p.smear * a},
                          {LBR_TERM_DROOP, line, p.droop * a},
                          {LBR_TERM_ACCURACY, line, p.accuracy * a},
                          {LBR_TERM_JITTER_LOSS, line, p.jitter_loss * a},
                          {LBR_TERM_OFFSET, line, p.offset}};
  size_t count = 0;
  double sum = 0;
  for (size_t i = 0; i < sizeof own / sizeof *own; i++) {
    terms[count++] = own[i];
    sum += own[i].value;
  }
  size_t asked = 0;
  lbr_leak l = lbr_leak_of_case(c, line, bound->steer, &asked);
  for (size_t j = 0; j < c->scene->n_sources; j++) {
    if (j == line) continue;
    double value = lbr_leak_of(&l, j);
    terms[count++] = (lbr_term){LBR_TERM_LEAKAGE, j, value};
    sum += value;
  }
  terms[count++] = (lbr_term){LBR_TERM_PRODUCTS, line, systematic - sum};
  terms[count++] = (lbr_term){LBR_TERM_NOISE, line, k * sqrt(v.noise)};
  terms[count++] =
      (lbr_term){LBR_TERM_QUANTISATION, line, k * sqrt(v.quantisation)};
  terms[count++] = (lbr_term){LBR_TERM_JITTER_NOISE, line, k * sqrt(v.jitter)};
  return count;
}
