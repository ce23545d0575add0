/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the files of image/ share. */
#ifndef EVENFIELD_IMAGE_PRIVATE_H
#define EVENFIELD_IMAGE_PRIVATE_H

#include <evenfield/image.h>

/** The profile that the picture's tags come to; NULL and EF_NO_ANSWER when they
 * come to none (tags.c). Fills `colours`. */
ef_profile *ef__tags_profile(const ef_png_head *head, const ef_notes *notes,
                             ef_picture_colours *colours, ef_error *error);
/** Refuses a profile that cannot be that of samples of this picture. */
ef_status ef__tags_check(const ef_png_head *head, const ef_profile *profile,
                         ef_error *error);

/* ---- Spectral images ----------------------------------------------------- */

const ef_cube_head *ef__render_head(const ef_render *render);
ef_channel_role ef__render_role(const ef_render *render);
const ef_encoding *ef__encoder_encoding(const ef_encoder *encoder);
int ef__encoder_bits(const ef_encoder *encoder);

#endif
