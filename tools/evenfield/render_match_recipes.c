/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Prints and mixtures in other lights, and the recipes. */
#include "render_match.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "words.h"

/* ---- Recipes in the table of targets ----------------------------------- */

bool render_match_mixes(const match_scene *s) {
  return s->recipes.device != NULL;
}

static bool in_grams(const match_scene *s) {
  return !isnan(s->recipes.batch_g);
}

void render_match_recipe_columns(text_table *t, const match_scene *s) {
  const ef_device *device = s->recipes.device;
  for (size_t i = 0; i < ef_mixture_count(device); ++i) {
    const char *head = in_grams(s) ? "Recipe, g" : "Recipe, %";
    table_column(t, i == 0 ? head : NULL, ef_mixture_name(device, i), false);
  }
}

/* What the scales tell, else a hundredth of a percent of the batch. */
static int decimals_of(const match_scene *s) {
  if (!in_grams(s))
    return 2;
  const double step =
      isnan(s->recipes.step_g) ? 1e-4 * s->recipes.batch_g : s->recipes.step_g;
  const int decimals = (int)ceil(-log10(step) - 1e-9);
  return decimals < 0 ? 0 : decimals > 6 ? 6 : decimals;
}

/* Grams of a concentration of one. In single-constant theory concentrations are
 * shares of the base, which come on top of it. */
static double grams(const match_scene *s, const ef_recipe *recipe) {
  const ef_device *device = s->recipes.device;
  double sum = 0.0, none[EF_MAX_RECIPE] = {0.0};
  if (ef_mixture_base(device) == SIZE_MAX ||
      ef_mixture_complete(device, none) < 0.0)
    return s->recipes.batch_g;
  for (size_t i = 0; i < ef_mixture_count(device); ++i)
    sum += recipe->concentration[i];
  return s->recipes.batch_g / sum;
}

static void add_concentrations(text_table *t, const match_scene *s,
                               const ef_recipe *recipe) {
  const double unit = in_grams(s) ? grams(s, recipe) : 100.0;
  for (size_t i = 0; i < ef_mixture_count(s->recipes.device); ++i)
    table_number(t, unit * recipe->concentration[i], decimals_of(s));
}

void render_match_recipe_cells(text_table *t, const match_scene *s,
                               const kept_row *row) {
  add_concentrations(t, s, recipes_asked(&s->recipes, row->recipe));
}

/* ---- In other lights --------------------------------------------------- */

static void add_light_columns(text_table *t, const match_scene *s,
                              const char *head) {
  for (size_t k = 0; k < s->lights.n; ++k) {
    table_column(t, k == 0 ? head : NULL,
                 ef_illuminant_name(s->lights.light[k]), false);
  }
  if (render_match_mixes(s) && s->recipes.grid.count > 0)
    table_column(t, NULL, "any", false);
}

/* `recipe` NULL: of prints. */
static void add_differences(text_table *t, const match_scene *s,
                            const ef_recipe_view *view,
                            const ef_recipe *recipe) {
  for (size_t k = 0; k < s->lights.n; ++k)
    table_number(t, view[k].difference, 2);
  if (recipe != NULL && s->recipes.grid.count > 0)
    table_number(t, recipe->unknown_light, 2);
}

static void add_lights_table(text *out, const match_scene *s, size_t n_rows,
                             const kept_row *row) {
  char head[80];
  snprintf(head, sizeof head, "Off by, %s", ef_metric_symbol(s->metric));
  text_table t = table_new();
  table_column(&t, "Target", "", true);
  add_light_columns(&t, s, head);
  if (render_match_mixes(s))
    table_column(&t, "Reflectance off", "by (rms), %", false);
  for (size_t i = 0; i < n_rows; ++i) {
    const ef_recipe *recipe = render_match_mixes(s)
                                  ? recipes_asked(&s->recipes, row[i].recipe)
                                  : NULL;
    table_cell(&t, row[i].name);
    add_differences(&t, s, row[i].view, recipe);
    if (recipe != NULL)
      table_number(&t, 100.0 * recipe->spectral_rms, 2);
  }
  table_finish(&t, out);
}

/* ---- The other recipe, and how exact weighing must be ------------------ */

static void add_other_table(text *out, const match_scene *s, size_t n_rows,
                            const kept_row *row) {
  char head[80];
  snprintf(head, sizeof head, "Off by, %s", ef_metric_symbol(s->metric));
  text_table t = table_new();
  table_column(&t, "Target", "", true);
  render_match_recipe_columns(&t, s);
  add_light_columns(&t, s, head);
  for (size_t i = 0; i < n_rows; ++i) {
    const ef_recipe *recipe = &row[i].recipe->spectral;
    table_cell(&t, row[i].name);
    add_concentrations(&t, s, recipe);
    add_differences(&t, s, recipe->view, recipe);
  }
  table_finish(&t, out);
}

static void add_sensitivity_table(text *out, const match_scene *s,
                                  size_t n_rows, const kept_row *row) {
  char head[80];
  const ef_device *device = s->recipes.device;
  const size_t n = ef_mixture_count(device);
  snprintf(head, sizeof head, "Moves by, %s", ef_metric_symbol(s->metric));
  text_table t = table_new();
  table_column(&t, "Target", "", true);
  for (size_t i = 0; i < n; ++i)
    table_column(&t, i == 0 ? head : NULL, ef_mixture_name(device, i), false);
  for (size_t k = 0; k < n_rows; ++k) {
    const ef_recipe *recipe = recipes_asked(&s->recipes, row[k].recipe);
    table_cell(&t, row[k].name);
    for (size_t i = 0; i < n; ++i)
      table_number(&t, recipe->sensitivity[i], 3);
  }
  table_finish(&t, out);
}

void render_match_lights(text *out, const match_scene *s, size_t n_rows,
                         const kept_row *row) {
  if (s->has_views) {
    text_format(out, "\nThe same %s in other lights:\n",
                render_match_mixes(s) ? "recipes" : "prints");
    add_lights_table(out, s, n_rows, row);
  }
  if (!render_match_mixes(s))
    return;
  if (recipes_have_other(&s->recipes)) {
    text_add(out, "\nThe recipes that are expected to be least off in any "
                  "light, whatever it is:\n");
    add_other_table(out, s, n_rows, row);
  }
  text_format(out,
              "\nHow far 1 %% more of one colourant than the recipe says moves "
              "the colour, in %s:\n",
              ef_illuminant_name(s->illuminant));
  add_sensitivity_table(out, s, n_rows, row);
}

/* ---- As data ----------------------------------------------------------- */

static void record_view(record *r, const match_scene *s, size_t k,
                        const ef_recipe_view *view) {
  record_begin(r, ef_illuminant_name(s->lights.light[k]));
  record_begin(r, "target");
  record_xyz(r, view->standard);
  record_lab(r, ef_xyz_to_lab(view->standard, view->white));
  record_end(r);
  record_begin(r, "match");
  record_xyz(r, view->mixture);
  record_lab(r, ef_xyz_to_lab(view->mixture, view->white));
  record_end(r);
  record_number(r, "difference", view->difference);
  record_number(r, "lightness_part", view->components.lightness);
  record_number(r, "chroma_part", view->components.chroma);
  record_number(r, "hue_part", view->components.hue);
  record_end(r);
}

static void record_views(record *r, const match_scene *s,
                         const ef_recipe_view *view) {
  record_begin(r, "in_light");
  for (size_t k = 0; k < s->lights.n; ++k)
    record_view(r, s, k, &view[k]);
  record_end(r);
}

static void record_recipe(record *r, const match_scene *s, const char *key,
                          const ef_recipe *recipe) {
  const ef_device *device = s->recipes.device;
  const size_t n = ef_mixture_count(device);
  record_begin(r, key);
  record_begin(r, "concentration");
  for (size_t i = 0; i < n; ++i)
    record_number(r, ef_mixture_name(device, i), recipe->concentration[i]);
  record_end(r);
  if (in_grams(s)) {
    record_begin(r, "grams");
    for (size_t i = 0; i < n; ++i) {
      record_number(r, ef_mixture_name(device, i),
                    grams(s, recipe) * recipe->concentration[i]);
    }
    record_end(r);
  }
  record_boolean(r, "at_total_loading", recipe->at_total_loading);
  record_number(r, "difference", recipe->difference);
  record_number(r, "spectral_rms", recipe->spectral_rms);
  record_number(r, "difference_in_any_light", recipe->unknown_light);
  record_views(r, s, recipe->view);
  record_begin(r, "sensitivity");
  for (size_t i = 0; i < n; ++i)
    record_number(r, ef_mixture_name(device, i), recipe->sensitivity[i]);
  record_end(r);
  record_end(r);
}

void render_match_record_recipes(record *r, const match_scene *s,
                                 const ef_recipe_view *view,
                                 const ef_recipes *recipe) {
  if (recipe != NULL) {
    record_recipe(r, s, "recipe", recipes_asked(&s->recipes, recipe));
    if (recipes_have_other(&s->recipes))
      record_recipe(r, s, "spectral_recipe", &recipe->spectral);
  } else if (view != NULL) {
    record_views(r, s, view);
  }
}
