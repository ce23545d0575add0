/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --seen-by: colours as they look to a dichromat. */
#ifndef COMMAND_DICHROMAT_H
#define COMMAND_DICHROMAT_H

#include <evenfield/colour.h>

typedef struct dichromat {
  ef_dichromat_view view;
  double to_cones[9], from_cones[9];
} dichromat;

/** "protanope" ... for a value of command_options.seen_by. Static. */
const char *dichromat_name(int seen_by);
/** For colours of `observer` beside a white. */
ef_status dichromat_init(dichromat *d, int seen_by, const ef_observer *observer,
                         ef_xyz white, ef_error *error);
/** The colour to draw in place of another. */
ef_xyz dichromat_see(const dichromat *d, ef_xyz colour);

#endif
