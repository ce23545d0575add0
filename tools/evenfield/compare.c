/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "compare.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "pairing.h"
#include "source.h"

/* Rows of standards, and of the first part of the batch, within which readings
 * of a name may stand anywhere. */
enum { HELD_ROWS = 100000 };

static const char demo_standard[] = "demo:seats-standard";
static const char demo_batch[] = "demo:seats-deliveries";

/* Daylight, incandescent light, the narrow-band fluorescent lamp of shops (CIE
 * 015 recommends FL2, FL7 and FL11) and a neutral white LED. */
static const char *const default_lights[] = {"D65", "A", "FL11", "LED-B3",
                                             "demo:shop-light"};
enum { N_DEFAULT_LIGHTS = 4, N_DEMO_LIGHTS = 5 };

/* ---- Options ----------------------------------------------------------- */

/* VALUE, or FORMULA:VALUE where the formula must be the one computed. */
static ef_status set_tolerance(compare_scene *s, ef_error *error) {
  const char *typed = s->options->tolerance_text;
  s->own_tolerance = typed != NULL;
  s->tolerance = s->jnd.is_known ? s->jnd.record.value : (double)NAN;
  if (typed == NULL) {
    if (!s->options->check || !isnan(s->tolerance))
      return EF_OK;
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--check needs --tolerance: no JND is published for %s",
                        ef_metric_name(s->metric));
  }
  const char *colon = strrchr(typed, ':');
  const char *number = colon != NULL ? colon + 1 : typed;
  if (!ef_number_parse(number, strlen(number), '.', &s->tolerance) ||
      !(s->tolerance >= 0.0)) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--tolerance is a number from 0 on, or FORMULA:NUMBER, "
                        "not \"%.100s\"",
                        typed);
  }
  if (colon == NULL)
    return EF_OK;
  char name[128];
  snprintf(name, sizeof name, "%.*s", (int)(colon - typed), typed);
  ef_metric *asked = ef_metric_new(name, error);
  if (asked == NULL)
    return message_option(error, "tolerance", "");
  const bool is_same =
      strcmp(ef_metric_name(asked), ef_metric_name(s->metric)) == 0;
  ef_metric_free(asked);
  if (is_same)
    return EF_OK;
  return message_fail(error, EF_UNKNOWN_NAME,
                      "--tolerance is for %.100s and the differences are of "
                      "%.100s: --metric %.100s computes the others",
                      name, ef_metric_name(s->metric), name);
}

static ef_status set_methods(compare_scene *s, ef_error *error) {
  const command_options *o = s->options;
  s->correction = EF_CORRECT_MULTIPLICATIVE;
  s->adaptation = EF_ADAPT_CAT16;
  s->task = EF_TASK_2IFC;
  if (o->correction != NULL &&
      ef_correction_find(o->correction, &s->correction, error) != EF_OK)
    return message_option(error, "correction", "");
  if (o->adaptation != NULL &&
      ef_adaptation_find(o->adaptation, &s->adaptation, error) != EF_OK)
    return message_option(error, "adaptation", "");
  if (o->task != NULL && ef_task_find(o->task, &s->task, error) != EF_OK)
    return message_option(error, "task", "");
  if (s->task != EF_TASK_2IFC && s->task != EF_TASK_SAME_DIFFERENT &&
      s->task != EF_TASK_TRIANGLE) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--task is 2ifc, same-different or triangle: the share "
                        "of right answers in %s depends on the observer's "
                        "false alarms",
                        o->task);
  }
  s->told = ef_told_apart_settings_default();
  if (!isnan(o->seed))
    s->told.seed = (uint64_t)o->seed;
  if (isnan(o->samples))
    return EF_OK;
  s->always_draws = o->samples > 0.0;
  if (s->always_draws) {
    s->told.n_draws = (size_t)o->samples;
  } else {
    s->told.propagation = EF_PROPAGATE_FIRST_ORDER;
  }
  if (s->always_draws && s->told.n_draws < 100) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--samples is 0 or at least 100, not %g", o->samples);
  }
  return EF_OK;
}

/* "15:2,45:1" */
static ef_status set_weights(compare_scene *s, ef_error *error) {
  const char *typed = s->options->angle_weights;
  if (typed == NULL)
    return EF_OK;
  const size_t most = strlen(typed) + 1;
  s->angle_deg = malloc(most * sizeof *s->angle_deg);
  s->weight = malloc(most * sizeof *s->weight);
  if (s->angle_deg == NULL || s->weight == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for weights");
  for (const char *at = typed; at != NULL;) {
    const size_t length = strcspn(at, ",");
    const size_t angle = strcspn(at, ":");
    if (angle >= length ||
        !ef_number_parse(at, angle, '.', &s->angle_deg[s->n_weights]) ||
        !ef_number_parse(at + angle + 1, length - angle - 1, '.',
                         &s->weight[s->n_weights]) ||
        s->weight[s->n_weights] < 0.0) {
      return message_fail(error, EF_UNKNOWN_NAME,
                          "--angle-weights is a list such as 15:2,45:1 of "
                          "angles and weights from 0 on, not \"%.100s\"",
                          typed);
    }
    ++s->n_weights;
    at = at[length] == '\0' ? NULL : at + length + 1;
  }
  return EF_OK;
}

/* ---- Files ------------------------------------------------------------- */

static ef_status open_files(compare_scene *s, const ef_notes *notes,
                            ef_error *error) {
  const command_options *o = s->options;
  s->is_demo = o->n_files == 0;
  s->standard_source = s->is_demo ? demo_standard : o->files[0];
  s->batch_source = s->is_demo       ? demo_batch
                    : o->n_files > 1 ? o->files[1]
                                     : o->files[0];
  s->pairing = o->pairs != NULL ? PAIR_LIST : PAIR_ONE;
  const size_t held = o->pairs != NULL ? SIZE_MAX : HELD_ROWS;
  const char *shared = o->pairs != NULL ? o->pairs : s->batch_source;
  const ef_status status = part_of_file(o, shared, &s->part, error);
  if (status != EF_OK)
    return status;
  /* What is to be said of rows that all parts need, the first one says. */
  const bool is_first = part_has_header(o);
  const part_range common = {is_first ? 0 : SIZE_MAX,
                             is_first ? 0 : SIZE_MAX, false, true};
  s->standard =
      finish_file_open(o, s->standard_source, &common, held, notes, error);
  if (s->standard == NULL)
    return error->status;
  if (o->n_files == 1)
    return EF_OK;
  s->batch =
      finish_file_open(o, s->batch_source, o->pairs != NULL ? &common : &s->part,
                       held, notes, error);
  return s->batch != NULL ? EF_OK : error->status;
}

static bool is_spectral(const finish_file *file) {
  return finish_file_head(file)->content == EF_CONTENT_SPECTRA;
}

/* Spectra that have no wavelength in common say nothing of each other. */
static ef_status check_ranges(const compare_scene *s, ef_error *error) {
  const ef_grid *a = &finish_file_head(s->standard)->grid;
  const ef_grid *b = &finish_file_head(s->batch)->grid;
  const double a_first = ef_grid_wavelength(a, 0);
  const double a_last = ef_grid_wavelength(a, a->count - 1);
  const double b_first = ef_grid_wavelength(b, 0);
  const double b_last = ef_grid_wavelength(b, b->count - 1);
  if (a_first <= b_last && b_first <= a_last)
    return EF_OK;
  message_fail(error, EF_MALFORMED,
               "its spectra cover %g to %g nm and those of %.100s %g to %g nm: "
               "they do not overlap",
               b_first, b_last, s->standard_source, a_first, a_last);
  return message_place(error, s->batch_source);
}

/* Colours belong to one light: no other can be told from them. */
static ef_status check_content(compare_scene *s, const ef_notes *notes,
                               ef_error *error) {
  const finish_file *batch = s->batch != NULL ? s->batch : s->standard;
  const char *no_spectra = !is_spectral(s->standard) ? s->standard_source
                           : !is_spectral(batch)     ? s->batch_source
                                                     : NULL;
  s->has_spectra = no_spectra == NULL;
  if (s->has_spectra) {
    if (s->batch == NULL) {
      s->same_grid = true;
      return EF_OK;
    }
    s->same_grid = ef_grid_equal(&finish_file_head(s->standard)->grid,
                                 &finish_file_head(batch)->grid);
    return check_ranges(s, error);
  }
  const command_options *o = s->options;
  if (o->lights.n > 1 || o->observers.n > 1) {
    message_fail(error, EF_MALFORMED,
                 "colours belong to one light and one observer; to compare "
                 "under others spectra are needed");
    return message_place(error, no_spectra);
  }
  if (s->correction == EF_CORRECT_SPECTRAL) {
    message_fail(error, EF_MALFORMED,
                 "--correction spectral needs spectra, not colours");
    return message_place(error, no_spectra);
  }
  looks_keep_first(&s->looks);
  if (o->lights.n == 0) {
    message_note(notes,
                 "%s: colours, not spectra: compared under %s alone, which "
                 "they are taken to belong to",
                 no_spectra, ef_illuminant_name(s->looks.at[0].illuminant));
  }
  return EF_OK;
}

/* As ISO/CIE 23603 has it. */
static ef_status check_simulators(const compare_scene *s, ef_error *error) {
  if (!s->options->grade_simulators)
    return EF_OK;
  if (!s->has_spectra || s->looks.n < 2) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--grade-simulators: needs spectra of pairs, and with "
                        "--illuminant the light they match in and those to be "
                        "graded");
  }
  if (strcmp(ef_metric_name(s->metric), "cielab") == 0 &&
      s->looks.n_observers == 1 &&
      strcmp(ef_observer_name(s->looks.at[0].observer), "cie-1964") == 0) {
    return EF_OK;
  }
  return message_fail(error, EF_UNKNOWN_NAME,
                      "--grade-simulators: the grades of ISO/CIE 23603 are for "
                      "--metric cielab and --observer cie-1964");
}

static ef_status check_worst_case(const compare_scene *s, ef_error *error) {
  const command_options *o = s->options;
  if ((!o->worst_case && o->boundary == NULL) || s->has_spectra)
    return EF_OK;
  return message_fail(error, EF_NO_ANSWER,
                      "--%s: colours belong to one light; what samples "
                      "that match there do in others follows from spectra only",
                      o->worst_case ? "worst-case" : "boundary");
}

/* Whoever stands before the first observer's looks, seeing both sides on the
 * standards' wavelengths. */
static ef_status gather_people(compare_scene *s, ef_error *error) {
  ef_spread_settings settings = ef_spread_settings_default();
  settings.metric = s->metric;
  settings.threshold = s->jnd.record.value;
  for (size_t k = 0; k < s->looks.n; ++k) {
    const look *l = &s->looks.at[k];
    if (l->observer != s->looks.at[0].observer)
      continue;
    const ef_side side = {.grid = finish_file_head(s->standard)->grid,
                          .viewing = ef_viewing_default(l->illuminant)};
    s->crowd[k] = ef_crowd_new(s->people.population, &side, &side, &settings,
                               NULL, error);
    if (s->crowd[k] == NULL)
      return error->status;
  }
  return EF_OK;
}

static ef_status make_clouds(compare_scene *s, ef_error *error) {
  if (s->options->chart == NULL && s->options->report == NULL)
    return EF_OK;
  s->clouds = calloc(1, sizeof *s->clouds);
  return s->clouds != NULL
             ? EF_OK
             : message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
}

static ef_status set_people(compare_scene *s, const ef_notes *notes,
                            ef_error *error) {
  const command_options *o = s->options;
  if (isnan(o->population))
    return EF_OK;
  if (!s->has_spectra) {
    return message_fail(error, EF_NO_ANSWER,
                        "--population: what other people see follows from "
                        "spectra only, and these are colours");
  }
  ef_status status =
      people_load(&s->people, o, 1000, s->looks.at[0].observer, notes, error);
  if (status == EF_OK)
    status = gather_people(s, error);
  return status == EF_OK ? make_clouds(s, error) : status;
}

/* ---- The scene --------------------------------------------------------- */

static ef_status load_options(compare_scene *s, const ef_notes *notes,
                              ef_error *error) {
  const command_options *o = s->options;
  s->metric = jnd_metric(o, notes, error);
  if (s->metric == NULL)
    return error->status;
  ef_status status = jnd_load(o, s->metric, notes, &s->jnd, error);
  if (status == EF_OK)
    status = set_tolerance(s, error);
  if (status == EF_OK)
    status = set_methods(s, error);
  if (status == EF_OK)
    status = set_weights(s, error);
  return status;
}

ef_status compare_scene_load(compare_scene *s, const command_options *options,
                             const ef_notes *notes, ef_error *error) {
  const command_options *o = options;
  *s = (compare_scene){.options = o, .notes = notes};
  ef_status status = load_options(s, notes, error);
  const size_t n_lights = o->n_files == 0 ? N_DEMO_LIGHTS : N_DEFAULT_LIGHTS;
  if (status == EF_OK)
    status = looks_init(&s->looks, o, n_lights, default_lights, notes, error);
  if (status == EF_OK)
    status = open_files(s, notes, error);
  if (status == EF_OK)
    status = check_content(s, notes, error);
  if (status == EF_OK)
    status = check_worst_case(s, error);
  if (status == EF_OK)
    status = check_simulators(s, error);
  if (status == EF_OK)
    status = finish_file_look(s->standard, &s->looks, notes, error);
  if (status == EF_OK && s->batch != NULL)
    status = finish_file_look(s->batch, &s->looks, notes, error);
  if (status == EF_OK)
    status = set_people(s, notes, error);
  if (status == EF_OK)
    jnd_note(&s->jnd, s->metric, notes);
  return status;
}

void compare_scene_free(compare_scene *s) {
  for (size_t k = 0; k < LOOKS_MOST; ++k)
    ef_crowd_free(s->crowd[k]);
  if (s->clouds != NULL)
    clouds_free(s->clouds);
  free(s->clouds);
  people_free(&s->people);
  for (size_t i = 0; i < sizeof s->teller / sizeof s->teller[0]; ++i)
    ef_teller_free(s->teller[i]);
  free(s->worst_case_of);
  worst_case_free(s->worst_case, s->n_worst_cases);
  finish_file_free(s->batch);
  finish_file_free(s->standard);
  looks_free(&s->looks);
  free(s->angle_deg);
  free(s->weight);
  ef_metric_free(s->metric);
}

size_t compare_angle_of(const compare_scene *s, size_t i) {
  return i / s->looks.n;
}

const look *compare_look_of(const compare_scene *s, size_t i) {
  return &s->looks.at[i % s->looks.n];
}

/* ---- Streaming --------------------------------------------------------- */

typedef struct receiver {
  compare_scene *scene;
  const compare_sink *sink;
  compare_count *count;
  message_progress progress;
  char reason[COMPARE_REASON_ROOM + 90]; /* of the first pair without */
} receiver;

static void count_pair(receiver *r, const compared *c) {
  compare_count *n = r->count;
  ++n->n;
  if (c->within)
    ++n->n_within;
  if (c->beyond)
    ++n->n_beyond;
  if (c->n_angles == 0) {
    if (r->reason[0] == '\0') {
      snprintf(r->reason, sizeof r->reason, "%.80s: %s",
               c->sample[0] != '\0' ? c->sample : c->standard, c->reason);
    }
    return;
  }
  ++n->n_computed;
  for (size_t i = 0; i < c->n_angles * r->scene->looks.n; ++i) {
    const double difference = c->outcome[i].difference;
    if (isnan(difference))
      continue;
    n->difference[i % r->scene->looks.n] += difference;
    ++n->n_differences[i % r->scene->looks.n];
  }
  n->has_repeats = n->has_repeats || c->n_readings[0] > c->n_angles ||
                   c->n_readings[1] > c->n_angles;
  n->has_angles = n->has_angles || !isnan(c->angle_deg[0]);
}

/* Once, when the standard is known. */
static ef_status find_worst_cases(compare_scene *s, const pair *first,
                                  ef_error *error) {
  const command_options *o = s->options;
  if ((!o->worst_case && o->boundary == NULL) || s->n_worst_cases > 0 ||
      first->standard == NULL)
    return EF_OK;
  if (s->pairing != PAIR_ONE) {
    return message_fail(error, EF_NO_ANSWER,
                        "--%s is told of one standard, and there are several "
                        "here",
                        o->worst_case ? "worst-case" : "boundary");
  }
  const size_t n = worst_case_count(&s->looks, first->standard);
  s->worst_case = calloc(n, sizeof *s->worst_case);
  if (s->worst_case == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for metamers");
  s->n_worst_cases = n;
  s->worst_case_of = strdup(first->standard_name);
  if (s->worst_case_of == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for metamers");
  return worst_case_find(&s->looks, first->standard, s->metric,
                         o->boundary != NULL, o->jobs, s->worst_case, error);
}

static ef_status receive(void *self, size_t n, const pair *pairs,
                         ef_error *error) {
  receiver *r = self;
  judged j;
  ef_status status = find_worst_cases(r->scene, &pairs[0], error);
  if (status != EF_OK)
    return status;
  status = judge_pairs(r->scene, n, pairs, &j, error);
  for (size_t i = 0; i < n && status == EF_OK; ++i)
    count_pair(r, &j.pair[i]);
  if (status == EF_OK)
    status = r->sink->rows(r->sink->self, r->scene, n, j.pair, error);
  judged_free(&j);
  message_progress_show(&r->progress, r->count->n);
  return status;
}

ef_status compare_stream(compare_scene *s, const compare_sink *sink,
                         compare_count *count, ef_error *error) {
  *count = (compare_count){0};
  receiver r = {.scene = s,
                .sink = sink,
                .count = count,
                .progress = message_progress_start(s->options->quiet)};
  const pairing_sink to = {.self = &r, .block = receive};
  const ef_status status = pairing_stream(s, &to, error);
  message_progress_end(&r.progress);
  count->n_skipped = finish_file_skipped(s->standard) +
                     (s->batch != NULL ? finish_file_skipped(s->batch) : 0);
  if (status == EF_OK && count->n_computed == 0 && s->options->part == NULL) {
    return message_fail(error, EF_NO_ANSWER,
                        "none of %zu pairs could be compared; the first, %s",
                        count->n, r.reason);
  }
  return status;
}
