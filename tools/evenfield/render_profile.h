/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What `profile make` and `profile check` found, as text, CSV and JSON. */
#ifndef COMMAND_RENDER_PROFILE_H
#define COMMAND_RENDER_PROFILE_H

#include "profile_fit.h"

ef_status render_profile_fit(const profile_fit *f, ef_output *output,
                             ef_error *error);

#endif
