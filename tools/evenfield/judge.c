/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "judge.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "judge_work.h"
#include "message.h"

#define NONE ((double)NAN)

static const double z_975 = 1.96;

/* Sights a thread takes at a time. */
enum { PIECE = 64 };

static void work_free(work *w) {
  for (int side = 0; side < 2; ++side) {
    free(w->xyz[side]);
    free(w->at[side]);
    free(w->spectrum[side]);
  }
  free(w->sight);
  free(w->difference);
}

/* ---- Sights ------------------------------------------------------------ */

static const specimen *at_angle(const finish *f, double angle_deg) {
  for (size_t i = 0; i < f->n; ++i) {
    const double a = f->at[i].angle_deg;
    if (a == angle_deg || (isnan(a) && isnan(angle_deg)))
      return &f->at[i];
  }
  return NULL;
}

/* "the standard was not measured at 45, 75 degrees" */
static void tell_missing(const finish *of, const finish *in, const char *who,
                         char reason[COMPARE_REASON_ROOM]) {
  size_t used = strlen(reason), n = 0;
  const char *before = used > 0 ? "; " : "";
  for (size_t i = 0; i < of->n && used < COMPARE_REASON_ROOM; ++i) {
    char angle[EF_NUMBER_TEXT];
    if (at_angle(in, of->at[i].angle_deg) != NULL)
      continue;
    if (isnan(of->at[i].angle_deg)) {
      snprintf(reason + used, COMPARE_REASON_ROOM - used,
               "%s%s has measuring angles, the other has none", before, who);
      return;
    }
    ef_number_format(of->at[i].angle_deg, angle);
    if (n++ == 0) {
      used +=
          (size_t)snprintf(reason + used, COMPARE_REASON_ROOM - used,
                           "%s%s was not measured at %s", before, who, angle);
    } else {
      used += (size_t)snprintf(reason + used, COMPARE_REASON_ROOM - used,
                               ", %s", angle);
    }
  }
  if (n > 0 && used < COMPARE_REASON_ROOM)
    snprintf(reason + used, COMPARE_REASON_ROOM - used, " degrees");
}

static size_t most_sights(size_t n, const pair *pairs) {
  size_t most = 0;
  for (size_t i = 0; i < n; ++i) {
    if (pairs[i].sample != NULL)
      most += pairs[i].sample->n;
  }
  return most;
}

static void find_sights(work *w, size_t n, const pair *pairs, compared *out) {
  for (size_t i = 0; i < n; ++i) {
    const pair *p = &pairs[i];
    compared *c = &out[i];
    *c = (compared){.standard = p->standard_name,
                    .sample = p->sample_name,
                    .line = p->line};
    memcpy(c->reason, p->reason, sizeof c->reason);
    if (p->standard == NULL || p->sample == NULL || p->reason[0] != '\0')
      continue;
    for (size_t k = 0; k < p->sample->n; ++k) {
      const specimen *sample = &p->sample->at[k];
      const specimen *standard = at_angle(p->standard, sample->angle_deg);
      if (standard == NULL)
        continue;
      w->sight[w->n++] = (sight){standard, sample, i};
      ++c->n_angles;
      c->n_readings[0] += standard->n_readings;
      c->n_readings[1] += sample->n_readings;
    }
    tell_missing(p->sample, p->standard, "the standard", c->reason);
    if (c->n_angles > 0 || c->reason[0] == '\0')
      tell_missing(p->standard, p->sample, "the sample", c->reason);
  }
}

/* ---- Uncertainty of measurement ---------------------------------------- */

/* Of the mean of a specimen's readings. What was read once is taken to scatter
 * like its counterpart: it is the same instrument. */
static const ef_scatter *scatter_of(const specimen *of, const specimen *other,
                                    size_t under, ef_scatter *room) {
  const specimen *known = of->covariance != NULL ? of : other;
  if (known->covariance == NULL)
    return NULL;
  for (int i = 0; i < 9; ++i) {
    room->covariance[i] =
        known->covariance[9 * under + (size_t)i] / (double)of->n_readings;
  }
  return room;
}

static void set_uncertainty(const work *w, size_t i) {
  const size_t k = w->under;
  const sight *at = &w->sight[i];
  outcome *o = work_outcome(w, i, k);
  ef_scatter room[2];
  const ef_scatter *a = scatter_of(at->standard, at->sample, k, &room[0]);
  const ef_scatter *b = scatter_of(at->sample, at->standard, k, &room[1]);
  o->sd = o->noise_alone = NONE;
  if (a == NULL || isnan(o->difference))
    return;
  const ef_uncertain u =
      ef_metric_uncertainty(w->s->metric, o->standard, o->sample,
                            &w->s->looks.at[k].conditions, a, b);
  o->sd = u.sd;
  o->noise_alone = u.noise_alone;
}

/* ---- Differences ------------------------------------------------------- */

static ef_xyz xyz_of(const double *v) {
  return (ef_xyz){v[0], v[1], v[2]};
}

static void gather(work *w, size_t under) {
  for (size_t i = 0; i < w->n; ++i) {
    memcpy(w->xyz[0] + 3 * i, w->sight[i].standard->xyz + 3 * under,
           3 * sizeof(double));
    memcpy(w->xyz[1] + 3 * i, w->sight[i].sample->xyz + 3 * under,
           3 * sizeof(double));
  }
}

/* The sights [begin, end) under the look at hand, when the coordinates and
 * differences of all are there. */
static void set_outcomes(void *context, size_t begin, size_t end) {
  const work *w = context;
  const ef_xyz white = w->s->looks.at[w->under].basis.white;
  for (size_t i = begin; i < end; ++i) {
    outcome *o = work_outcome(w, i, w->under);
    o->standard = xyz_of(w->xyz[0] + 3 * i);
    o->sample = xyz_of(w->xyz[1] + 3 * i);
    o->difference = w->difference[i];
    ef_metric_components(w->s->metric, w->at[0] + 3 * i, w->at[1] + 3 * i,
                         &o->components);
    o->cielab = ef_delta_e_cielab(ef_xyz_to_lab(o->standard, white),
                                  ef_xyz_to_lab(o->sample, white));
    o->population_mean = o->population_p95 = NONE;
    o->metamerism = o->inconstancy_standard = o->inconstancy_sample = NONE;
    set_uncertainty(w, i);
  }
}

static void set_differences(work *w, size_t k) {
  const compare_scene *s = w->s;
  const look *l = &s->looks.at[k];
  const int jobs = s->options->jobs;
  w->under = k;
  gather(w, k);
  for (int side = 0; side < 2; ++side) {
    ef_metric_coordinates_batch(s->metric, w->n, w->xyz[side], &l->conditions,
                                jobs, w->at[side]);
  }
  ef_metric_difference_batch(s->metric, w->n, w->at[0], w->at[1], jobs,
                             w->difference);
  ef_parallel_for(w->n, PIECE, jobs, set_outcomes, w);
}

/* ---- Metamerism -------------------------------------------------------- */

static double index_of(const work *w, size_t i, size_t test_look) {
  const compare_scene *s = w->s;
  const sight *at = &w->sight[i];
  const ef_seen reference = {.standard = xyz_of(at->standard->xyz),
                             .sample = xyz_of(at->sample->xyz),
                             .conditions = s->looks.at[0].conditions};
  const ef_seen test = {.standard = xyz_of(at->standard->xyz + 3 * test_look),
                        .sample = xyz_of(at->sample->xyz + 3 * test_look),
                        .conditions = s->looks.at[test_look].conditions};
  return ef_metamerism_of_seen(s->metric, &reference, &test, s->correction)
      .index;
}

static void set_inconstancy(const work *w, size_t i, size_t k) {
  const compare_scene *s = w->s;
  const look *reference = &s->looks.at[0], *test = &s->looks.at[k];
  outcome *o = work_outcome(w, i, k);
  const outcome *r = work_outcome(w, i, 0);
  ef_error ignored; /* whites that cannot be adapted: left unknown */
  ef_inconstancy(s->metric, s->adaptation, r->standard, &reference->conditions,
                 o->standard, test->basis.white, &o->inconstancy_standard, NULL,
                 &ignored);
  ef_inconstancy(s->metric, s->adaptation, r->sample, &reference->conditions,
                 o->sample, test->basis.white, &o->inconstancy_sample, NULL,
                 &ignored);
}

static void set_indices(void *context, size_t begin, size_t end) {
  const work *w = context;
  const looks *l = &w->s->looks;
  for (size_t i = begin; i < end; ++i) {
    for (size_t k = 1; k < w->n_looks; ++k) {
      work_outcome(w, i, k)->metamerism = index_of(w, i, k);
      if (l->at[k].observer == l->at[0].observer)
        set_inconstancy(w, i, k);
    }
    w->other_observer[i] = l->has_other ? index_of(w, i, w->n_looks) : NONE;
  }
}

/* ---- Spectra ----------------------------------------------------------- */

/* Samples carried to the standards' wavelengths where theirs are others. */
static ef_status gather_spectra(work *w, ef_error *error) {
  const compare_scene *s = w->s;
  const ef_grid *grid = &finish_file_head(s->standard)->grid;
  const ef_grid *other =
      s->batch != NULL ? &finish_file_head(s->batch)->grid : grid;
  for (int side = 0; side < 2; ++side) {
    w->spectrum[side] =
        malloc((w->n * grid->count + 1) * sizeof *w->spectrum[side]);
    if (w->spectrum[side] == NULL)
      return message_fail(error, EF_NO_MEMORY, "out of memory for spectra");
  }
  ef_status status = EF_OK;
  for (size_t i = 0; i < w->n && status == EF_OK; ++i) {
    double *standard = w->spectrum[0] + i * grid->count;
    double *sample = w->spectrum[1] + i * grid->count;
    memcpy(standard, w->sight[i].standard->value, grid->count * sizeof(double));
    if (s->same_grid) {
      memcpy(sample, w->sight[i].sample->value, grid->count * sizeof(double));
    } else {
      status = ef_resample(other, 1, w->sight[i].sample->value, grid,
                           EF_INTERPOLATE_AUTO, EF_EXTEND_HOLD, sample, error);
    }
  }
  return status;
}

/* Of the first look, on the standards' wavelengths. */
static ef_weights *reference_weights(const work *w, ef_error *error) {
  const look *l = &w->s->looks.at[0];
  const ef_viewing viewing = ef_viewing_default(l->illuminant);
  return ef_observer_weights(l->observer, EF_TRISTIMULUS,
                             &finish_file_head(w->s->standard)->grid, &viewing,
                             NULL, error);
}

static ef_status set_spectral_correction(work *w, double *other_observer,
                                         ef_error *error) {
  const compare_scene *s = w->s;
  const size_t n_tests = w->n_looks - 1 + (s->looks.has_other ? 1 : 0);
  ef_look tests[LOOKS_MOST + 1];
  for (size_t k = 0; k <= n_tests; ++k) {
    tests[k] = (ef_look){s->looks.at[k].observer,
                         ef_viewing_default(s->looks.at[k].illuminant)};
  }
  ef_metamerism_settings settings = ef_metamerism_settings_default();
  settings.metric = s->metric;
  settings.correction = s->correction;
  settings.conditions = s->looks.at[0].conditions;
  ef_metamerism *found = malloc((w->n * n_tests + 1) * sizeof *found);
  if (found == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for indices");
  const ef_status status = ef_metamerism_batch(
      &finish_file_head(s->standard)->grid, w->n, w->spectrum[0],
      w->spectrum[1], &tests[0], n_tests, tests + 1, &settings,
      s->options->jobs, found, NULL, error);
  for (size_t i = 0; i < w->n && status == EF_OK; ++i) {
    for (size_t k = 1; k <= n_tests; ++k) {
      double *to = k < w->n_looks ? &work_outcome(w, i, k)->metamerism
                                  : &other_observer[i];
      *to = found[i * n_tests + k - 1].index;
    }
  }
  free(found);
  return status;
}

static ef_status set_spectral(work *w, ef_spectral_index *out,
                              double *other_observer, ef_error *error) {
  const compare_scene *s = w->s;
  for (size_t i = 0; i < w->n; ++i)
    out[i] = (ef_spectral_index){NONE, NONE, NONE};
  if (!s->has_spectra || w->n == 0)
    return EF_OK;
  ef_status status = gather_spectra(w, error);
  ef_weights *weights = status == EF_OK ? reference_weights(w, error) : NULL;
  if (weights == NULL)
    return error->status;
  /* Observers of two dimensions have no such index. */
  if (ef_observer_dimensions(s->looks.at[0].observer) == 3) {
    status = ef_spectral_index_batch(weights, w->n, w->spectrum[0],
                                     w->spectrum[1], out, error);
    if (status == EF_OK && s->correction == EF_CORRECT_SPECTRAL &&
        w->n_looks + (s->looks.has_other ? 1 : 0) > 1) {
      status = set_spectral_correction(w, other_observer, error);
    }
  }
  ef_weights_free(weights);
  return status;
}

/* ---- Pairs ------------------------------------------------------------- */

/* Over the angles of a finish, each with its weight. */
static ef_status combine(const compare_scene *s, compared *c, ef_angles *out,
                         ef_error *error) {
  const size_t n_looks = s->looks.n;
  double *difference = malloc(2 * c->n_angles * sizeof *difference);
  if (difference == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for angles");
  double *weight = difference + c->n_angles;
  for (size_t a = 0; a < c->n_angles; ++a) {
    weight[a] = 1.0;
    for (size_t i = 0; i < s->n_weights; ++i) {
      if (s->angle_deg[i] == c->angle_deg[a])
        weight[a] = s->weight[i];
    }
  }
  ef_status status = EF_OK;
  for (size_t k = 0; k < n_looks && status == EF_OK; ++k) {
    for (size_t a = 0; a < c->n_angles; ++a)
      difference[a] = c->outcome[a * n_looks + k].difference;
    status = ef_angles_combine(c->n_angles, difference, weight, &out[k], error);
  }
  if (status == EF_INVALID)
    message_option(error, "angle-weights", "");
  c->finish = out;
  free(difference);
  return status;
}

/* The worst outcomes, and what is to be said of those that are missing. */
static void find_worst(const compare_scene *s, compared *c) {
  const size_t n = c->n_angles * s->looks.n;
  double worst = -1.0, told = -1.0;
  size_t n_missing = 0;
  for (size_t i = 0; i < n; ++i) {
    const outcome *o = &c->outcome[i];
    if (isnan(o->difference))
      ++n_missing;
    if (o->difference > worst) {
      worst = o->difference;
      c->worst = i;
    }
    const double share = o->told.share_of_observers.value;
    if (share > told ||
        (share == told &&
         o->difference > c->outcome[c->worst_told].difference)) {
      told = share;
      c->worst_told = i;
    }
  }
  if (n_missing > 0 && c->reason[0] == '\0') {
    snprintf(c->reason, sizeof c->reason,
             "%s has no difference for these colours in %zu of %zu cases",
             ef_metric_title(s->metric), n_missing, n);
  }
  if (n > 0 && n_missing == n)
    c->n_angles = 0;
  if (told < 0.0)
    c->worst_told = c->worst;
}

/* What could not be computed is not within. */
static void set_verdict(const compare_scene *s, compared *c) {
  bool is_beyond = false, surely_within = true, surely_beyond = false;
  for (size_t i = 0; i < c->n_angles * s->looks.n; ++i) {
    const outcome *o = &c->outcome[i];
    const double reach = isnan(o->sd) ? 0.0 : z_975 * o->sd;
    is_beyond = is_beyond || o->difference > s->tolerance;
    surely_beyond = surely_beyond || o->difference - reach > s->tolerance;
    surely_within = surely_within && o->difference + reach <= s->tolerance;
  }
  c->beyond = is_beyond;
  c->within = !is_beyond && c->n_angles > 0 && c->reason[0] == '\0' &&
              !isnan(s->tolerance);
  c->is_certain = is_beyond ? surely_beyond : surely_within;
}

static ef_status finish_pairs(work *w, size_t n, judged *j, ef_error *error) {
  const compare_scene *s = w->s;
  size_t at = 0;
  ef_status status = EF_OK;
  for (size_t i = 0; i < n && status == EF_OK; ++i) {
    compared *c = &j->pair[i];
    c->outcome = j->outcome + at * w->n_looks;
    c->angle_deg = j->angle_deg + at;
    c->other_observer = j->other_observer + at;
    c->spectral = j->spectral + at;
    at += c->n_angles;
    if (c->n_angles > 1)
      status = combine(s, c, j->finish + i * w->n_looks, error);
    find_worst(s, c);
    set_verdict(s, c);
  }
  return status;
}

/* ---- All of it --------------------------------------------------------- */

static ef_status allocate(work *w, judged *j, size_t n, size_t most,
                          ef_error *error) {
  const size_t m = most + 1;
  *j = (judged){.pair = malloc(n * sizeof *j->pair),
                .outcome = malloc(m * w->n_looks * sizeof *j->outcome),
                .angle_deg = malloc(m * sizeof *j->angle_deg),
                .other_observer = malloc(m * sizeof *j->other_observer),
                .spectral = malloc(m * sizeof *j->spectral),
                .finish = malloc(n * w->n_looks * sizeof *j->finish)};
  w->outcome = j->outcome;
  w->sight = malloc(m * sizeof *w->sight);
  w->difference = malloc(m * sizeof *w->difference);
  bool has_memory = j->pair != NULL && j->outcome != NULL &&
                    j->angle_deg != NULL && j->other_observer != NULL &&
                    j->spectral != NULL && j->finish != NULL &&
                    w->sight != NULL && w->difference != NULL;
  for (int side = 0; side < 2; ++side) {
    w->xyz[side] = malloc(3 * m * sizeof *w->xyz[side]);
    w->at[side] = malloc(3 * m * sizeof *w->at[side]);
    has_memory = has_memory && w->xyz[side] != NULL && w->at[side] != NULL;
  }
  return has_memory
             ? EF_OK
             : message_fail(error, EF_NO_MEMORY, "out of memory for pairs");
}

static ef_status compare_sights(work *w, judged *j, ef_error *error) {
  const compare_scene *s = w->s;
  for (size_t k = 0; k < w->n_looks; ++k)
    set_differences(w, k);
  w->other_observer = j->other_observer;
  ef_parallel_for(w->n, PIECE, s->options->jobs, set_indices, w);
  ef_status status = set_spectral(w, j->spectral, j->other_observer, error);
  judge_nothing(w);
  if (status == EF_OK && s->jnd.is_known)
    status = judge_standard(w, error);
  if (status == EF_OK && s->people.population != NULL && w->n > 0)
    status = judge_people(w, error);
  return status;
}

ef_status judge_pairs(compare_scene *s, size_t n, const pair *pairs,
                      judged *out, ef_error *error) {
  work w = {.s = s, .pairs = pairs, .n_looks = s->looks.n};
  ef_status status = allocate(&w, out, n, most_sights(n, pairs), error);
  if (status == EF_OK) {
    find_sights(&w, n, pairs, out->pair);
    for (size_t i = 0; i < w.n; ++i)
      out->angle_deg[i] = w.sight[i].sample->angle_deg;
    status = compare_sights(&w, out, error);
  }
  if (status == EF_OK)
    status = finish_pairs(&w, n, out, error);
  work_free(&w);
  return status;
}

void judged_free(judged *j) {
  free(j->pair);
  free(j->outcome);
  free(j->angle_deg);
  free(j->other_observer);
  free(j->spectral);
  free(j->finish);
  *j = (judged){0};
}
