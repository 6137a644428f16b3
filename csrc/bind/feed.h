/* Feeds as Lua sees them: a userdata over blocks in memory or an open file.
 */
#ifndef LBR_BIND_FEED_H
#define LBR_BIND_FEED_H

#include "bind/bind.h"
#include "samples/feed.h"
#include "samples/raw.h"

#define LBR_FEED_CLASS "libration.feed"

/* The handle; made empty first, so that an error cannot lose the context. */
typedef struct lbr_feed_handle {
  lbr_feed feed;          /* .read == NULL: closed */
  void (*close)(void *);  /* frees feed.context; NULL: nothing to free */
} lbr_feed_handle;

/* Pushes an empty handle.  User value 1 is its name in refusals (a path), 2
 * and 3 keep alive what the feed points to. */
lbr_feed_handle *lbr_push_feed(lua_State *L);

/* Room for a feed over one block of samples given in place of a feed. */
typedef struct lbr_lent_feed {
  lbr_feed feed;
  const double *block;
} lbr_lent_feed;

/* Argument `arg`, a feed or a block of samples, as a feed that holds while the
 * argument is reachable and open; raises an argument error otherwise. */
const lbr_feed *lbr_check_feed(lua_State *L, int arg, lbr_lent_feed *lent);

/* Gives the feed in the handle at `index` the factors of the list at `list`
 * (nil: all 1), one finite number per channel; raises otherwise. */
void lbr_set_factors(lua_State *L, int index, int list);

/* Adds `feed` to the table at the top of the stack. */
void lbr_add_feeds(lua_State *L);

/* Raw samples at `arg`, or false. */
int lbr_test_raw(lua_State *L, int arg, lbr_raw_run *run);

#endif
