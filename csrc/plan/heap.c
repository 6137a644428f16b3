#include "plan/heap.h"

#include <stdlib.h>
#include <string.h>

#define MOST_NODES ((size_t)1 << 24) /* half a gigabyte: give up first */
#define ROUNDING_BITS 12 /* durations closer than this count as equal */

/* Durations as whole numbers, so that n / rate made in two ways compares
 * equal and the order stays strict. */
static uint64_t rounded(double t) {
  uint64_t bits;
  memcpy(&bits, &t, sizeof bits);
  return (bits + (1u << (ROUNDING_BITS - 1))) >> ROUNDING_BITS;
}

/* Ranges go before candidates of the same duration; fewer samples first. */
static bool before(const lbr_node *a, const lbr_node *b) {
  uint64_t ta = rounded(a->t1), tb = rounded(b->t1);
  if (ta != tb) return ta < tb;
  if (a->n != b->n) return a->n < b->n;
  if (a->field != b->field) return a->field < b->field;
  return a->rate < b->rate;
}

lbr_status lbr_heap_push(lbr_heap *h, lbr_node node) {
  if (h->count == h->room) {
    if (h->room >= MOST_NODES) return LBR_STOPPED;
    size_t room = h->room ? 2 * h->room : 1024;
    lbr_node *grown = realloc(h->node, room * sizeof *grown);
    if (!grown) return LBR_NO_MEMORY;
    h->node = grown;
    h->room = room;
  }
  size_t at = h->count++;
  while (at > 0 && before(&node, &h->node[(at - 1) / 2])) {
    h->node[at] = h->node[(at - 1) / 2];
    at = (at - 1) / 2;
  }
  h->node[at] = node;
  return LBR_OK;
}

bool lbr_heap_pop(lbr_heap *h, lbr_node *out) {
  if (h->count == 0) return false;
  *out = h->node[0];
  lbr_node last = h->node[--h->count];
  size_t at = 0;
  for (size_t child = 1; child < h->count; child = 2 * at + 1) {
    if (child + 1 < h->count && before(&h->node[child + 1], &h->node[child]))
      child++;
    if (!before(&h->node[child], &last)) break;
    h->node[at] = h->node[child];
    at = child;
  }
  if (h->count > 0) h->node[at] = last;
  return true;
}

void lbr_heap_free(lbr_heap *h) {
  free(h->node);
  *h = (lbr_heap){NULL, 0, 0};
}
