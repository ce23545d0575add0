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

#endif
