/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Individual observers, and one weights matrix for many of them. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"
#include "observer/observer_private.h"
#include "observer/population_private.h"

/* ---- Settings ---------------------------------------------------------- */

ef_population_settings ef_population_settings_default(void) {
  return (ef_population_settings){.count = 1000,
                                  .seed = 1,
                                  .age_min_years = 20,
                                  .age_max_years = 70,
                                  .mean = ef_cone_model_default(),
                                  .deviation_scale = 1};
}

ef_cone_model ef_population_deviations(void) {
  return (ef_cone_model){.lens_percent = 18.7,
                         .macular_percent = 36.5,
                         .density_percent = {9.0, 9.0, 7.4},
                         .shift_nm = {2.0, 1.5, 1.3}};
}

static const double age_low = 20, age_high = 80; /* years, CIE 170-1:2006 */

static bool age_is_known(double age_years) {
  return age_years >= age_low && age_years <= age_high;
}

static ef_status check_age_range(const ef_population_settings *settings,
                                 ef_error *error) {
  const double low = settings->age_min_years, high = settings->age_max_years;
  if (!age_is_known(low) || !age_is_known(high)) {
    return ef__error_set(error, EF_INVALID,
                         "the ages go from %g to %g years; the observer model "
                         "takes %g to %g",
                         low, high, age_low, age_high);
  }
  if (low <= high) return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "the ages go from %g down to %g years; the lower one "
                       "comes first",
                       low, high);
}

static ef_status check_age_table(const ef_population_settings *settings,
                                 ef_error *error) {
  const double rounding = 0.001; /* of shares printed with some decimals */
  double sum = 0;
  for (size_t i = 0; i < settings->n_ages; ++i) {
    if (!age_is_known(settings->age_years[i])) {
      return ef__error_set(error, EF_INVALID,
                           "row %zu of the age table is for %g years; the "
                           "observer model takes %g to %g",
                           i + 1, settings->age_years[i], age_low, age_high);
    }
    if (!(settings->share[i] >= 0)) {
      return ef__error_set(error, EF_INVALID,
                           "row %zu of the age table has a share of %g; shares "
                           "must not be negative",
                           i + 1, settings->share[i]);
    }
    sum += settings->share[i];
  }
  if (fabs(sum - 1) <= rounding) return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "the shares of the age table sum to %g; they must sum "
                       "to 1",
                       sum);
}

static ef_status check_settings(const ef_population_settings *settings,
                                ef_error *error) {
  enum { MOST_SCALE = 3 };
  if (settings->count < 1 || settings->count > EF_POPULATION_MOST) {
    return ef__error_set(error, EF_INVALID,
                         "a population of %zu observers; 1 to %d are possible",
                         settings->count, EF_POPULATION_MOST);
  }
  const double scale = settings->deviation_scale;
  if (!(scale >= 0 && scale <= MOST_SCALE)) {
    return ef__error_set(error, EF_INVALID,
                         "individuals deviate by %g times the published "
                         "standard deviations; 0 to %d are possible",
                         scale, MOST_SCALE);
  }
  const ef_status status = settings->n_ages > 0
                               ? check_age_table(settings, error)
                               : check_age_range(settings, error);
  if (status != EF_OK) return status;
  ef_cone_model mean = settings->mean;
  mean.age_years = age_low; /* not used */
  return ef_cone_model_check(&mean, error);
}

/* ---- The object -------------------------------------------------------- */

static ef_population *allocate(size_t n_ages, size_t n_members,
                               ef_error *error) {
  ef_population *population = NULL;
  ef_population part = {.n_ages = n_ages};
  const ef__part parts[] = {
      {&population, 1, sizeof *population},
      {&part.age_years, n_ages, sizeof *part.age_years},
      {&part.cumulative, n_ages, sizeof *part.cumulative},
      {&part.member, n_members, sizeof *part.member}};
  if (ef__allocate_block(sizeof parts / sizeof *parts, parts) == NULL) {
    ef__error_memory(error, "population");
    return NULL;
  }
  if (n_members == 0) part.member = NULL;
  *population = part;
  return population;
}

static void fill_ages(ef_population *population,
                      const ef_population_settings *settings) {
  double sum = 0;
  for (size_t i = 0; i < settings->n_ages; ++i) {
    sum += settings->share[i];
    population->age_years[i] = settings->age_years[i];
    population->cumulative[i] = sum;
  }
  for (size_t i = 0; i < settings->n_ages; ++i) {
    population->cumulative[i] /= sum;
  }
}

ef_population *ef_population_new(const ef_population_settings *settings,
                                 ef_error *error) {
  ef__field field;
  if (check_settings(settings, error) != EF_OK) return NULL;
  if (ef__field_find(settings->mean.field_deg, &field, error) != EF_OK) {
    return NULL;
  }
  ef_population *const population = allocate(settings->n_ages, 0, error);
  if (population == NULL) return NULL;
  population->settings = *settings;
  population->settings.age_years = NULL;
  population->settings.share = NULL;
  population->field = field;
  fill_ages(population, settings);
  return population;
}

ef_population *ef_population_choose(const ef_population *population, size_t n,
                                    const size_t *index, ef_error *error) {
  if (n < 1 || n > EF_POPULATION_MOST) {
    ef__error_set(error, EF_INVALID,
                  "%zu members are chosen; 1 to %d are possible", n,
                  EF_POPULATION_MOST);
    return NULL;
  }
  const size_t count = population->settings.count;
  for (size_t i = 0; i < n; ++i) {
    if (index[i] < count) continue;
    ef__error_set(error, EF_INVALID,
                  "member %zu is chosen of a population of %zu, whose first "
                  "is 0",
                  index[i], count);
    return NULL;
  }
  ef_population *const chosen = allocate(0, n, error);
  if (chosen == NULL) return NULL;
  chosen->settings = population->settings;
  chosen->settings.count = n;
  chosen->field = population->field;
  for (size_t i = 0; i < n; ++i) {
    chosen->member[i] = ef_population_member(population, index[i]);
  }
  return chosen;
}

void ef_population_free(ef_population *population) {
  free(population); /* one block */
}

size_t ef_population_count(const ef_population *population) {
  return population->settings.count;
}

double ef_population_field_deg(const ef_population *population) {
  return population->settings.mean.field_deg;
}

/* ---- Members ----------------------------------------------------------- */

static double draw_age(const ef_population *population, ef__random *random) {
  const ef_population_settings *const settings = &population->settings;
  const double u = ef__random_unit(random);
  if (population->n_ages == 0) {
    const double low = settings->age_min_years;
    return low + u * (settings->age_max_years - low);
  }
  size_t row = 0;
  while (row + 1 < population->n_ages && u >= population->cumulative[row]) {
    ++row;
  }
  return population->age_years[row];
}

static double within(double value, double low, double high) {
  return value < low ? low : value > high ? high : value;
}

/* Ranges of ef_cone_model_check. */
static double draw_percent(double mean, double deviation, ef__random *random) {
  return within(mean + deviation * ef__random_normal(random), -100, 400);
}

static double draw_nm(double mean, double deviation, ef__random *random) {
  return within(mean + deviation * ef__random_normal(random), -40, 40);
}

/* The order of drawing is part of what a seed means. */
ef_cone_model ef_population_member(const ef_population *population, size_t i) {
  if (population->member != NULL) return population->member[i];
  const double scale = population->settings.deviation_scale;
  const ef_cone_model sd = ef_population_deviations();
  ef_cone_model model = population->settings.mean;
  ef__random random = ef__random_stream(population->settings.seed, i);
  model.age_years = draw_age(population, &random);
  model.lens_percent =
      draw_percent(model.lens_percent, scale * sd.lens_percent, &random);
  model.macular_percent =
      draw_percent(model.macular_percent, scale * sd.macular_percent, &random);
  for (size_t c = 0; c < 3; ++c) {
    model.density_percent[c] = draw_percent(
        model.density_percent[c], scale * sd.density_percent[c], &random);
  }
  for (size_t c = 0; c < 3; ++c) {
    model.shift_nm[c] =
        draw_nm(model.shift_nm[c], scale * sd.shift_nm[c], &random);
  }
  return model;
}

/* ---- Weights ----------------------------------------------------------- */

/* What the observers of one call need. */
typedef struct work {
  const ef_population *population;
  const ef_viewing *viewing;
  size_t first;
  ef__cones *cones;  /* on the summation grid */
  ef__cones *whole;  /* on the template grid; NULL for trichromats */
  double *power;     /* of the illuminant; NULL for lights */
  double *channel;   /* 3 x samples of the summation grid, per observer */
  double *scale;     /* 3 per observer */
} work;

/* As the viewing of a single observer has it, sums in the same order. */
static double find_scale(const work *w, const double *y_bar) {
  if (w->viewing->kind == EF_SURFACE) {
    double sum = 0;
    for (size_t i = 0; i < w->cones->n; ++i) sum += w->power[i] * y_bar[i];
    return 100 / sum;
  }
  const double step_nm = w->viewing->working.step_nm;
  return w->viewing->absolute ? w->population->field.k_m * step_nm : step_nm;
}

static void make_observers(void *context, size_t begin, size_t end) {
  const work *const w = context;
  const size_t n = w->cones->n;
  for (size_t i = begin; i < end; ++i) {
    double *const channel = w->channel + 3 * n * i;
    const ef_cone_model model =
        ef_population_member(w->population, w->first + i);
    const double scale =
        w->whole != NULL
            ? ef__dichromat_scale(w->whole, &model, &w->population->field)
            : 1;
    ef__cones_fundamentals(w->cones, &model, EF_ENERGY, channel);
    ef__field_tristimulus(&w->population->field, n, model.deficiency, scale,
                          channel, channel);
    for (size_t c = 0; c < 3; ++c) {
      w->scale[3 * i + c] = find_scale(w, channel + n);
    }
  }
}

static ef_status check_part(const ef_population *population, size_t first,
                            size_t count, ef_error *error) {
  const size_t all = population->settings.count;
  if (count >= 1 && first < all && count <= all - first) return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "observers %zu to %zu are asked of a population of %zu",
                       first, first + count, all);
}

/* Fills cones, whole, power, channel, scale; returns the block to free. */
static ef_status prepare(work *w, size_t count, void **block,
                         ef_error *error) {
  const ef_grid *const grid = &w->viewing->working;
  const ef_illuminant *const illuminant = w->viewing->illuminant;
  const ef_grid whole = ef__template_grid();
  size_t n_values;
  ef_status status = ef__cones_new(grid, &w->cones, error);
  if (status == EF_OK &&
      w->population->settings.mean.deficiency != EF_TRICHROMAT) {
    status = ef__cones_new(&whole, &w->whole, error);
  }
  if (status != EF_OK) return status;
  const bool fits = ef__size_multiply(3 * count, grid->count, &n_values);
  const ef__part parts[] = {{&w->channel, n_values, sizeof(double)},
                            {&w->scale, 3 * count, sizeof(double)},
                            {&w->power, grid->count, sizeof(double)}};
  *block = fits ? ef__allocate_block(3, parts) : NULL;
  if (*block == NULL) return ef__error_memory(error, "weights of a population");
  if (illuminant == NULL) return EF_OK;
  return ef_illuminant_sample(illuminant, grid, w->power, error);
}

static ef_weights *fold(const work *w, size_t count, const ef_grid *samples,
                        const ef_notes *notes, ef_error *error) {
  static const char *const names[3] = {"an individual's x_bar",
                                       "an individual's y_bar",
                                       "an individual's z_bar"};
  const ef_viewing *const viewing = w->viewing;
  for (size_t i = 0; i < count && viewing->illuminant != NULL; ++i) {
    if (ef__light_check(viewing->illuminant, w->scale[3 * i], error) != EF_OK) {
      return NULL;
    }
  }
  const ef_fold_settings settings = {
      .working = viewing->working,
      .interpolation = viewing->interpolation,
      .extension = viewing->extension,
      .kind = viewing->kind,
      .correct_bandpass = viewing->correct_bandpass};
  ef_weights *const weights = ef_weights_fold(
      samples, 3 * count, w->channel,
      viewing->illuminant != NULL ? w->power : NULL, w->scale, &settings,
      error);
  if (weights != NULL) ef__note_outside(weights, 3, names, viewing, notes);
  return weights;
}

ef_weights *ef_population_weights(const ef_population *population, size_t first,
                                  size_t count, const ef_grid *samples,
                                  const ef_viewing *viewing, int jobs,
                                  const ef_notes *notes, ef_error *error) {
  enum { CHUNK = 4 }; /* observers: some tenths of a millisecond */
  if (check_part(population, first, count, error) != EF_OK ||
      ef__viewing_check(viewing, error) != EF_OK ||
      ef__working_check(&viewing->working, error) != EF_OK) {
    return NULL;
  }
  work w = {.population = population, .viewing = viewing, .first = first};
  void *block = NULL;
  ef_weights *weights = NULL;
  if (prepare(&w, count, &block, error) == EF_OK) {
    ef__parallel_for(count, CHUNK, jobs, make_observers, &w);
    weights = fold(&w, count, samples, notes, error);
  }
  free(block);
  free(w.whole);
  free(w.cones);
  return weights;
}
