/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "lights.h"

#include <stdlib.h>

#include "message.h"
#include "source.h"

/* Lamplight, a fluorescent lamp of shops and a neutral white LED. */
static const char *const others[] = {"A", "FL11", "LED-B3"};
enum { N_OTHERS = sizeof others / sizeof others[0] };

bool lights_are_asked(const command_options *options) {
  return options->lights.n > 1;
}

ef_status lights_init(lights *l, const command_options *options,
                      const ef_illuminant *first, const ef_notes *notes,
                      ef_error *error) {
  const command_options *o = options;
  *l = (lights){0};
  if (o->lights.n > EF_MAX_LIGHTS) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--illuminant is given %zu times; a match is told in "
                        "at most %d lights",
                        o->lights.n, EF_MAX_LIGHTS);
  }
  l->light[l->n++] = NULL;
  const size_t n = o->lights.n > 0 ? o->lights.n - 1 : N_OTHERS;
  for (size_t i = 0; i < n; ++i) {
    const char *name = o->lights.n > 0 ? o->lights.text[i + 1] : others[i];
    ef_illuminant *light =
        source_illuminant(o, "illuminant", name, notes, error);
    if (light == NULL)
      return error->status;
    l->light[l->n++] = light;
  }
  /* Borrowed from the scene; never freed here. */
  l->light[0] = (ef_illuminant *)first;
  return EF_OK;
}

void lights_free(lights *l) {
  for (size_t i = 1; i < l->n; ++i)
    ef_illuminant_free(l->light[i]);
  *l = (lights){0};
}

/* ---- Prints ------------------------------------------------------------ */

ef_status lights_view_init(lights_view *v, const lights *l,
                           const ef_device *device, const ef_observer *observer,
                           const ef_metric *metric, const ef_reader_head *head,
                           const ef_notes *notes, ef_error *error) {
  const ef_grid *grid = ef_device_grid(device);
  *v = (lights_view){.lights = l,
                     .device = device,
                     .metric = metric,
                     .width = head->grid.count,
                     .spectrum = malloc(grid->count * sizeof *v->spectrum)};
  if (v->spectrum == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for spectra");
  for (size_t i = 0; i < l->n; ++i) {
    colour_basis basis;
    const ef_viewing viewing = ef_viewing_default(l->light[i]);
    const ef_status status =
        colour_basis_init(&basis, observer, l->light[i], error);
    if (status != EF_OK)
      return status;
    v->white[i] = basis.white;
    /* Of the first light all has been said. */
    const ef_notes *said = i > 0 ? notes : NULL;
    v->target[i] = ef_observer_weights(observer, EF_TRISTIMULUS, &head->grid,
                                       &viewing, said, error);
    v->print[i] = ef_observer_weights(observer, EF_TRISTIMULUS, grid, &viewing,
                                      said, error);
    if (v->target[i] == NULL || v->print[i] == NULL)
      return message_place(error, head->file);
  }
  return EF_OK;
}

void lights_view_free(lights_view *v) {
  for (size_t i = 0; i < EF_MAX_LIGHTS; ++i) {
    ef_weights_free(v->target[i]);
    ef_weights_free(v->print[i]);
  }
  free(v->spectrum);
  *v = (lights_view){0};
}

static ef_status xyz_of(const ef_weights *weights, const double *spectrum,
                        ef_xyz *out, ef_error *error) {
  double xyz[3];
  const ef_status status =
      ef_weights_apply(weights, 1, spectrum, 1, xyz, error);
  *out = (ef_xyz){xyz[0], xyz[1], xyz[2]};
  return status;
}

ef_status lights_view_of(const lights_view *v, const double *target,
                         const double *drive, ef_recipe_view *out,
                         ef_error *error) {
  ef_status status =
      ef_device_spectrum(v->device, drive, v->spectrum, NULL, error);
  for (size_t i = 0; i < v->lights->n && status == EF_OK; ++i) {
    ef_recipe_view *view = &out[i];
    view->white = v->white[i];
    status = xyz_of(v->target[i], target, &view->standard, error);
    if (status == EF_OK)
      status = xyz_of(v->print[i], v->spectrum, &view->mixture, error);
    if (status != EF_OK)
      return status;
    const ef_conditions conditions = ef_conditions_default(view->white);
    double p[3], q[3];
    ef_metric_coordinates(v->metric, view->standard, &conditions, p);
    ef_metric_coordinates(v->metric, view->mixture, &conditions, q);
    view->difference = ef_metric_components(v->metric, p, q, &view->components);
  }
  return status;
}
