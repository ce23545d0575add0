/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "build.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "source.h"

const char *build_function_name(size_t i) {
  static const char *const names[BUILD_FUNCTIONS] = {"x_bar", "y_bar", "z_bar",
                                                     "l_bar", "m_bar", "s_bar"};
  return names[i];
}

/* ---- Functions --------------------------------------------------------- */

/* Energy units to quantal ones: a quantum has an energy of h c / wavelength.
 * The peak is that of the samples. */
static void to_quanta(const ef_grid *grid, double *value) {
  double peak = 0.0;
  for (size_t i = 0; i < grid->count; ++i) {
    value[i] /= ef_grid_wavelength(grid, i);
    peak = fmax(peak, value[i]);
  }
  for (size_t i = 0; i < grid->count && peak > 0.0; ++i)
    value[i] /= peak;
}

static ef_status sample(built_observer *one, const ef_grid *grid, int units,
                        ef_error *error) {
  const size_t n = grid->count;
  const ef_channels xyz = ef_observer_channels(one->observer, EF_TRISTIMULUS);
  const ef_channels lms = ef_observer_channels(one->observer, EF_CONES);
  one->value = malloc(BUILD_FUNCTIONS * n * sizeof *one->value);
  if (one->value == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for functions");
  double *cones = one->value + 3 * n;
  memcpy(one->value, xyz.value, 3 * n * sizeof *one->value);
  memcpy(cones, lms.value, 3 * n * sizeof *cones);
  one->has_model = ef_observer_model(one->observer, &one->model);
  if (units == EF_ENERGY)
    return EF_OK;
  if (one->has_model) {
    return ef_cone_model_fundamentals(&one->model, EF_QUANTAL, grid, cones,
                                      error);
  }
  for (size_t c = 0; c < 3; ++c)
    to_quanta(grid, cones + c * n);
  return EF_OK;
}

/* Leaves out the wavelengths at both ends for which nothing is published. */
static void find_range(build *b) {
  const size_t n = b->grid.count;
  b->first = n;
  b->last = 0;
  for (size_t k = 0; k < b->n * BUILD_FUNCTIONS; ++k) {
    const built_observer *one = &b->one[k / BUILD_FUNCTIONS];
    const double *value = one->value + k % BUILD_FUNCTIONS * n;
    for (size_t i = 0; i < n; ++i) {
      if (value[i] == 0.0)
        continue;
      b->first = i < b->first ? i : b->first;
      b->last = i > b->last ? i : b->last;
    }
  }
}

/* ---- Whose ------------------------------------------------------------- */

/* The operand behind `build`, as --observer takes it. */
static ef_observer *named(const command_options *options, const ef_notes *notes,
                          ef_error *error) {
  const char *name = options->n_files > 1 ? options->files[1] : "model";
  return source_observer_named(options, name, "observer build", notes, error);
}

static ef_status make_room(build *b, size_t n, ef_error *error) {
  b->one = calloc(n, sizeof *b->one);
  if (b->one == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for observers");
  b->n = n;
  return EF_OK;
}

static ef_status choose_categories(build *b, const ef_notes *notes,
                                   ef_error *error) {
  const size_t n = (size_t)b->options->categories;
  ef_observer *mean = named(b->options, notes, error);
  if (mean == NULL)
    return error->status;
  ef_status status = people_load(&b->people, b->options, PEOPLE_CHOSEN_FROM,
                                 mean, notes, error);
  ef_observer_free(mean);
  if (status == EF_OK)
    status = people_choose(&b->people, n, b->options->jobs, error);
  if (status == EF_OK)
    status = make_room(b, n, error);
  for (size_t i = 0; i < n && status == EF_OK; ++i) {
    const ef_cone_model member = ef_population_member(b->people.population, i);
    b->one[i].share = b->people.share[i];
    b->one[i].observer = ef_observer_from_model(&member, error);
    if (b->one[i].observer == NULL)
      status = error->status;
  }
  return status;
}

static ef_status take_one(build *b, const ef_notes *notes, ef_error *error) {
  const ef_status status = make_room(b, 1, error);
  if (status != EF_OK)
    return status;
  b->one[0].share = (double)NAN;
  b->one[0].observer = named(b->options, notes, error);
  return b->one[0].observer != NULL ? EF_OK : error->status;
}

ef_status build_load(build *b, const command_options *options,
                     const ef_notes *notes, ef_error *error) {
  *b = (build){.options = options, .grid = ef_grid_standard()};
  ef_status status = options->categories > 0
                         ? choose_categories(b, notes, error)
                         : take_one(b, notes, error);
  for (size_t i = 0; i < b->n && status == EF_OK; ++i)
    status = sample(&b->one[i], &b->grid, options->units, error);
  if (status == EF_OK)
    find_range(b);
  return status;
}

void build_free(build *b) {
  for (size_t i = 0; i < b->n; ++i) {
    ef_observer_free(b->one[i].observer);
    free(b->one[i].value);
  }
  free(b->one);
  people_free(&b->people);
}
