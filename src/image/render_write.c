/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Spectral images rendered to pictures and cubes. */
#include "image/image_private.h"

#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* ---- Pictures ------------------------------------------------------------ */

typedef struct painter {
  ef_render *render;
  const ef_encoder *encoder;
  size_t width;
  const double *value; /* pixels that are left of the last ones */
  size_t n;
  ef_clipped *clipped;
} painter;

static ef_status paint_row(void *cookie, size_t y, uint16_t *sample,
                           ef_error *error) {
  painter *const p = cookie;
  (void)y; /* each once, from the top */
  for (size_t x = 0; x < p->width;) {
    if (p->n == 0) {
      const ef_status status =
          ef_render_next(p->render, &p->n, &p->value, error);
      if (status != EF_OK)
        return status;
      if (p->n == 0)
        return ef__error_set(error, EF_INVALID,
                             "the image has been rendered already");
    }
    const size_t left = p->width - x;
    const size_t some = p->n < left ? p->n : left;
    ef_encoder_apply(p->encoder, some, p->value, sample + 3 * x, p->clipped);
    p->value += 3 * some;
    p->n -= some;
    x += some;
  }
  return EF_OK;
}

/* TransferCharacteristics of ITU-T H.273 that mean just this curve; those of
 * video mean a camera's to some readers, and are left to the profile. */
static int transfer_of(const ef_encoding *encoding) {
  if (strcmp(encoding->tone, "iec61966-2-1") == 0)
    return 13;
  return strcmp(encoding->tone, "linear") == 0 ? 8 : 0;
}

ef_status ef_render_write_png(ef_render *render, const ef_encoder *encoder,
                              const char *path, bool overwrite,
                              ef_clipped *clipped, ef_error *error) {
  if (ef_render_channels(render) != 3)
    return ef__error_set(error, EF_INVALID, "pictures are of X, Y and Z");
  const ef_cube_head *head = ef__render_head(render);
  const ef_encoding *encoding = ef__encoder_encoding(encoder);
  unsigned char *profile = NULL;
  ef_png_tags tags = {.profile_name = encoding->name};
  ef_status status = ef_profile_make_matrix(encoding->name, encoding, &profile,
                                            &tags.profile_length, error);
  if (status != EF_OK)
    return status;
  tags.profile = profile;
  tags.transfer = encoding->h273 != 0 ? transfer_of(encoding) : 0;
  tags.primaries = tags.transfer != 0 ? encoding->h273 : 0;
  *clipped = (ef_clipped){0};
  painter p = {.render = render,
               .encoder = encoder,
               .width = head->width,
               .clipped = clipped};
  const ef_png_rows rows = {.give = paint_row, .cookie = &p};
  status = ef_png_write_rows(path, overwrite, head->width, head->height,
                             ef__encoder_bits(encoder), &rows, &tags, error);
  free(profile);
  return status;
}

/* ---- Cubes --------------------------------------------------------------- */

ef_status ef_render_write_cube(ef_render *render, const char *path,
                               bool overwrite, const char *description,
                               ef_error *error) {
  static const char *const names[2][3] = {{"X", "Y", "Z"}, {"L", "M", "S"}};
  const ef_cube_head *head = ef__render_head(render);
  ef_error own = {0};
  if (error == NULL)
    error = &own;
  ef_cube_out *out = ef_cube_out_open(
      path, overwrite, head->width, head->height, ef_render_channels(render),
      names[ef__render_role(render) == EF_CONES], description, error);
  if (out == NULL)
    return error->status;
  size_t n = 0;
  ef_status status;
  do {
    const double *value;
    status = ef_render_next(render, &n, &value, error);
    if (status == EF_OK && n > 0)
      status = ef_cube_out_write(out, n, value, error);
  } while (status == EF_OK && n > 0);
  if (status == EF_OK)
    return ef_cube_out_commit(out, error);
  ef_cube_out_discard(out);
  return status;
}
