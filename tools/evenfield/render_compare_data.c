/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_compare.h"

#include <math.h>
#include <stdlib.h>

#include "document.h"
#include "grades.h"
#include "message.h"
#include "part.h"
#include "viewing.h"
#include "words.h"

#define NONE ((double)NAN)
#define NO_ESTIMATE                                                            \
  { NONE, NONE, NONE, NONE }

struct compare_data {
  document out;
};

/* ---- Parts of a pair --------------------------------------------------- */

static void record_estimate(record *r, const char *key, const ef_estimate *e) {
  record_begin(r, key);
  record_number(r, "value", e->value);
  record_number(r, "low", e->low);
  record_number(r, "high", e->high);
  record_end(r);
}

static void record_colour(record *r, const char *key, ef_xyz xyz,
                          ef_xyz white) {
  record_begin(r, key);
  record_xyz(r, xyz);
  record_lab(r, ef_xyz_to_lab(xyz, white));
  record_end(r);
}

static void record_told(record *r, const compare_scene *s,
                        const ef_told_apart *told) {
  record_begin(r, "told_apart");
  record_number(r, "share_of_observers", told->share_of_observers.value);
  record_number(r, "low", told->share_of_observers.low);
  record_number(r, "high", told->share_of_observers.high);
  record_number(r, "proportion_correct", compare_correct(s, told)->value);
  record_number(r, "d_prime", told->d_prime.value);
  record_estimate(r, "correct_2ifc", &told->correct_2ifc);
  record_estimate(r, "correct_same_different", &told->correct_same_different);
  record_estimate(r, "correct_triangle", &told->correct_triangle);
  record_end(r);
}

/* One look at one angle. Its own words for the direction go with text only. */
static void record_condition(record *r, const compare_scene *s, const look *l,
                             double angle_deg, const outcome *o) {
  const ef_xyz white = l->basis.white;
  char direction[WORDS_ROOM] = "";
  if (!isnan(o->difference)) {
    const ef_lab lab = ef_xyz_to_lab(o->standard, white);
    words_direction(o->components, ef_lab_to_lch(lab).h_deg, direction);
  }
  record_text(r, "illuminant", ef_illuminant_name(l->illuminant));
  record_text(r, "observer", ef_observer_name(l->observer));
  record_number(r, "angle_deg", angle_deg);
  record_begin(r, "difference");
  record_text(r, "metric", ef_metric_name(s->metric));
  record_number(r, "value", o->difference);
  record_number(r, "jnds", o->difference / s->jnd.record.value);
  record_number(r, "standard_uncertainty", o->sd);
  record_number(r, "noise_alone", o->noise_alone);
  record_end(r);
  record_begin(r, "grey_scale");
  record_number(r, "cielab", o->cielab);
  const char *step = grade_contrast(l, o);
  record_text(r, "step", step != NULL ? step : "");
  record_end(r);
  record_begin(r, "components");
  record_number(r, "lightness", o->components.lightness);
  record_number(r, "chroma", o->components.chroma);
  record_number(r, "hue", o->components.hue);
  record_text(r, "words", direction);
  record_end(r);
  record_told(r, s, &o->told);
  if (s->people.population != NULL) {
    record_begin(r, "population");
    record_number(r, "mean", o->population_mean);
    record_number(r, "p95", o->population_p95);
    record_end(r);
  }
  record_colour(r, "reference_colour", o->standard, white);
  record_colour(r, "sample_colour", o->sample, white);
}

static void record_verdict(record *r, const compare_scene *s,
                           const compared *c) {
  const bool computed = c->n_angles > 0;
  const bool known = computed && !isnan(s->tolerance);
  record_begin(r, "verdict");
  record_text(r, "result",
              !computed   ? "not computed"
              : !known    ? "no tolerance"
              : c->within ? "within"
              : c->beyond ? "beyond"
                          : "incomplete");
  record_boolean(r, "is_certain", known && c->is_certain);
  record_number(r, "tolerance", s->tolerance);
  record_number(r, "worst_difference",
                computed ? c->outcome[c->worst].difference : NONE);
  record_text(r, "worst_illuminant",
              computed
                  ? ef_illuminant_name(compare_look_of(s, c->worst)->illuminant)
                  : "");
  record_end(r);
}

/* ---- JSON: an object a pair -------------------------------------------- */

static void write_indices(ef_json *j, const compare_scene *s,
                          const compared *c) {
  const look *other = &s->looks.at[s->looks.n];
  ef_json_begin_array(j, "indices");
  for (size_t i = 0; i < c->n_angles * s->looks.n; ++i) {
    const look *l = compare_look_of(s, i);
    if (i % s->looks.n == 0)
      continue;
    ef_json_begin_object(j, NULL);
    ef_json_text(j, "illuminant", ef_illuminant_name(l->illuminant));
    ef_json_text(j, "observer", ef_observer_name(l->observer));
    ef_json_number(j, "angle_deg", c->angle_deg[compare_angle_of(s, i)]);
    ef_json_number(j, "index", c->outcome[i].metamerism);
    ef_json_number(j, "inconstancy_reference",
                   c->outcome[i].inconstancy_standard);
    ef_json_number(j, "inconstancy_sample", c->outcome[i].inconstancy_sample);
    ef_json_end_object(j);
  }
  for (size_t a = 0; a < c->n_angles && s->looks.has_other; ++a) {
    ef_json_begin_object(j, NULL);
    ef_json_text(j, "illuminant", ef_illuminant_name(other->illuminant));
    ef_json_text(j, "observer", ef_observer_name(other->observer));
    ef_json_number(j, "angle_deg", c->angle_deg[a]);
    ef_json_number(j, "index", c->other_observer[a]);
    ef_json_end_object(j);
  }
  ef_json_end_array(j);
}

static void write_spectral(ef_json *j, const compared *c) {
  ef_json_begin_array(j, "spectral");
  for (size_t a = 0; a < c->n_angles; ++a) {
    ef_json_begin_object(j, NULL);
    ef_json_number(j, "angle_deg", c->angle_deg[a]);
    ef_json_number(j, "rms", c->spectral[a].rms);
    ef_json_number(j, "black_rms", c->spectral[a].black_rms);
    ef_json_number(j, "weighted", c->spectral[a].weighted);
    ef_json_end_object(j);
  }
  ef_json_end_array(j);
}

static void write_finish(ef_json *j, const compare_scene *s,
                         const compared *c) {
  if (c->n_angles < 2)
    return;
  ef_json_begin_array(j, "finish");
  for (size_t k = 0; k < s->looks.n; ++k) {
    const ef_angles *a = &c->finish[k];
    ef_json_begin_object(j, NULL);
    ef_json_text(j, "illuminant",
                 ef_illuminant_name(s->looks.at[k].illuminant));
    ef_json_text(j, "observer", ef_observer_name(s->looks.at[k].observer));
    ef_json_number(j, "worst", a->worst);
    ef_json_number(j, "worst_angle_deg", c->angle_deg[a->worst_angle]);
    ef_json_number(j, "mean", a->mean);
    ef_json_number(j, "total", a->total);
    ef_json_end_object(j);
  }
  ef_json_end_array(j);
}

static void write_pair(ef_json *j, const compare_scene *s, const compared *c) {
  record r = record_of_json(j);
  record_begin(&r, NULL);
  record_text(&r, "reference", c->standard);
  record_text(&r, "sample", c->sample);
  ef_json_integer(j, "line", (int64_t)c->line);
  ef_json_integer(j, "reference_readings", (int64_t)c->n_readings[0]);
  ef_json_integer(j, "sample_readings", (int64_t)c->n_readings[1]);
  ef_json_begin_array(j, "conditions");
  for (size_t i = 0; i < c->n_angles * s->looks.n; ++i) {
    record condition = record_of_json(j);
    record_begin(&condition, NULL);
    record_condition(&condition, s, compare_look_of(s, i),
                     c->angle_deg[compare_angle_of(s, i)], &c->outcome[i]);
    record_end(&condition);
  }
  ef_json_end_array(j);
  write_finish(j, s, c);
  ef_json_begin_object(j, "metamerism");
  ef_json_text(j, "correction", ef_correction_name(s->correction));
  write_indices(j, s, c);
  write_spectral(j, c);
  ef_json_end_object(j);
  record_verdict(&r, s, c);
  record_text(&r, "reason", c->reason);
  record_end(&r);
}

/* ---- CSV: a row a look and angle --------------------------------------- */

static void record_row(record *r, const compare_scene *s, const compared *c,
                       size_t i) {
  static const outcome empty = {.standard = {NONE, NONE, NONE},
                                .sample = {NONE, NONE, NONE},
                                .difference = NONE,
                                .components = {NONE, NONE, NONE},
                                .cielab = NONE,
                                .sd = NONE,
                                .noise_alone = NONE,
                                .metamerism = NONE,
                                .inconstancy_standard = NONE,
                                .inconstancy_sample = NONE,
                                .told = {NO_ESTIMATE, NO_ESTIMATE, NO_ESTIMATE,
                                         NO_ESTIMATE, NO_ESTIMATE, NO_ESTIMATE,
                                         NONE, NONE, NONE},
                                .population_mean = NONE,
                                .population_p95 = NONE};
  const bool computed = c->n_angles > 0;
  const size_t a = computed ? compare_angle_of(s, i) : 0;
  const outcome *o = computed ? &c->outcome[i] : &empty;
  const ef_angles *over_angles =
      c->n_angles > 1 ? &c->finish[i % s->looks.n] : NULL;
  record_begin(r, NULL);
  record_text(r, "reference", c->standard);
  record_text(r, "sample", c->sample);
  record_number(r, "line", (double)c->line);
  record_number(r, "reference_readings", (double)c->n_readings[0]);
  record_number(r, "sample_readings", (double)c->n_readings[1]);
  record_condition(r, s, compare_look_of(s, i),
                   computed ? c->angle_deg[a] : NONE, o);
  record_begin(r, "metamerism");
  record_number(r, "index", o->metamerism);
  record_number(r, "inconstancy_reference", o->inconstancy_standard);
  record_number(r, "inconstancy_sample", o->inconstancy_sample);
  record_number(r, "other_observer_index",
                computed && i % s->looks.n == 0 ? c->other_observer[a] : NONE);
  record_number(r, "spectral_rms", computed ? c->spectral[a].rms : NONE);
  record_number(r, "spectral_black_rms",
                computed ? c->spectral[a].black_rms : NONE);
  record_number(r, "spectral_weighted",
                computed ? c->spectral[a].weighted : NONE);
  record_end(r);
  record_begin(r, "finish");
  record_number(r, "worst", over_angles != NULL ? over_angles->worst : NONE);
  record_number(r, "total", over_angles != NULL ? over_angles->total : NONE);
  record_end(r);
  record_verdict(r, s, c);
  record_text(r, "reason", c->reason);
  record_end(r);
}

static void write_rows(ef_csv *csv, const compare_scene *s, const compared *c) {
  const size_t n = c->n_angles > 0 ? c->n_angles * s->looks.n : 1;
  for (size_t i = 0; i < n; ++i) {
    record r = record_of_csv(csv, false);
    record_row(&r, s, c, i);
  }
}

/* ---- The document around the pairs ------------------------------------- */

static void write_basis(ef_json *j, const compare_scene *s) {
  char conditions[200];
  ef_json_boolean(j, "demo", s->is_demo);
  ef_json_text(j, "reference_source", s->standard_source);
  ef_json_text(j, "sample_source", s->batch_source);
  ef_json_text(j, "metric", ef_metric_name(s->metric));
  jnd_write(j, &s->jnd);
  ef_json_number(j, "tolerance", s->tolerance);
  ef_json_text(j, "task", ef_task_name(s->task));
  ef_json_begin_object(j, "uncertainty");
  ef_json_text(j, "method",
               s->told.propagation == EF_PROPAGATE_FIRST_ORDER ? "first order"
               : s->always_draws                               ? "monte carlo"
                                 : "monte carlo, first order where it is "
                                   "small");
  ef_json_integer(j, "seed", (int64_t)s->told.seed);
  ef_json_integer(j, "samples", (int64_t)s->told.n_draws);
  ef_json_number(j, "batch_sd", s->options->batch_sd);
  ef_json_end_object(j);
  if (s->people.population != NULL) {
    ef_json_begin_object(j, "population");
    people_write(j, &s->people);
    ef_json_end_object(j);
  }
  if (viewing_matters(s->metric)) {
    viewing_words(&s->looks.at[0].conditions, conditions);
    ef_json_text(j, "viewing", conditions);
  }
}

compare_data *compare_data_new(const compare_scene *s, ef_output *output,
                               bool is_csv, ef_error *error) {
  compare_data *d = calloc(1, sizeof *d);
  if (d == NULL) {
    message_fail(error, EF_NO_MEMORY, "out of memory for the result");
    return NULL;
  }
  if (document_open(&d->out, output, is_csv, error) != EF_OK) {
    compare_data_free(d);
    return NULL;
  }
  if (is_csv && !part_has_header(s->options))
    return d;
  if (is_csv) {
    static const compared none = {.standard = "", .sample = ""};
    record r = document_header(&d->out);
    record_row(&r, s, &none, 0);
    return d;
  }
  write_basis(d->out.json, s);
  document_begin_rows(&d->out, "pairs");
  return d;
}

typedef struct block {
  const compare_scene *scene;
  const compared *pair;
} block;

static void write_one(const document *to, const void *self, size_t i) {
  const block *b = self;
  if (to->csv != NULL) {
    write_rows(to->csv, b->scene, &b->pair[i]);
  } else {
    write_pair(to->json, b->scene, &b->pair[i]);
  }
}

static ef_status rows(void *self, const compare_scene *s, size_t n,
                      const compared *pairs, ef_error *error) {
  compare_data *d = self;
  const block b = {s, pairs};
  return document_write(&d->out, n, s->options->jobs, write_one, &b, error);
}

compare_sink compare_data_sink(compare_data *d) {
  return (compare_sink){.self = d, .rows = rows};
}

static void write_worst_cases(ef_json *j, const compare_scene *s) {
  const size_t n = s->looks.n + (s->looks.has_other ? 1 : 0);
  if (s->n_worst_cases == 0)
    return;
  ef_json_begin_array(j, "worst_case");
  for (size_t i = 0; i < s->n_worst_cases; ++i) {
    const look *l = &s->looks.at[i % n];
    const worst_case *w = &s->worst_case[i];
    if (i % n == 0)
      continue;
    ef_json_begin_object(j, NULL);
    ef_json_text(j, "illuminant", ef_illuminant_name(l->illuminant));
    ef_json_text(j, "observer", ef_observer_name(l->observer));
    ef_json_number(j, "angle_deg", w->angle_deg);
    ef_json_number(j, "difference", w->difference);
    ef_json_number(j, "volume_lab", w->volume_lab);
    ef_json_text(j, "reason", w->reason);
    ef_json_end_object(j);
  }
  ef_json_end_array(j);
}

static void write_simulators(ef_json *j, const compare_scene *s,
                             const compare_count *n) {
  if (!s->options->grade_simulators)
    return;
  ef_json_begin_array(j, "simulators");
  for (size_t k = 1; k < s->looks.n; ++k) {
    const simulator_grade g = grade_simulator(s, n, k);
    ef_json_begin_object(j, NULL);
    ef_json_text(j, "illuminant",
                 ef_illuminant_name(s->looks.at[k].illuminant));
    ef_json_text(j, "stands_for",
                 ef_illuminant_name(s->looks.at[0].illuminant));
    ef_json_number(j, "mean_difference", g.mean_difference);
    ef_json_number(j, "reference_mean_difference",
                   n->difference[0] / (double)n->n_differences[0]);
    ef_json_number(j, "uv_distance", g.distance);
    ef_json_text(j, "grade", g.grade);
    ef_json_end_object(j);
  }
  ef_json_end_array(j);
}

static void write_summary(ef_json *j, const compare_scene *s,
                          const compare_count *n) {
  const bool has_tolerance = !isnan(s->tolerance);
  ef_json_begin_object(j, "summary");
  ef_json_integer(j, "pairs", (int64_t)n->n);
  ef_json_integer(j, "not_computed", (int64_t)(n->n - n->n_computed));
  if (has_tolerance) {
    ef_json_integer(j, "within", (int64_t)n->n_within);
    ef_json_integer(j, "beyond", (int64_t)n->n_beyond);
  }
  ef_json_integer(j, "skipped_rows", (int64_t)n->n_skipped);
  ef_json_end_object(j);
}

ef_status compare_data_finish(compare_data *d, const compare_scene *s,
                              const compare_count *count, ef_error *error) {
  document_end_rows(&d->out);
  if (d->out.json != NULL) {
    write_worst_cases(d->out.json, s);
    write_simulators(d->out.json, s, count);
    write_summary(d->out.json, s, count);
  }
  return document_close(&d->out, error);
}

void compare_data_free(compare_data *d) {
  if (d != NULL)
    document_free(&d->out);
  free(d);
}
