/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "other_eyes.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"

/* How far the pigment of the anomalous trichromats is moved: an example, since
 * people differ; common practice, no source. */
#define SHIFT_NM 12.0

typedef struct eye {
  const char *head;
  ef_deficiency deficiency;
  int anomaly; /* an ef_anomaly, or NONE */
} eye;

enum { NONE = -1 };
static const eye eyes[OTHER_EYES] = {
    {"mean eye", EF_TRICHROMAT, NONE},
    {"protanope", EF_PROTANOPE, NONE},
    {"deuteranope", EF_DEUTERANOPE, NONE},
    {"tritanope", EF_TRITANOPE, NONE},
    {"protanomalous", EF_TRICHROMAT, EF_PROTANOMALOUS},
    {"deuteranomalous", EF_TRICHROMAT, EF_DEUTERANOMALOUS}};

void other_eyes_free(other_eyes *e) {
  for (size_t k = 0; k < OTHER_EYES; ++k) {
    ef_crowd_free(e->crowd[k]);
    ef_population_free(e->population[k]);
  }
  *e = (other_eyes){0};
}

/* ---- Looking ----------------------------------------------------------- */

/* Age and field of the observer named, where it has an age. */
static ef_cone_model model_of(const ef_observer *observer) {
  ef_cone_model model = ef_cone_model_default(), own;
  model.field_deg = ef_observer_field_deg(observer);
  if (ef_observer_model(observer, &own))
    model.age_years = own.age_years;
  return model;
}

static ef_status open_eye(other_eyes *e, const match_scene *s, size_t k,
                          ef_error *error) {
  ef_population_settings settings = ef_population_settings_default();
  settings.count = 1;
  settings.deviation_scale = 0.0;
  settings.mean = model_of(s->observer);
  settings.age_min_years = settings.age_max_years = settings.mean.age_years;
  settings.mean.deficiency = eyes[k].deficiency;
  if (eyes[k].anomaly != NONE) {
    const ef_status status = ef_cone_model_make_anomalous(
        &settings.mean, (ef_anomaly)eyes[k].anomaly, SHIFT_NM, error);
    if (status != EF_OK)
      return status;
  }
  const seen *sides = &s->seen;
  e->population[k] = ef_population_new(&settings, error);
  if (e->population[k] == NULL)
    return error->status;
  ef_spread_settings one = sides->settings;
  one.weight = NULL;
  e->crowd[k] = ef_crowd_new(e->population[k], &sides->target, &sides->match,
                             &one, NULL, error);
  return e->crowd[k] != NULL ? EF_OK : error->status;
}

/* The rows stay in the order of the targets; the least one makes room. */
static void keep_row(other_eyes *e, const other_eyes_row *row) {
  if (e->n_rows == OTHER_EYES_MOST_ROWS) {
    size_t least = 0;
    for (size_t i = 1; i < e->n_rows; ++i) {
      if (e->row[i].worst < e->row[least].worst)
        least = i;
    }
    if (!(row->worst > e->row[least].worst))
      return;
    memmove(&e->row[least], &e->row[least + 1],
            (e->n_rows - least - 1) * sizeof *row);
    --e->n_rows;
  }
  e->row[e->n_rows++] = *row;
}

static void count(other_eyes *e, const match_scene *s, const match_rows *rows,
                  const ef_spread *spread) {
  for (size_t i = 0; i < rows->n; ++i) {
    other_eyes_row row = {.worst = 0.0};
    snprintf(row.name, sizeof row.name, "%s", rows->name[i]);
    for (size_t k = 0; k < OTHER_EYES; ++k) {
      const double difference = spread[k * rows->n + i].mean;
      row.difference[k] = difference;
      row.worst = fmax(row.worst, difference);
      e->n_within[k] += difference <= s->jnd.value;
    }
    keep_row(e, &row);
  }
  e->n_seen += rows->n;
}

ef_status other_eyes_look(other_eyes *e, const match_scene *s,
                          const match_rows *rows, ef_error *error) {
  const seen *sides = &s->seen;
  if (!sides->has_sides || ef_observer_dimensions(s->observer) != 3)
    return EF_OK;
  ef_spread *spread = malloc((OTHER_EYES * rows->n + 1) * sizeof *spread);
  if (spread == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the report");
  ef_status status = EF_OK;
  for (size_t k = 0; k < OTHER_EYES && status == EF_OK; ++k) {
    if (e->crowd[k] == NULL)
      status = open_eye(e, s, k, error);
    if (status == EF_OK) {
      status = ef_crowd_spread(e->crowd[k], rows->n, sides->target.sample,
                               sides->match.sample, s->options->jobs,
                               spread + k * rows->n, NULL, error);
    }
  }
  if (status == EF_OK)
    count(e, s, rows, spread);
  free(spread);
  return status;
}

/* ---- The section ------------------------------------------------------- */

static void add_words(const other_eyes *e, const match_scene *s,
                      const report *page) {
  const ef_cone_model model = model_of(s->observer);
  text t = {0};
  if (!isnan(s->jnd.value)) {
    text_add(&t, "Within one JND of the target: ");
    for (size_t k = 0; k < OTHER_EYES; ++k)
      text_format(&t, "%s%s %zu", k > 0 ? ", " : "", eyes[k].head,
                  e->n_within[k]);
    text_format(&t, " of %zu. ", e->n_seen);
  }
  text_format(&t,
              "Model eyes of %g years and a %g degree field (CIE 170-1:2006): "
              "dichromats lack one kind of cones and differ within the two "
              "dimensions left to them; of the anomalous trichromats one "
              "pigment is moved by %g nm, an example, since people differ. "
              "Nothing here says what anybody's eyes are.",
              model.age_years, model.field_deg, SHIFT_NM);
  if (t.bytes != NULL)
    ef_report_paragraph(page->page, t.bytes);
  text_free(&t);
}

static void add_table(const other_eyes *e, const match_scene *s,
                      const report *page) {
  enum { COLUMNS = OTHER_EYES + 1 };
  char number[OTHER_EYES_MOST_ROWS * OTHER_EYES][EF_NUMBER_TEXT];
  const char *cell[OTHER_EYES_MOST_ROWS * COLUMNS];
  char head[120], caption[160];
  snprintf(head, sizeof head, "Off by, %.80s", ef_metric_symbol(s->metric));
  ef_report_column column[COLUMNS] = {{"Target", "", true}};
  for (size_t k = 0; k < OTHER_EYES; ++k)
    column[k + 1] = (ef_report_column){k == 0 ? head : NULL, eyes[k].head,
                                       false};
  for (size_t i = 0; i < e->n_rows; ++i) {
    cell[i * COLUMNS] = e->row[i].name;
    for (size_t k = 0; k < OTHER_EYES; ++k) {
      char *digits = number[i * OTHER_EYES + k];
      ef_number_format_fixed(e->row[i].difference[k], 2, digits);
      cell[i * COLUMNS + k + 1] = digits;
    }
  }
  if (e->n_rows < e->n_seen)
    snprintf(caption, sizeof caption,
             "The %zu of %zu targets with the largest differences", e->n_rows,
             e->n_seen);
  else
    snprintf(caption, sizeof caption, "All targets");
  ef_report_table(page->page, caption, COLUMNS, column, e->n_rows, cell);
}

void other_eyes_report(const other_eyes *e, const match_scene *s,
                       const report *page) {
  if (e->n_seen == 0)
    return;
  ef_report_section(page->page, "What other eyes would see of this match");
  add_words(e, s, page);
  add_table(e, s, page);
}
