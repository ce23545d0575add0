/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `profile make` and `profile check` as text. */
#ifndef COMMAND_RENDER_PROFILE_TEXT_H
#define COMMAND_RENDER_PROFILE_TEXT_H

#include "profile_fit.h"

ef_status render_profile_text(const profile_fit *f, ef_output *output,
                              ef_error *error);

#endif
