/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The functions of observers as text, CSV or JSON. */
#ifndef COMMAND_RENDER_BUILD_H
#define COMMAND_RENDER_BUILD_H

#include <evenfield/exchange.h>

#include "build.h"

/** In `format`, an output_format. */
ef_status render_build(const build *b, int format, ef_output *output,
                       ef_error *error);

#endif
