/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `image compare`: how far two pictures differ, pixel by pixel, and who would
 * tell. */
#ifndef COMMAND_IMAGE_COMPARE_H
#define COMMAND_IMAGE_COMPARE_H

#include <evenfield/image.h>

#include "option.h"

/** EXIT_USAGE with its message when the operands do not fit. */
exit_code image_compare_check(const command_options *options);
/** files[1] and files[2], and files[3] for the map; writes map and report.
 * `*fails` when --check finds a pixel that is off by more than the tolerance. */
ef_status image_compare(const command_options *options, ef_output *output,
                        const ef_notes *notes, bool *fails, ef_error *error);

#endif
