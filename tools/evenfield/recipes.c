/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "recipes.h"

#include <math.h>
#include <string.h>

#include "message.h"

exit_code recipes_check_usage(const command_options *options) {
  const command_options *o = options;
  if (isnan(o->step_g))
    return EXIT_DONE;
  if (isnan(o->batch_g)) {
    return message_usage("--step-g needs --batch-g: what the whole batch "
                         "weighs");
  }
  if (o->step_g > o->batch_g) {
    return message_usage("--step-g is more than the batch of --batch-g");
  }
  if (o->aim == AIM_SPECTRUM) {
    return message_usage("--step-g goes with --aim colour and lights: whole "
                         "steps are chosen by differences of colour");
  }
  return EXIT_DONE;
}

ef_status recipes_init(recipes *r, const command_options *options,
                       const ef_device *device, const ef_observer *observer,
                       const ef_metric *metric, double jnd, const lights *l,
                       const ef_reader_head *head, ef_error *error) {
  *r = (recipes){.aim = (recipe_aim)options->aim,
                 .batch_g = options->batch_g,
                 .step_g = options->step_g,
                 .jnd = jnd};
  if (ef_mixture_count(device) == 0)
    return EF_OK;
  r->device = device;
  if (head->content == EF_CONTENT_SPECTRA)
    r->grid = head->grid;
  if (r->grid.count == 0 && r->aim != AIM_COLOUR) {
    message_fail(error, EF_NO_ANSWER,
                 "--aim %s needs the spectra of the targets, and these are %s",
                 r->aim == AIM_SPECTRUM ? "spectrum" : "lights",
                 ef_content_text(head->content));
    return message_place(error, head->file);
  }
  r->settings = ef_recipe_settings_default();
  r->settings.metric = metric;
  r->settings.observer = observer;
  r->settings.n_lights = l->n;
  r->settings.light = (const ef_illuminant *const *)l->light;
  r->settings.quantum = isnan(r->step_g) ? 0.0 : r->step_g / r->batch_g;
  for (size_t i = 0; i < l->n; ++i)
    r->weight[i] = i == 0 || r->aim == AIM_LIGHTS ? 1.0 : 0.0;
  return EF_OK;
}

bool recipes_have_other(const recipes *r) {
  return r->device != NULL && r->grid.count > 0 && r->aim != AIM_SPECTRUM;
}

const ef_recipe *recipes_asked(const recipes *r, const ef_recipes *all) {
  if (all->stepped.found)
    return &all->stepped;
  return r->aim == AIM_SPECTRUM ? &all->spectral : &all->colour;
}

static ef_status show(const recipes *r, const ef_recipe *recipe, ef_shown *out,
                      ef_error *error) {
  *out = (ef_shown){.found = true,
                    .xyz = recipe->view[0].mixture,
                    .difference = recipe->view[0].difference,
                    .jnds = recipe->view[0].difference / r->jnd,
                    .components = recipe->view[0].components};
  const ef_status status =
      ef_mixture_drives(r->device, recipe->concentration, out->drive, error);
  for (size_t i = 0; i < ef_device_n_drives(r->device); ++i)
    out->amount[i] = ef_device_amount(r->device, i, out->drive[i], NULL);
  return status;
}

ef_status recipes_find(const recipes *r, const double *value, ef_xyz xyz,
                       ef_recipes *out, ef_shown *shown, ef_error *error) {
  const bool has_spectrum = r->grid.count > 0;
  const ef_standard standard = {.grid = has_spectrum ? &r->grid : NULL,
                                .spectrum = has_spectrum ? value : NULL,
                                .xyz = xyz};
  ef_recipe_settings settings = r->settings;
  settings.weight = r->weight;
  ef_status status =
      ef_recipe_find(r->device, &standard, &settings, out, error);
  if (status == EF_OK)
    status = show(r, recipes_asked(r, out), shown, error);
  return status;
}
