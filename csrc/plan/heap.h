/* A heap of what the search still has to look at, shortest duration first. */
#ifndef LBR_PLAN_HEAP_H
#define LBR_PLAN_HEAP_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/status.h"

typedef struct lbr_node {
  double t1, t2; /* durations [t1, t2), s; a candidate has t1 = t2 */
  size_t n;      /* samples of a candidate; 0: a range */
  uint32_t field, rate; /* field: a mode on a band of rates */
} lbr_node;

typedef struct lbr_heap {
  lbr_node *node;
  size_t count, room;
} lbr_heap;

/* LBR_STOPPED: it would take more memory than a search is worth. */
LBR_CHECKED lbr_status lbr_heap_push(lbr_heap *heap, lbr_node node);
bool lbr_heap_pop(lbr_heap *heap, lbr_node *out); /* false: empty */
void lbr_heap_free(lbr_heap *heap);

#endif
