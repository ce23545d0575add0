/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Recipes of --colourants: for every target what to weigh in. */
#ifndef COMMAND_RECIPES_H
#define COMMAND_RECIPES_H

#include <evenfield/match.h>

#include "lights.h"
#include "option.h"

/** What a recipe is to make least, in the order of --aim. */
typedef enum recipe_aim {
  AIM_COLOUR,   /**< the difference in the first light */
  AIM_SPECTRUM, /**< of the reflectances: in any light */
  AIM_LIGHTS    /**< the differences in all lights alike */
} recipe_aim;

typedef struct recipes {
  const ef_device *device; /**< NULL: the device mixes nothing */
  recipe_aim aim;
  double batch_g, step_g; /**< NaN: not asked for */
  ef_recipe_settings settings;
  double weight[EF_MAX_LIGHTS];
  double jnd;
  ef_grid grid; /**< of the targets; count 0: colours */
} recipes;

/** Does nothing for a device that does not mix. `settings.light` is borrowed
 * from `l`. EF_NO_ANSWER where the aim needs spectra that the targets have
 * not. */
ef_status recipes_init(recipes *r, const command_options *options,
                       const ef_device *device, const ef_observer *observer,
                       const ef_metric *metric, double jnd, const lights *l,
                       const ef_reader_head *head, ef_error *error);
/** The recipes of one target: a row of its file, and its colour in the first
 * light; and what the one asked for shows. */
ef_status recipes_find(const recipes *r, const double *value, ef_xyz xyz,
                       ef_recipes *out, ef_shown *shown, ef_error *error);
/** Of all recipes of a target the one that was asked for. */
const ef_recipe *recipes_asked(const recipes *r, const ef_recipes *all);
/** True where a recipe of the spectrum is told beside the one asked for. */
bool recipes_have_other(const recipes *r);
/** Usage of --aim, --batch-g, --step-g. */
exit_code recipes_check_usage(const command_options *options);

#endif
