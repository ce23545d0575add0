/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --boundary: a file of the bodies of colours that surfaces matching the
 * standard take under the other looks. */
#ifndef COMMAND_BOUNDARY_H
#define COMMAND_BOUNDARY_H

#include "compare.h"

/** Whole or not at all; nothing when it was not asked for. */
ef_status boundary_write(const compare_scene *s, ef_error *error);

#endif
