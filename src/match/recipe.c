/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Recipes: concentrations of colourants that match a standard. */
#include "match/recipe_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* ---- The answer --------------------------------------------------------- */

static void tell_views(ef__recipe_search *p, ef_recipe *out) {
  double sum = 0.0;
  for (size_t k = 0; k < p->n_lights; k++) {
    const ef__look *light = &p->light[k];
    ef_recipe_view *view = &out->view[k];
    double at[3];
    view->white = light->conditions.white;
    view->standard = light->standard;
    view->mixture = ef__recipe_colour(p, light);
    ef_metric_coordinates(p->metric, view->mixture, &light->conditions, at);
    if (isnan(light->standard.Y)) {
      view->difference = nan("");
      view->components = (ef_components){nan(""), nan(""), nan("")};
      continue;
    }
    view->difference =
        ef_metric_components(p->metric, light->target, at, &view->components);
    if (light->weight > 0.0)
      sum += light->weight * view->difference * view->difference;
  }
  out->difference = sqrt(sum);
  out->spectral_rms =
      p->has_spectrum ? sqrt(ef__recipe_mean_square(p)) : nan("");
  out->unknown_light =
      p->has_spectrum ? sqrt(ef__recipe_expected_square(p)) : nan("");
}

/* The batch with 1 % more of colourant i: what is weighed in is kept, and the
 * shares follow. Without a base concentrations are amounts in themselves. */
static void weigh_more(const ef__recipe_search *p, size_t i, const double *all,
                       double *more) {
  memcpy(more, all, p->n_all * sizeof *more);
  more[i] *= 1.01;
  if (p->base == SIZE_MAX || (p->base_slope == 0.0 && i != p->base))
    return;
  const double whole = p->base_slope == 0.0 ? 1.01 : 1.0 + more[i] - all[i];
  for (size_t j = 0; j < p->n_all; j++)
    more[j] /= whole;
}

static void tell_sensitivity(ef__recipe_search *p, const double *all,
                             ef_recipe *out) {
  double here[3], there[3], more[EF_MAX_RECIPE];
  const ef__look *light = &p->light[0];
  ef_metric_coordinates(p->metric, out->view[0].mixture, &light->conditions,
                        here);
  for (size_t i = 0; i < p->n_all; i++) {
    weigh_more(p, i, all, more);
    ef_mixture_spectrum(p->device, more, p->reflectance, NULL, NULL);
    ef_metric_coordinates(p->metric, ef__recipe_colour(p, light),
                          &light->conditions, there);
    out->sensitivity[i] = ef_metric_difference(p->metric, here, there);
  }
}

static void tell(ef__recipe_search *p, const double *found, ef_recipe *out) {
  double c[EF_MAX_DRIVES], all[EF_MAX_RECIPE] = {0.0}, sum = 0.0;
  const double nothing = 1e-9 * p->most;
  *out = (ef_recipe){.found = true};
  for (size_t i = 0; i < p->n; i++) {
    c[i] = found[i] > nothing ? found[i] : 0.0;
    sum += c[i];
    if (c[i] == 0.0)
      out->at_zero |= (uint32_t)1 << p->index[i];
  }
  out->at_total_loading = sum >= p->most - nothing;
  ef__recipe_complete(p, c, all);
  memcpy(out->concentration, all, sizeof all);
  ef__recipe_mix(p, c);
  tell_views(p, out);
  tell_sensitivity(p, all, out);
}

/* ---- Preparing ---------------------------------------------------------- */

ef_recipe_settings ef_recipe_settings_default(void) {
  const ef_recipe_settings settings = {
      .metric = ef_metric_find("ciede2000", NULL),
      .observer = NULL,
      .n_lights = 0,
      .light = NULL,
      .weight = NULL,
      .quantum = 0.0,
  };
  return settings;
}

static ef_status check_lights(const ef_recipe_settings *settings,
                              const ef_standard *standard, ef_error *error) {
  const size_t n = settings->n_lights;
  if (n == 0 || n > EF_MAX_LIGHTS || settings->light == NULL)
    return ef__error_set(error, EF_INVALID,
                         "%zu lights; a recipe is told for 1 to %d", n,
                         EF_MAX_LIGHTS);
  double sum = settings->weight != NULL ? 0.0 : 1.0;
  for (size_t k = 0; k < n; k++) {
    const double weight = settings->weight != NULL ? settings->weight[k] : 0.0;
    if (settings->light[k] == NULL)
      return ef__error_set(error, EF_INVALID, "light %zu is missing", k + 1);
    if (!(weight >= 0.0 && isfinite(weight)))
      return ef__error_set(error, EF_INVALID,
                           "light %zu counts %g; expected zero or more", k + 1,
                           weight);
    if (weight > 0.0 && k > 0 && standard->grid == NULL)
      return ef__error_set(error, EF_INVALID,
                           "a standard known by tristimulus values can be "
                           "matched in the first light only; light %zu needs "
                           "its spectrum",
                           k + 1);
    sum += weight;
  }
  return sum > 0.0 ? EF_OK
                   : ef__error_set(error, EF_INVALID, "no light counts");
}

static ef_status check(const ef_device *device, const ef_standard *standard,
                       const ef_recipe_settings *settings, ef_error *error) {
  if (device == NULL || standard == NULL || settings == NULL ||
      settings->metric == NULL || settings->observer == NULL)
    return ef__error_set(error, EF_INVALID,
                         "a recipe needs a mixture, a standard, a metric and "
                         "an observer");
  if (ef_mixture_count(device) == 0)
    return ef__error_set(error, EF_INVALID, "'%s' (%s) is no mixture",
                         ef_device_name(device), ef_device_kind(device));
  if (!(settings->quantum >= 0.0 &&
        settings->quantum <= ef_mixture_total_loading(device)))
    return ef__error_set(error, EF_INVALID,
                         "steps of %g; expected zero or more, up to the total "
                         "loading of %g",
                         settings->quantum, ef_mixture_total_loading(device));
  if (standard->grid == NULL &&
      !(isfinite(standard->xyz.X) && isfinite(standard->xyz.Y) &&
        isfinite(standard->xyz.Z)))
    return ef__error_set(error, EF_INVALID, "the standard is not finite");
  if (standard->grid != NULL && standard->spectrum == NULL)
    return ef__error_set(error, EF_INVALID, "the standard has no spectrum");
  return check_lights(settings, standard, error);
}

static void name_unknowns(ef__recipe_search *p) {
  double all[EF_MAX_RECIPE] = {0.0};
  p->n_all = ef_mixture_count(p->device);
  p->base = ef_mixture_base(p->device);
  p->most = ef_mixture_total_loading(p->device);
  p->base_slope = ef_mixture_complete(p->device, all);
  for (size_t i = 0; i < p->n_all; i++)
    if (i != p->base)
      p->index[p->n++] = i;
}

static ef_status take_standard(ef__recipe_search *p,
                               const ef_standard *standard, void **block,
                               ef_error *error) {
  const ef_grid *grid = ef_device_grid(p->device);
  p->count = grid->count;
  const ef__part parts[] = {
      {&p->standard, p->count, sizeof(double)},
      {&p->reflectance, p->count, sizeof(double)},
      {&p->slope, p->count, p->n_all * sizeof(double)},
  };
  *block = ef__allocate_block(3, parts);
  if (*block == NULL)
    return ef__error_memory(error, "a recipe");
  p->has_spectrum = standard->grid != NULL;
  if (!p->has_spectrum)
    return EF_OK;
  ef_status status = ef_grid_check(standard->grid, error);
  for (size_t s = 0; status == EF_OK && s < standard->grid->count; s++)
    if (!isfinite(standard->spectrum[s]))
      status = ef__error_set(error, EF_INVALID,
                             "the standard is not finite at %g nm",
                             ef_grid_wavelength(standard->grid, s));
  if (status == EF_OK)
    status =
        ef_resample(standard->grid, 1, standard->spectrum, grid,
                    EF_INTERPOLATE_AUTO, EF_EXTEND_HOLD, p->standard, error);
  return status;
}

/* The standard is seen through its own samples, not the interpolated ones. */
static ef_status see_standard(const ef_standard *standard,
                              const ef_observer *observer,
                              const ef_illuminant *illuminant, ef_xyz *out,
                              ef_error *error) {
  double xyz[3];
  const ef_viewing viewing = ef_viewing_default(illuminant);
  ef_weights *weights = ef_observer_weights(
      observer, EF_TRISTIMULUS, standard->grid, &viewing, NULL, error);
  if (weights == NULL)
    return error->status;
  const ef_status status =
      ef_weights_apply(weights, 1, standard->spectrum, 1, xyz, error);
  ef_weights_free(weights);
  *out = (ef_xyz){xyz[0], xyz[1], xyz[2]};
  return status;
}

static ef_status prepare_light(ef__recipe_search *p,
                               const ef_standard *standard,
                               const ef_recipe_settings *settings, size_t k,
                               ef_error *error) {
  ef__look *light = &p->light[k];
  double white[3];
  const ef_illuminant *illuminant = settings->light[k];
  const ef_viewing viewing = ef_viewing_default(illuminant);
  ef_status status = ef_observer_white(settings->observer, EF_TRISTIMULUS,
                                       illuminant, NULL, white, error);
  if (status != EF_OK)
    return status;
  light->conditions =
      ef_conditions_default((ef_xyz){white[0], white[1], white[2]});
  light->weights =
      ef_observer_weights(settings->observer, EF_TRISTIMULUS,
                          ef_device_grid(p->device), &viewing, NULL, error);
  if (light->weights == NULL)
    return error->status;
  light->weight =
      settings->weight != NULL ? settings->weight[k] : (k == 0 ? 1.0 : 0.0);
  light->standard =
      k == 0 ? standard->xyz : (ef_xyz){nan(""), nan(""), nan("")};
  if (standard->grid != NULL)
    status = see_standard(standard, settings->observer, illuminant,
                          &light->standard, error);
  ef_metric_coordinates(p->metric, light->standard, &light->conditions,
                        light->target);
  return status;
}

/* Width of the peaks by which a light that is not known departs from those that
 * are: as wide as the lines and phosphors of lamps are, a choice of ours. */
static const double ripple_nm = 10.0;

/* Samples to a peak of a light that is not known. */
static double samples_of_ripple(const ef_grid *grid) {
  if (grid->count < 2)
    return 1.0;
  const size_t last = grid->count - 1;
  return ripple_nm * (double)last /
         (ef_grid_wavelength(grid, last) - ef_grid_wavelength(grid, 0));
}

/* A light that is not known: one of those that are, its power at every
 * wavelength off by chance by as much as it is itself, in peaks of `ripple_nm`.
 * Prepares what an error of reflectance then does to the difference, to second
 * order around the standard. */
static void expect_ripple(ef__recipe_search *p) {
  const double share = samples_of_ripple(ef_device_grid(p->device));
  memcpy(p->reflectance, p->standard, p->count * sizeof *p->standard);
  for (size_t k = 0; k < p->n_lights; k++) {
    ef__look *light = &p->light[k];
    double tensor[9], jacobian[9];
    const ef_xyz xyz = ef__recipe_colour(p, light);
    ef_metric_coordinates(p->metric, xyz, &light->conditions, light->sampled);
    ef_metric_tensor(p->metric, light->sampled, tensor);
    ef_metric_jacobian(p->metric, xyz, &light->conditions, jacobian);
    for (size_t r = 0; r < 9; r++) {
      light->ripple[r] = 0.0;
      for (size_t q = 0; q < 9; q++)
        light->ripple[r] += share * tensor[q] * jacobian[q / 3 * 3 + r / 3] *
                            jacobian[q % 3 * 3 + r % 3];
    }
  }
}

static ef_status prepare(ef__recipe_search *p, const ef_standard *standard,
                         const ef_recipe_settings *settings, void **block,
                         ef_error *error) {
  double sum = 0.0;
  name_unknowns(p);
  ef_status status = take_standard(p, standard, block, error);
  for (size_t k = 0; status == EF_OK && k < settings->n_lights; k++) {
    status = prepare_light(p, standard, settings, k, error);
    p->n_lights++;
    sum += p->light[k].weight;
  }
  for (size_t k = 0; k < p->n_lights; k++)
    p->light[k].weight /= sum;
  return status;
}

static void find_all(ef__recipe_search *p, double step, ef_recipes *out) {
  double c[EF_MAX_DRIVES], stepped[EF_MAX_DRIVES];
  if (p->has_spectrum) {
    expect_ripple(p);
    ef__recipe_least(p, EF__GOAL_SPECTRUM, NULL, c);
    tell(p, c, &out->spectral);
  }
  ef__recipe_least(p, EF__GOAL_COLOUR, p->has_spectrum ? c : NULL, c);
  tell(p, c, &out->colour);
  if (!(step > 0.0))
    return;
  ef__recipe_whole_steps(p, c, step, stepped);
  tell(p, stepped, &out->stepped);
}

ef_status ef_recipe_find(const ef_device *device, const ef_standard *standard,
                         const ef_recipe_settings *settings, ef_recipes *out,
                         ef_error *error) {
  ef_error own; /* the status of a constructor stands in its error */
  if (error == NULL)
    error = &own;
  if (check(device, standard, settings, error) != EF_OK)
    return EF_INVALID;
  void *block = NULL;
  ef__recipe_search p = {.device = device, .metric = settings->metric};
  const ef_status status = prepare(&p, standard, settings, &block, error);
  if (status == EF_OK) {
    *out = (ef_recipes){0};
    find_all(&p, settings->quantum, out);
  }
  for (size_t k = 0; k < p.n_lights; k++)
    ef_weights_free(p.light[k].weights);
  free(block);
  return status;
}
