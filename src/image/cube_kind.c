/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Surfaces or lights: what the values of a spectral image are. */
#include "image/image_private.h"

#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"

/* As for tables of spectra. */
#define LOWEST_SURFACE (-0.02)
#define HIGHEST_SURFACE 2.0
enum { BLOCK = 16, MOST_PIXELS = 4096 };

typedef struct extremes {
  double lowest, highest; /* NaN: none yet */
} extremes;

static void add_pixels(const ef_cube_head *head, size_t n, const double *value,
                       extremes *e) {
  for (size_t i = 0; i < n; ++i, value += head->n_used) {
    for (size_t k = 0; k < head->n_used; ++k) {
      const bool is_ignored = head->has_ignored &&
                              !(value[k] < head->ignored) &&
                              !(value[k] > head->ignored);
      const double v = head->gain[k] * value[k] + head->offset[k];
      if (is_ignored || !isfinite(v))
        continue;
      e->lowest = fmin(e->lowest, v);
      e->highest = fmax(e->highest, v);
    }
  }
}

static ef_status look(const ef_cube *cube, extremes *e, ef_error *error) {
  const ef_cube_head *head = ef_cube_get_head(cube);
  ef_error own = {0};
  if (error == NULL)
    error = &own;
  *e = (extremes){(double)NAN, (double)NAN};
  ef_cube_window *window =
      ef_cube_window_new(cube, head->n_used, head->band, error);
  if (window == NULL)
    return error->status;
  double *room = ef__allocate(BLOCK * head->n_used, sizeof *room);
  size_t n = ef_cube_window_pixels(window);
  n = n < head->width ? n : head->width;
  n = n < MOST_PIXELS ? n : MOST_PIXELS;
  ef_status status =
      room == NULL
          ? ef__error_memory(error, "pixels")
          : ef_cube_window_read(window, head->height / 2 * head->width, n,
                                error);
  for (size_t i = 0; i < n && status == EF_OK; i += BLOCK) {
    const size_t some = n - i < BLOCK ? n - i : BLOCK;
    add_pixels(head, some, ef_cube_window_doubles(window, i, some, room), e);
  }
  free(room);
  ef_cube_window_free(window);
  return status;
}

ef_status ef_cube_find_kind(const ef_cube *cube, ef_kind_choice choice,
                            const ef_notes *notes, ef_kind *kind,
                            ef_error *error) {
  const ef_cube_head *head = ef_cube_get_head(cube);
  if (choice == EF_KIND_AUTO)
    choice = head->kind;
  if (choice != EF_KIND_AUTO) {
    *kind = choice == EF_KIND_SURFACE ? EF_SURFACE : EF_LIGHT;
    return EF_OK;
  }
  extremes e;
  const ef_status status = look(cube, &e, error);
  if (status != EF_OK)
    return status;
  const bool is_surface =
      !(e.lowest < LOWEST_SURFACE) && !(e.highest > HIGHEST_SURFACE);
  *kind = is_surface ? EF_SURFACE : EF_LIGHT;
  ef__note(notes, "%s: does not say whether it holds surfaces or lights; its "
                  "values, %.4g to %.4g in line %zu, are taken as %s",
           head->file, e.lowest, e.highest, head->height / 2 + 1,
           is_surface ? "reflectances" : "lights");
  return EF_OK;
}
