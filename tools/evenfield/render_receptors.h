/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What `describe` says of cones, rods and melanopsin, as text. */
#ifndef COMMAND_RENDER_RECEPTORS_H
#define COMMAND_RENDER_RECEPTORS_H

#include "describe.h"
#include "text.h"

/** Excitations of all receptors and MacLeod-Boynton coordinates of n rows that
 * have them. */
void render_receptors(text *out, size_t n, const description *const *row,
                      int decimals);
/** Alpha-opic quantities of n lights, in absolute units where they are. */
void render_alpha_opic(text *out, size_t n, const description *const *row,
                       bool is_absolute);
/** What the above rest on. */
void render_receptor_basis(text *out, const describe_scene *s, bool has_lights);

#endif
