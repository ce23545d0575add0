/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pictures from profile to profile, a band of rows at a time. */
#include "image/image_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* Pixels of a band: enough for all threads, little memory. */
#define BAND_PIXELS ((size_t)1 << 16)

typedef struct conversion {
  ef_picture *picture;
  ef_transform *transform;
  int jobs;
  size_t width, height, n_in;
  size_t band;   /* rows of a band */
  size_t first, n; /* rows in the band now */
  uint16_t *row;
  double *in, *out; /* of a band */
} conversion;

/* The next band, converted. */
static ef_status fill_band(conversion *c, ef_error *error) {
  c->first += c->n;
  c->n = 0;
  bool has_row = true;
  while (c->n < c->band) {
    const ef_status status =
        ef_picture_next_row(c->picture, c->row, &has_row, error);
    if (status != EF_OK)
      return status;
    if (!has_row)
      break;
    double *to = c->in + c->n++ * c->width * c->n_in;
    for (size_t x = 0; x < c->width; ++x) {
      for (size_t k = 0; k < c->n_in; ++k)
        to[x * c->n_in + k] = c->row[3 * x + k] / 65535.0;
    }
  }
  return ef_transform_apply(c->transform, c->n * c->width, c->in, c->jobs,
                            c->out, error);
}

/* What follows the last row: a file that is cut off there is told of. */
static ef_status see_end(conversion *c, size_t y, ef_error *error) {
  bool has_row;
  return y + 1 < c->height
             ? EF_OK
             : ef_picture_next_row(c->picture, c->row, &has_row, error);
}

static ef_status give_row(void *cookie, size_t y, uint16_t *sample,
                          ef_error *error) {
  conversion *const c = cookie;
  if (y >= c->first + c->n) {
    const ef_status status = fill_band(c, error);
    if (status != EF_OK)
      return status;
  }
  const double *from = c->out + (y - c->first) * c->width * 3;
  for (size_t i = 0; i < 3 * c->width; ++i)
    sample[i] = (uint16_t)lround(65535.0 * from[i]);
  return see_end(c, y, error);
}

static ef_status make_room(conversion *c, ef_error *error) {
  c->band = BAND_PIXELS / c->width;
  c->band = c->band == 0 ? 1 : c->band > c->height ? c->height : c->band;
  const size_t n = c->band * c->width;
  c->row = ef__allocate(3 * c->width, sizeof *c->row);
  c->in = ef__allocate(n * c->n_in, sizeof *c->in);
  c->out = ef__allocate(n * 3, sizeof *c->out);
  return c->row != NULL && c->in != NULL && c->out != NULL
             ? EF_OK
             : ef__error_memory(error, "a picture");
}

static ef_status write_all(conversion *c, const char *path,
                           const ef_picture_conversion *s, ef_error *error) {
  const ef_png_head *head = ef_picture_get_head(c->picture);
  const int bits = s->bits != 0 ? s->bits : head->bits == 16 ? 16 : 8;
  const ef_png_tags tags = {.profile_name = s->profile_name,
                            .profile = s->profile,
                            .profile_length = s->profile_length};
  const ef_png_rows rows = {.give = give_row, .cookie = c};
  return ef_png_write_rows(path, s->overwrite, c->width, c->height, bits, &rows,
                           s->profile != NULL ? &tags : NULL, error);
}

ef_status ef_picture_convert(ef_picture *picture, const ef_profile *to,
                             const char *path,
                             const ef_picture_conversion *settings,
                             ef_error *error) {
  ef_error own = {0}; /* the status of a constructor stands in its error */
  if (error == NULL)
    error = &own;
  const ef_profile_info info = ef_profile_get_info(to);
  if (strcmp(info.space, "RGB") != 0) {
    ef__error_set(error, EF_NO_ANSWER,
                  "is a profile of %s, and PNG holds RGB", info.space);
    return ef__error_place(error, info.name, 0, 0, NULL), EF_NO_ANSWER;
  }
  const ef_png_head *head = ef_picture_get_head(picture);
  const ef_transform_settings how = {
      .intent = settings->intent,
      .black_point_compensation = settings->black_point_compensation};
  conversion c = {.picture = picture, .jobs = settings->jobs,
                  .width = head->width, .height = head->height};
  c.transform =
      ef_transform_new(ef_picture_get_profile(picture), to, &how, error);
  if (c.transform == NULL)
    return error->status;
  c.n_in = ef_transform_inputs(c.transform);
  ef_status status = make_room(&c, error);
  if (status == EF_OK)
    status = write_all(&c, path, settings, error);
  ef_transform_free(c.transform);
  free(c.row);
  free(c.in);
  free(c.out);
  return status;
}
