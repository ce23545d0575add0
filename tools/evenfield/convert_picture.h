/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `profile convert` of a PNG picture: from its own tags, or from --from, to
 * another RGB profile. */
#ifndef COMMAND_CONVERT_PICTURE_H
#define COMMAND_CONVERT_PICTURE_H

#include "profile_fit.h"

/** True when the operand is meant as a picture. */
bool convert_is_picture(const char *path);
/** files[1] to files[2]; writes the picture, then the report. `*n_beyond`
 * receives how many pixels are off by more than the tolerance. */
ef_status convert_picture(const command_options *options, ef_output *output,
                          const ef_notes *notes, size_t *n_beyond,
                          ef_error *error);

#endif
