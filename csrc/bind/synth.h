/* What the two files of the synthesis door share.
 */
#ifndef LBR_BIND_SYNTH_H
#define LBR_BIND_SYNTH_H

#include "bind/bind.h"

/* Functions of synth_signal.c, NULL-ended. */
extern const luaL_Reg lbr_synth_signal_functions[];

#endif
