/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "profile_fit.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "colours.h"
#include "message.h"
#include "source.h"

/* ---- Differences --------------------------------------------------------- */

ef_status measure_load(measure *m, const command_options *options,
                       ef_error *error) {
  const command_options *o = options;
  *m = (measure){.metric = ef_metric_new(
                     o->metric != NULL ? o->metric : "ciede2000", error)};
  if (m->metric == NULL)
    return message_option(error, "metric", "");
  m->published = ef_metric_jnd(m->metric);
  m->own_jnd = !isnan(o->jnd);
  m->jnd = m->own_jnd ? o->jnd : m->published.value;
  m->tolerance = isnan(o->tolerance) ? m->jnd : o->tolerance;
  if (o->check && isnan(m->tolerance)) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "no JND is published for %s: --check needs --tolerance",
                        ef_metric_title(m->metric));
  }
  return EF_OK;
}

void measure_free(measure *m) {
  ef_metric_free(m->metric);
  m->metric = NULL;
}

void measure_label(const measure *m, text *out) {
  text t = {0};
  text_format(&t, "%s (%s)", ef_metric_title(m->metric),
              ef_metric_source(m->metric));
  if (!isnan(m->jnd)) {
    char jnd[EF_NUMBER_TEXT];
    ef_number_format(m->jnd, jnd);
    text_format(&t, "; one JND is %s %s", jnd, ef_metric_symbol(m->metric));
    if (m->own_jnd)
      text_add(&t, ", as given by --jnd");
    else
      text_format(&t, ": %s (%s)", m->published.criterion, m->published.source);
  }
  text_label(out, "Difference", &t);
}

static double difference(const ef_metric *metric, const ef_residual *r,
                         ef_components *components) {
  const ef_conditions conditions = ef_conditions_default(r->white);
  double measured[3], predicted[3];
  ef_metric_coordinates(metric, r->measured, &conditions, measured);
  ef_metric_coordinates(metric, r->predicted, &conditions, predicted);
  return ef_metric_components(metric, measured, predicted, components);
}

/* ---- Profile against rows ------------------------------------------------ */

static ef_status summarise(profile_fit *f, const ef_residual *residual,
                           ef_error *error) {
  const size_t n = f->rows.n;
  f->row = calloc(n, sizeof *f->row);
  double *value = malloc(2 * n * sizeof *value);
  if (f->row == NULL || value == NULL) {
    free(value);
    return message_fail(error, EF_NO_MEMORY, "out of memory for differences");
  }
  for (size_t i = 0; i < n; ++i) {
    fit_row *row = &f->row[i];
    *row = (fit_row){.measured = residual[i].measured,
                     .predicted = residual[i].predicted,
                     .white = residual[i].white};
    row->difference =
        difference(f->measure.metric, &residual[i], &row->components);
    value[i] = row->difference;
    f->n_beyond += row->difference > f->measure.tolerance;
  }
  f->tally = tally_of(n, value, value + n);
  free(value);
  return EF_OK;
}

static ef_status compare(profile_fit *f, const double *xyz, bool has_lines,
                         ef_error *error) {
  const ef_measurements measurements = {.n_rows = f->rows.n,
                                        .n_drives = f->rows.n_device,
                                        .drive = f->rows.device,
                                        .xyz = xyz,
                                        .line =
                                            has_lines ? f->rows.line : NULL};
  ef_residual *residual = calloc(f->rows.n, sizeof *residual);
  if (residual == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for differences");
  ef_status status = ef_profile_check(f->profile, &measurements, &f->settings,
                                      residual, error);
  if (status == EF_OK)
    status = summarise(f, residual, error);
  else if (f->source != NULL)
    message_place(error, f->source);
  free(residual);
  return status;
}

/* ---- Measured rows ------------------------------------------------------- */

static bool is_rgb(const profile_fit *f) {
  return strcmp(f->info.space, "RGB") == 0;
}

static ef_status check_head(const profile_fit *f, const ef_reader_head *head,
                            ef_error *error) {
  const ef_status status =
      profile_check_columns(&f->info, f->path, f->source, head, error);
  if (status != EF_OK)
    return status;
  if (!is_rgb(f) && head->content == EF_CONTENT_SPECTRA &&
      head->kind == EF_LIGHT) {
    message_fail(error, EF_MALFORMED,
                 "has spectra of lights; a print is measured as reflectance "
                 "(--kind surface says that it is)");
    return message_place(error, f->source);
  }
  return EF_OK;
}

/* Tristimulus values of the rows, CIE 1931, under D50 where they reflect; free
 * with free(). */
static ef_status rows_xyz(profile_fit *f, const ef_reader_head *head,
                          const ef_notes *notes, double **xyz,
                          ef_error *error) {
  ef_reader_head plain = *head; /* the device values are used, by us */
  plain.n_device = 0;
  ef_observer *observer = ef_observer_new("cie-1931", error);
  ef_illuminant *d50 =
      observer == NULL ? NULL : ef_illuminant_new("D50", error);
  colour_basis basis;
  colours c = {0};
  ef_status status = d50 == NULL
                         ? error->status
                         : colour_basis_init(&basis, observer, d50, error);
  if (status == EF_OK)
    status = colours_init(&c, &basis, &plain, notes, error);
  if (status == EF_OK) {
    *xyz = malloc(3 * f->rows.n * sizeof **xyz);
    status = *xyz == NULL
                 ? message_fail(error, EF_NO_MEMORY, "out of memory for rows")
                 : colours_xyz(&c, f->rows.n, f->rows.value, f->options->jobs,
                               *xyz, error);
  }
  colours_free(&c);
  ef_illuminant_free(d50);
  ef_observer_free(observer);
  return status;
}

static ef_status against_file(profile_fit *f, const ef_notes *notes,
                              ef_error *error) {
  const bool emits = is_rgb(f) && strcmp(f->info.device_class, "display") == 0;
  const ef_kind_choice kind = f->options->kind >= 0 ? source_kind(f->options)
                              : emits               ? EF_KIND_LIGHT
                                                    : EF_KIND_AUTO;
  ef_reader *reader = source_reader(f->options, f->source, kind, notes, error);
  if (reader == NULL)
    return error->status;
  const ef_reader_head *head = ef_reader_get_head(reader);
  f->has_names = head->has_names;
  f->about = ef_content_text(head->content);
  double *xyz = NULL;
  ef_status status = check_head(f, head, error);
  if (status == EF_OK)
    status = rows_read(reader, &f->rows, error);
  if (status == EF_OK)
    status = rows_xyz(f, head, notes, &xyz, error);
  if (status == EF_OK)
    status = compare(f, xyz, true, error);
  free(xyz);
  ef_reader_free(reader);
  return status;
}

/* ---- The display's own model --------------------------------------------- */

enum { STEPS = 5, N_MODEL = STEPS * STEPS * STEPS };

static bool lay_lattice(rows *r) {
  *r = (rows){.n_device = 3, .width = 3};
  r->name = calloc(N_MODEL, sizeof *r->name);
  r->line = calloc(N_MODEL, sizeof *r->line);
  r->device = malloc(3 * N_MODEL * sizeof *r->device);
  if (r->name == NULL || r->line == NULL || r->device == NULL)
    return false;
  for (size_t k = 0; k < N_MODEL; ++k) {
    const size_t step[3] = {k / (STEPS * STEPS), k / STEPS % STEPS, k % STEPS};
    char name[64];
    for (size_t i = 0; i < 3; ++i)
      r->device[3 * k + i] = (double)step[i] / (STEPS - 1);
    snprintf(name, sizeof name, "model %zu", k + 1);
    r->name[k] = strdup(name);
    if (r->name[k] == NULL)
      return false;
    r->n = k + 1;
  }
  return true;
}

static ef_status model_xyz(const profile_fit *f, const ef_device *device,
                           double *xyz, ef_error *error) {
  ef_observer *observer = ef_observer_new("cie-1931", error);
  ef_setup *setup = observer == NULL
                        ? NULL
                        : ef_setup_new(device, observer, NULL, NULL, error);
  for (size_t k = 0; setup != NULL && k < f->rows.n; ++k) {
    double amount[EF_MAX_DRIVES];
    for (size_t i = 0; i < 3; ++i)
      amount[i] = ef_device_amount(device, i, f->rows.device[3 * k + i], NULL);
    const ef_xyz at = ef_setup_xyz(setup, amount, NULL);
    xyz[3 * k] = at.X;
    xyz[3 * k + 1] = at.Y;
    xyz[3 * k + 2] = at.Z;
  }
  const ef_status status = setup != NULL ? EF_OK : error->status;
  ef_setup_free(setup);
  ef_observer_free(observer);
  return status;
}

static ef_status against_model(profile_fit *f, ef_error *error) {
  f->from_model = true;
  f->about = "X,Y,Z";
  double *xyz = malloc(3 * N_MODEL * sizeof *xyz);
  ef_status status =
      xyz == NULL || !lay_lattice(&f->rows)
          ? message_fail(error, EF_NO_MEMORY, "out of memory for a model")
          : model_xyz(f, f->display.device, xyz, error);
  if (status == EF_OK)
    status = compare(f, xyz, false, error);
  free(xyz);
  return status;
}

/* ---- check --------------------------------------------------------------- */

ef_status profile_check_load(profile_fit *f, const command_options *options,
                             const ef_notes *notes, ef_error *error) {
  *f = (profile_fit){.options = options, .path = options->files[1]};
  ef_status status = measure_load(&f->measure, options, error);
  if (status == EF_OK)
    status = profile_settings_load(options->intent, options->scale_black,
                                   &f->settings, error);
  if (status != EF_OK)
    return status;
  f->profile = profile_file_load(f->path, NULL, error);
  if (f->profile == NULL)
    return error->status;
  f->info = ef_profile_get_info(f->profile);
  if (options->n_files < 3)
    return EF_OK;
  f->source = options->files[2];
  return against_file(f, notes, error);
}

bool profile_fit_fails(const profile_fit *f) {
  return f->options->check && (f->n_beyond > 0 || f->info.missing[0] != '\0');
}

/* ---- make ---------------------------------------------------------------- */

/* Titles of files may hold what a profile's description cannot. */
static void plain_description(const profile_fit *f, char out[200]) {
  const char *name = f->options->description != NULL
                         ? f->options->description
                         : ef_device_name(f->display.device);
  snprintf(out, 200, "%s", name);
  for (char *c = out; *c != '\0' && f->options->description == NULL; ++c) {
    if ((unsigned char)*c < 0x20u || (unsigned char)*c > 0x7Eu)
      *c = '?';
  }
}

/* Rows measured in the dark tell nothing of a screen with light on it. */
static bool has_rows(const profile_fit *f) {
  return f->display.origin == DISPLAY_MEASUREMENTS &&
         isnan(f->options->ambient_lux);
}

static void drop_note(void *cookie, const char *line) {
  (void)cookie;
  (void)line;
}

ef_status profile_make_load(profile_fit *f, const command_options *options,
                            const ef_notes *notes, unsigned char **bytes,
                            ef_error *error) {
  *f = (profile_fit){
      .options = options, .path = options->files[1], .is_made = true};
  char description[200];
  f->settings = ef_profile_settings_default();
  ef_status status = measure_load(&f->measure, options, error);
  if (status == EF_OK)
    status =
        display_load(options, f->measure.metric, notes, &f->display, error);
  if (status != EF_OK)
    return status;
  plain_description(f, description);
  status = ef_profile_make_display(description, f->display.device, notes, bytes,
                                   &f->n_bytes, error);
  if (status == EF_INVALID)
    return message_option(error, "description", "");
  if (status != EF_OK)
    return message_place(error, f->display.source);
  f->profile = ef_profile_new(f->path, *bytes, f->n_bytes, error);
  if (f->profile == NULL)
    return error->status;
  f->info = ef_profile_get_info(f->profile);
  f->source = has_rows(f) ? f->display.source : NULL;
  ef_notes silent = {.write = drop_note}; /* the file was read once already */
  return f->source != NULL ? against_file(f, &silent, error)
                           : against_model(f, error);
}

void profile_fit_free(profile_fit *f) {
  free(f->row);
  rows_free(&f->rows);
  ef_profile_free(f->profile);
  display_free(&f->display);
  measure_free(&f->measure);
}
