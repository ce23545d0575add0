/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "source.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "message.h"
#include "rows.h"

static bool ends_with(const char *text, const char *end) {
  const size_t n = strlen(text), m = strlen(end);
  return n >= m && strcmp(text + n - m, end) == 0;
}

/* On the disk, or for a replay in the record. */
static bool is_there(const command_options *options, const char *name) {
  const kept_files *kept = options->kept;
  if (kept != NULL && kept->is_closed)
    return kept_has(kept, name);
  return access(name, F_OK) == 0;
}

bool source_is_file(const command_options *options, const char *name) {
  return strncmp(name, "demo:", 5) == 0 || strcmp(name, "-") == 0 ||
         strchr(name, '/') != NULL || ends_with(name, ".csv") ||
         is_there(options, name);
}

ef_kind_choice source_kind(const command_options *options) {
  if (options->kind < 0)
    return EF_KIND_AUTO;
  return options->kind == 0 ? EF_KIND_SURFACE : EF_KIND_LIGHT;
}

static ef_reader_settings reader_settings(const command_options *options,
                                          ef_kind_choice kind,
                                          const ef_notes *notes) {
  ef_reader_settings settings = ef_reader_settings_default();
  settings.kind = kind;
  settings.skip_bad = options->skip_bad;
  if (!isnan(options->device_max))
    settings.device_max = options->device_max;
  settings.notes = notes;
  return settings;
}

ef_reader *source_rows(const command_options *options, const char *path,
                       const part_range *range, const ef_notes *notes,
                       ef_error *error) {
  ef_reader_settings settings =
      reader_settings(options, source_kind(options), notes);
  settings.first_byte = range->first_byte;
  settings.end_byte = range->end_byte;
  settings.reads_others = range->reads_others;
  settings.reads_ahead = options->jobs != 1;
  return ef_reader_open(path, &settings, error);
}

ef_reader *source_reader(const command_options *options, const char *path,
                         ef_kind_choice kind, const ef_notes *notes,
                         ef_error *error) {
  const ef_reader_settings settings = reader_settings(options, kind, notes);
  if (options->kept == NULL)
    return ef_reader_open(path, &settings, error);
  const char *text;
  size_t length;
  if (kept_get(options->kept, path, &text, &length, error) != EF_OK)
    return NULL;
  const char *name = strcmp(path, "-") == 0 ? "standard input" : path;
  return ef_reader_from_text(name, text, length, &settings, error);
}

static const char no_file[] = "; and there is no such file";

static ef_spectra *read_spectra(const command_options *options,
                                const char *path, ef_kind_choice kind,
                                const ef_notes *notes, ef_error *error) {
  ef_reader *reader = source_reader(options, path, kind, notes, error);
  if (reader == NULL)
    return NULL;
  const ef_reader_head *head = ef_reader_get_head(reader);
  ef_spectra *spectra = NULL;
  rows all = {0};
  if (head->content != EF_CONTENT_SPECTRA) {
    message_fail(error, EF_MALFORMED, "spectra are needed here, not %s",
                 ef_content_text(head->content));
    message_place(error, path);
  } else if (rows_read(reader, &all, error) == EF_OK) {
    spectra = rows_spectra(&all, head, error);
  }
  rows_free(&all);
  ef_reader_free(reader);
  return spectra;
}

/* ---- Observers --------------------------------------------------------- */

/* Of a file that holds x_bar, y_bar, z_bar and more, as `observer build` writes
 * it, these three; else all. Takes `all` over. */
static ef_spectra *only_matching(ef_spectra *all, const char *path,
                                 const ef_notes *notes, ef_error *error) {
  static const char *const names[3] = {"x_bar", "y_bar", "z_bar"};
  const size_t n_samples = ef_spectra_grid(all)->count;
  size_t place[3];
  bool has_names = ef_spectra_count(all) > 3;
  for (size_t i = 0; i < 3 && has_names; ++i) {
    ef_error ignored;
    has_names = ef_spectra_find(all, names[i], &place[i], &ignored) == EF_OK;
  }
  double *value = has_names ? malloc(3 * n_samples * sizeof *value) : NULL;
  if (!has_names)
    return all;
  ef_spectra *three = NULL;
  if (value == NULL) {
    message_fail(error, EF_NO_MEMORY, "out of memory for an observer");
  } else {
    for (size_t i = 0; i < 3; ++i) {
      memcpy(value + i * n_samples,
             ef_spectra_values(all) + place[i] * n_samples,
             n_samples * sizeof *value);
    }
    three =
        ef_spectra_new(3, names, ef_spectra_grid(all), EF_LIGHT, value, error);
    message_note(notes,
                 "%s: of its %zu functions x_bar, y_bar and z_bar are "
                 "taken",
                 path, ef_spectra_count(all));
  }
  free(value);
  ef_spectra_free(all);
  return three;
}

ef_observer *source_observer_named(const command_options *options,
                                   const char *name, const char *what,
                                   const ef_notes *notes, ef_error *error) {
  ef_observer *observer = ef_observer_new(name, error);
  if (observer != NULL)
    return observer;
  if (error->status != EF_UNKNOWN_NAME) {
    message_argument(error, what, "");
    return NULL;
  }
  if (!source_is_file(options, name)) {
    /* With settings behind a colon no file can be meant. */
    message_argument(error, what, strchr(name, ':') == NULL ? no_file : "");
    return NULL;
  }
  ef_spectra *functions =
      read_spectra(options, name, EF_KIND_FUNCTION, notes, error);
  if (functions != NULL)
    functions = only_matching(functions, name, notes, error);
  if (functions == NULL)
    return NULL;
  observer = ef_observer_from_spectra(name, functions, error);
  if (observer == NULL)
    message_place(error, name);
  ef_spectra_free(functions);
  return observer;
}

ef_observer *source_observer(const command_options *options,
                             const ef_notes *notes, ef_error *error) {
  const char *name = options->observer != NULL ? options->observer : "cie-1931";
  return source_observer_named(options, name, "--observer", notes, error);
}

/* ---- Illuminants ------------------------------------------------------- */

/* Says that a file holds several spectra, and how to choose. */
static void ask_for_column(const ef_spectra *lights, const char *option,
                           const char *path, ef_error *error) {
  char names[200] = "";
  size_t length = 0;
  const size_t n = ef_spectra_count(lights);
  for (size_t i = 0; i < n && length < sizeof names; ++i) {
    length += (size_t)snprintf(names + length, sizeof names - length, "%s%s",
                               i == 0 ? "" : ", ", ef_spectra_name(lights, i));
  }
  message_fail(error, EF_INVALID,
               "holds %zu spectra (%s); choose one with --%s FILE:COLUMN", n,
               names, option);
  message_place(error, path);
}

static ef_illuminant *illuminant_from_file(const command_options *options,
                                           const char *option, const char *path,
                                           const char *column,
                                           const ef_notes *notes,
                                           ef_error *error) {
  ef_spectra *lights = read_spectra(options, path, EF_KIND_LIGHT, notes, error);
  if (lights == NULL)
    return NULL;
  ef_illuminant *illuminant = NULL;
  size_t i = 0;
  if (column == NULL && ef_spectra_count(lights) > 1) {
    ask_for_column(lights, option, path, error);
  } else if (column == NULL ||
             ef_spectra_find(lights, column, &i, error) == EF_OK) {
    illuminant = ef_illuminant_from_spectra(lights, i, error);
  }
  if (illuminant == NULL)
    message_place(error, path);
  ef_spectra_free(lights);
  return illuminant;
}

ef_illuminant *source_illuminant(const command_options *options,
                                 const char *option, const char *name,
                                 const ef_notes *notes, ef_error *error) {
  ef_illuminant *illuminant = ef_illuminant_new(name, error);
  if (illuminant != NULL)
    return illuminant;
  if (error->status != EF_UNKNOWN_NAME) {
    message_option(error, option, "");
    return NULL;
  }
  char path[4096];
  snprintf(path, sizeof path, "%s", name);
  char *colon = strrchr(path, ':');
  const bool is_demo = strncmp(path, "demo:", 5) == 0;
  if (colon == NULL || is_there(options, name) ||
      (is_demo && colon == path + 4)) {
    if (source_is_file(options, name)) {
      return illuminant_from_file(options, option, name, NULL, notes, error);
    }
  } else {
    *colon = '\0';
    if (source_is_file(options, path)) {
      return illuminant_from_file(options, option, path, colon + 1, notes,
                                  error);
    }
  }
  message_option(error, option, no_file);
  return NULL;
}

const char *source_first_light(const command_options *options,
                               const char *otherwise) {
  if (options->lights.n > 0)
    return options->lights.text[0];
  return options->illuminant != NULL ? options->illuminant : otherwise;
}

/* ---- Surfaces ---------------------------------------------------------- */

ef_status source_surface(const command_options *options, const char *option,
                         const char *name, const ef_notes *notes,
                         ef_spectra **spectra, size_t *at, ef_error *error) {
  char path[4096];
  snprintf(path, sizeof path, "%s", name);
  char *colon = strrchr(path, ':');
  const bool is_demo = strncmp(path, "demo:", 5) == 0 && colon == path + 4;
  const char *sample = NULL;
  if (colon != NULL && !is_demo && access(name, F_OK) != 0) {
    *colon = '\0';
    sample = colon + 1;
  }
  *at = 0;
  *spectra = read_spectra(options, path, EF_KIND_AUTO, notes, error);
  if (*spectra == NULL)
    return error->status;
  ef_status status = EF_OK;
  if (ef_spectra_kind(*spectra) != EF_SURFACE) {
    status = message_fail(error, EF_MALFORMED,
                          "reflectances of surfaces are needed here, and these "
                          "are lights");
  } else if (sample != NULL) {
    status = ef_spectra_find(*spectra, sample, at, error);
  } else if (ef_spectra_count(*spectra) > 1) {
    ask_for_column(*spectra, option, path, error);
    status = error->status;
  }
  if (status == EF_OK)
    return EF_OK;
  message_place(error, path);
  ef_spectra_free(*spectra);
  *spectra = NULL;
  return status;
}
