/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * A recipe as a search: what is known of the mixture, the standard and the
 * lights, and what the search finds. */
#ifndef EVENFIELD_RECIPE_PRIVATE_H
#define EVENFIELD_RECIPE_PRIVATE_H

#include <evenfield/match.h>

/** One light: what turns reflectances into a colour, and the colour wanted. */
typedef struct ef__look {
  ef_weights *weights;
  ef_conditions conditions;
  ef_xyz standard;
  double target[3]; /**< in the metric's coordinates */
  /** The same of the standard at the samples of the colourants. */
  double sampled[3];
  /** Squared difference of a small move in X, Y, Z around that, times the share
   * of a sample in a peak of a light that is not known. */
  double ripple[9];
  double weight;    /**< of all that count 1 in sum */
} ef__look;

typedef struct ef__recipe_search {
  const ef_device *device;
  const ef_metric *metric;
  size_t n_all, n;             /**< colourants with and without the base */
  size_t index[EF_MAX_DRIVES]; /**< of the unknowns among all */
  size_t base;                 /**< SIZE_MAX: none */
  double most;                 /**< total loading */
  double base_slope;           /**< of the base's share with any other */
  size_t count;                /**< samples */
  size_t n_lights;
  ef__look light[EF_MAX_LIGHTS];
  bool has_spectrum;
  double *standard;    /**< count */
  double *reflectance; /**< count: what was mixed last */
  double *slope;       /**< count x n_all: of it */
} ef__recipe_search;

/** What is made small: the weighted mean of the squared differences in the
 * lights, or what the squared difference is expected to be in any light. */
typedef enum ef__recipe_goal {
  EF__GOAL_COLOUR,
  EF__GOAL_SPECTRUM
} ef__recipe_goal;

/** Concentrations of all colourants from those of the unknowns, the base what
 * they leave. */
void ef__recipe_complete(const ef__recipe_search *search, const double *c,
                         double *all);
/** Mixes the unknowns into `reflectance`. */
void ef__recipe_mix(ef__recipe_search *search, const double *c);
/** Colour of `reflectance` in a light. */
ef_xyz ef__recipe_colour(const ef__recipe_search *search,
                         const ef__look *light);
/** Mean squared error of `reflectance`. */
double ef__recipe_mean_square(const ef__recipe_search *search);
/** Squared difference of `reflectance` to be expected in any light. */
double ef__recipe_expected_square(const ef__recipe_search *search);

/** The unknowns with the least goal of what several starts end at; from
 * `known` as well, unless NULL. */
void ef__recipe_least(ef__recipe_search *search, ef__recipe_goal goal,
                      const double *known, double *c);
/** Whole steps near `exact`, see ef_recipes.stepped. */
void ef__recipe_whole_steps(ef__recipe_search *search, const double *exact,
                            double size, double *c);

#endif
