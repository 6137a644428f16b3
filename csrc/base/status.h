/* Status codes: how every function of the core that can fail says so.
 *
 * A status is returned and never ignored (LBR_CHECKED makes the compiler
 * insist).  Results leave through out pointers, which are only written when
 * the status is LBR_OK.
 */
#ifndef LBR_BASE_STATUS_H
#define LBR_BASE_STATUS_H

#define LBR_CHECKED __attribute__((warn_unused_result))

typedef enum lbr_status {
  LBR_OK = 0,
  LBR_NO_MEMORY,   /* an allocation failed */
  LBR_OVERFLOW,    /* exact arithmetic or a size left 64 bits */
  LBR_DOMAIN,      /* an argument outside what the function is defined for */
  LBR_UNKNOWN,     /* a name that no table row has */
  LBR_NO_CONVERGE, /* an iteration did not settle */
  LBR_IO,          /* the operating system refused a file */
  LBR_FORMAT,      /* a file that is not what it says it is */
  LBR_INFEASIBLE,  /* no plan holds the demand */
  LBR_STOPPED,     /* the caller asked to stop */
  LBR_STATUS_COUNT
} lbr_status;

/* A short English sentence part, never NULL; unknown codes say so. */
const char *lbr_status_text(lbr_status status);

/* A stable lower-case word for scripts ("no_memory"), never NULL. */
const char *lbr_status_code(lbr_status status);

#endif
