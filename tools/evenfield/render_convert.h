/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `profile convert` of a list of colours, as text, CSV, JSON or CGATS. */
#ifndef COMMAND_RENDER_CONVERT_H
#define COMMAND_RENDER_CONVERT_H

#include "convert.h"

/** Runs the conversion and writes what comes out. */
ef_status render_conversion(conversion *c, ef_output *output,
                            convert_summary *sum, ef_error *error);
/** The same for --format cgats. */
ef_status render_conversion_cgats(conversion *c, ef_output *output,
                                  convert_summary *sum, ef_error *error);

#endif
