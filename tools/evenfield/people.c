/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "people.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "source.h"

/* As many as ef_population_medoids takes. */
enum { MOST_TO_CHOOSE_FROM = 100000 };

exit_code people_check_usage(const command_options *options, const char *option,
                             bool is_asked) {
  const command_options *o = options;
  if (o->categories > 0 && o->population > MOST_TO_CHOOSE_FROM) {
    return message_usage("--categories chooses from a --population of at most "
                         "%d",
                         MOST_TO_CHOOSE_FROM);
  }
  if (is_asked)
    return EXIT_DONE;
  const char *alone = o->ages != NULL        ? "ages"
                      : !isnan(o->seed)      ? "seed"
                      : !isnan(o->field_deg) ? "field"
                                             : NULL;
  if (alone == NULL)
    return EXIT_DONE;
  return message_usage("--%s is for the people of --%s", alone, option);
}

/* ---- Ages -------------------------------------------------------------- */

/* "20-70" or "45". */
static bool parse_range(const char *ages, double *low, double *high) {
  const char *dash = strchr(ages, '-');
  const size_t length = dash != NULL ? (size_t)(dash - ages) : strlen(ages);
  if (!ef_number_parse(ages, length, '.', low))
    return false;
  *high = *low;
  return dash == NULL || ef_number_parse(dash + 1, strlen(dash + 1), '.', high);
}

/* Names the line of an age or a share that cannot be. */
static ef_status check_row(const ef_columns *columns, size_t row,
                           ef_error *error) {
  ef_cone_model model = ef_cone_model_default();
  model.age_years = ef_columns_at(columns, row, 0);
  const double share = ef_columns_at(columns, row, 1);
  const char *field = "age";
  ef_status status = ef_cone_model_check(&model, error);
  if (status == EF_OK && !(share >= 0.0)) {
    field = "share";
    status = message_fail(error, EF_MALFORMED,
                          "the share is %g; it must not be negative", share);
  }
  if (status != EF_OK) {
    error->line = ef_columns_line(columns, row);
    snprintf(error->field, sizeof error->field, "%s", field);
  }
  return status;
}

static ef_columns *read_columns(const command_options *options,
                                const char *path, const ef_notes *notes,
                                ef_error *error) {
  static const char *const names[] = {"age", "share"};
  if (options->kept == NULL)
    return ef_columns_read(path, 2, names, notes, error);
  const char *bytes;
  size_t length;
  if (kept_get(options->kept, path, &bytes, &length, error) != EF_OK)
    return NULL;
  return ef_columns_from_text(path, bytes, length, 2, names, notes, error);
}

static ef_status read_table(people *p, const command_options *options,
                            const char *path, const ef_notes *notes,
                            ef_error *error) {
  ef_columns *columns = read_columns(options, path, notes, error);
  if (columns == NULL)
    return message_place(error, path);
  const size_t n = ef_columns_rows(columns);
  ef_status status = EF_OK;
  p->table = malloc(2 * n * sizeof *p->table);
  if (p->table == NULL)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for ages");
  for (size_t i = 0; i < n && status == EF_OK; ++i) {
    p->table[i] = ef_columns_at(columns, i, 0);
    p->table[n + i] = ef_columns_at(columns, i, 1);
    status = check_row(columns, i, error);
  }
  ef_columns_free(columns);
  if (status != EF_OK)
    return message_place(error, path);
  p->settings.n_ages = n;
  p->settings.age_years = p->table;
  p->settings.share = p->table + n;
  p->age_file = path;
  return EF_OK;
}

static ef_status set_ages(people *p, const command_options *options,
                          const ef_notes *notes, ef_error *error) {
  const char *ages = options->ages;
  ef_population_settings *s = &p->settings;
  if (parse_range(ages, &s->age_min_years, &s->age_max_years))
    return EF_OK;
  if (source_is_file(options, ages))
    return read_table(p, options, ages, notes, error);
  return message_fail(error, EF_UNKNOWN_NAME,
                      "--ages is a range such as 20-70, one age, or a file "
                      "with columns age and share; \"%.100s\" is none of them",
                      ages);
}

/* ---- Whom they vary about ---------------------------------------------- */

static bool has_departures(const ef_cone_model *m) {
  bool has = m->lens_percent != 0.0 || m->macular_percent != 0.0;
  for (size_t i = 0; i < 3; ++i)
    has = has || m->density_percent[i] != 0.0 || m->shift_nm[i] != 0.0;
  return has;
}

static void set_mean(people *p, const ef_observer *observer) {
  ef_cone_model *mean = &p->settings.mean;
  if (!ef_observer_model(observer, mean)) {
    mean->field_deg = ef_observer_field_deg(observer);
  } else if (has_departures(mean)) {
    snprintf(p->mean, sizeof p->mean, "%s", ef_observer_name(observer));
  }
}

/* ---- Drawing ----------------------------------------------------------- */

ef_status people_load(people *p, const command_options *options,
                      size_t n_default, const ef_observer *observer,
                      const ef_notes *notes, ef_error *error) {
  const command_options *o = options;
  *p = (people){.settings = ef_population_settings_default()};
  ef_population_settings *s = &p->settings;
  s->count = isnan(o->population) ? n_default : (size_t)o->population;
  if (!isnan(o->seed))
    s->seed = (uint64_t)o->seed;
  set_mean(p, observer);
  if (!isnan(o->field_deg))
    s->mean.field_deg = o->field_deg;
  if (o->ages != NULL) {
    const ef_status status = set_ages(p, o, notes, error);
    if (status != EF_OK)
      return status;
  }
  p->population = ef_population_new(s, error);
  if (p->population != NULL)
    return EF_OK;
  if (p->age_file != NULL)
    return message_place(error, p->age_file);
  return o->ages != NULL ? message_option(error, "ages", "") : error->status;
}

ef_status people_choose(people *p, size_t k, int jobs, ef_error *error) {
  if (k > p->settings.count) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--categories is at most the number of people, %zu",
                        p->settings.count);
  }
  size_t *index = malloc(k * sizeof *index);
  p->share = malloc(k * sizeof *p->share);
  ef_population *chosen = NULL;
  ef_status status =
      index == NULL || p->share == NULL
          ? message_fail(error, EF_NO_MEMORY, "out of memory for observers")
          : ef_population_medoids(p->population, k, p->settings.seed, jobs,
                                  index, p->share, error);
  if (status == EF_OK) {
    chosen = ef_population_choose(p->population, k, index, error);
    if (chosen == NULL)
      status = error->status;
  }
  free(index);
  if (status != EF_OK)
    return status;
  ef_population_free(p->population);
  p->population = chosen;
  p->n_chosen = k;
  return EF_OK;
}

void people_free(people *p) {
  ef_population_free(p->population);
  free(p->share);
  free(p->table);
  *p = (people){0};
}

/* ---- Telling ----------------------------------------------------------- */

static const char *noun(const people *p) {
  static const char *const one[] = {"person", "protanope", "deuteranope",
                                    "tritanope"};
  static const char *const many[] = {"people", "protanopes", "deuteranopes",
                                     "tritanopes"};
  const ef_deficiency kind = p->settings.mean.deficiency;
  return p->settings.count == 1 ? one[kind] : many[kind];
}

void people_add_who(text *out, const people *p) {
  const ef_population_settings *s = &p->settings;
  char low[EF_NUMBER_TEXT], high[EF_NUMBER_TEXT];
  ef_number_format(s->age_min_years, low);
  ef_number_format(s->age_max_years, high);
  text_format(out, "%zu %s ", s->count, noun(p));
  if (p->age_file != NULL) {
    const bool is_stdin = strcmp(p->age_file, "-") == 0;
    text_format(out, "of the ages in %.200s",
                is_stdin ? "standard input" : p->age_file);
  } else if (s->age_min_years < s->age_max_years) {
    text_format(out, "%s to %s years old", low, high);
  } else {
    text_format(out, "%s years old", low);
  }
}

void people_add(text *out, const people *p) {
  char field[EF_NUMBER_TEXT], seed[EF_NUMBER_TEXT];
  ef_number_format(p->settings.mean.field_deg, field);
  ef_number_format_fixed((double)p->settings.seed, 0, seed);
  people_add_who(out, p);
  text_format(out, ", %s degree field, drawn with seed %s", field, seed);
  if (p->mean[0] != '\0')
    text_format(out, ", who vary about observer %s", p->mean);
}

void people_write(ef_json *json, const people *p) {
  const ef_population_settings *s = &p->settings;
  ef_json_integer(json, "count", (int64_t)s->count);
  ef_json_integer(json, "seed", (int64_t)s->seed);
  if (p->n_chosen > 0)
    ef_json_integer(json, "categories", (int64_t)p->n_chosen);
  if (p->age_file != NULL) {
    ef_json_text(json, "ages", p->age_file);
  } else {
    ef_json_number(json, "age_min_years", s->age_min_years);
    ef_json_number(json, "age_max_years", s->age_max_years);
  }
  ef_json_number(json, "field_deg", s->mean.field_deg);
  ef_json_text(json, "deficiency", ef_deficiency_name(s->mean.deficiency));
  if (p->mean[0] != '\0')
    ef_json_text(json, "vary_about", p->mean);
}
