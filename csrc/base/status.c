#include "base/status.h"

static const struct {
  const char *code, *text;
} rows[LBR_STATUS_COUNT] = {
    [LBR_OK] = {"ok", "no error"},
    [LBR_NO_MEMORY] = {"no_memory", "out of memory"},
    [LBR_OVERFLOW] = {"overflow",
                      "a value does not fit 64-bit exact arithmetic"},
    [LBR_DOMAIN] = {"domain", "an argument is outside its domain"},
    [LBR_UNKNOWN] = {"unknown", "no such name"},
    [LBR_NO_CONVERGE] = {"no_converge", "an iteration did not converge"},
    [LBR_IO] = {"io", "the operating system refused"},
    [LBR_FORMAT] = {"format", "the data is not in the stated format"},
    [LBR_INFEASIBLE] = {"infeasible", "no plan holds the demand"},
    [LBR_STOPPED] = {"stopped", "stopped on request"},
};

const char *lbr_status_text(lbr_status status) {
  return (unsigned)status < LBR_STATUS_COUNT ? rows[status].text
                                             : "unknown status";
}

const char *lbr_status_code(lbr_status status) {
  return (unsigned)status < LBR_STATUS_COUNT ? rows[status].code : "unknown";
}
