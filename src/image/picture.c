/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pictures whose samples have a profile. */
#include "image/image_private.h"

#include <stdio.h>
#include <stdlib.h>

#include "base/base_private.h"

struct ef_picture {
  ef_png *png;
  ef_profile *own; /* NULL: assumed */
  const ef_profile *profile;
  ef_picture_colours colours;
};

ef_picture_settings ef_picture_settings_default(void) {
  return (ef_picture_settings){.png = ef_png_settings_default()};
}

static ef_status assume(ef_picture *p, const ef_profile *assumed,
                        ef_error *error) {
  const ef_png_head *head = ef_png_get_head(p->png);
  p->profile = assumed;
  p->colours.is_assumed = true;
  p->colours.source = ef_png_get_source(head);
  snprintf(p->colours.about, sizeof p->colours.about, "%s, as was said",
           ef_profile_get_info(assumed).name);
  const ef_status status = ef__tags_check(head, assumed, error);
  if (status != EF_OK)
    ef__error_place(error, head->file, 0, 0, NULL);
  return status;
}

/* Takes the PNG over, also when it fails. */
static ef_picture *with_colours(ef_png *png,
                                const ef_picture_settings *settings,
                                ef_error *error) {
  if (png == NULL)
    return NULL;
  ef_picture *p = ef__allocate_zeroed(1, sizeof *p);
  if (p == NULL) {
    ef_png_free(png);
    ef__error_memory(error, "a picture");
    return NULL;
  }
  p->png = png;
  if (settings->assumed != NULL) {
    if (assume(p, settings->assumed, error) == EF_OK)
      return p;
  } else {
    p->own = ef__tags_profile(ef_png_get_head(png), settings->png.notes,
                              &p->colours, error);
    p->profile = p->own;
    if (p->own != NULL)
      return p;
  }
  ef_picture_free(p);
  return NULL;
}

ef_picture *ef_picture_open(const char *path,
                            const ef_picture_settings *settings,
                            ef_error *error) {
  const ef_picture_settings plain = ef_picture_settings_default();
  if (settings == NULL)
    settings = &plain;
  return with_colours(ef_png_open(path, &settings->png, error), settings,
                      error);
}

ef_picture *ef_picture_from_bytes(const char *name, const void *bytes,
                                  size_t length,
                                  const ef_picture_settings *settings,
                                  ef_error *error) {
  const ef_picture_settings plain = ef_picture_settings_default();
  if (settings == NULL)
    settings = &plain;
  return with_colours(
      ef_png_from_bytes(name, bytes, length, &settings->png, error), settings,
      error);
}

void ef_picture_free(ef_picture *picture) {
  if (picture == NULL)
    return;
  ef_profile_free(picture->own);
  ef_png_free(picture->png);
  free(picture);
}

const ef_png_head *ef_picture_get_head(const ef_picture *picture) {
  return ef_png_get_head(picture->png);
}

const ef_picture_colours *ef_picture_get_colours(const ef_picture *picture) {
  return &picture->colours;
}

const ef_profile *ef_picture_get_profile(const ef_picture *picture) {
  return picture->profile;
}

ef_status ef_picture_next_row(ef_picture *picture, uint16_t *sample,
                              bool *has_row, ef_error *error) {
  return ef_png_next_row(picture->png, sample, has_row, error);
}
