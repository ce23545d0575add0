/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `image render`: a spectral image as seen, to colours or a picture. */
#ifndef COMMAND_IMAGE_RENDER_H
#define COMMAND_IMAGE_RENDER_H

#include <evenfield/image.h>

#include "option.h"

/** EXIT_USAGE with its message when the operands or options do not fit. */
exit_code image_render_check(const command_options *options);
/** files[1] is the header, files[2] what is written: FILE.png, FILE.hdr or
 * FILE.csv. Writes it and the report. */
ef_status image_render(const command_options *options, ef_output *output,
                       const ef_notes *notes, ef_error *error);

#endif
