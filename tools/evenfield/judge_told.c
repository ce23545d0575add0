/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Who tells pairs apart: observers who differ in their JND, and people who also
 * differ in what they see. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "judge_work.h"
#include "message.h"

#define NONE ((double)NAN)

/* Uncertainties below this share of the difference reach the answer by its
 * slope: what that neglects is of the order of its square. */
static const double small_uncertainty = 0.05;

/* Differences that people see: so many at a time. */
enum { MOST_SEEN = 1 << 22 };

/* ---- Told apart -------------------------------------------------------- */

static bool is_small(const compare_scene *s, const outcome *o) {
  const double batch_sd =
      isnan(s->options->batch_sd) ? 0.0 : s->options->batch_sd;
  const double sd = hypot(isnan(o->sd) ? 0.0 : o->sd, batch_sd);
  const ef_jnd_record *r = &s->jnd.record;
  const double of_jnd = isnan(r->low) ? 0.0 : 0.5 * log(r->high / r->low);
  return sd <= small_uncertainty * o->difference &&
         of_jnd <= 2.0 * small_uncertainty;
}

/* Pairs whose answers are found in one way, gathered and put back. */
typedef struct told_group {
  size_t n, n_observers;
  size_t *place; /* outcomes */
  double *difference, *measurement_sd, *batch_sd;
  ef_told_apart *told;
} told_group;

static void group_free(told_group *g) {
  free(g->place);
  free(g->difference);
  free(g->measurement_sd);
  free(g->batch_sd);
  free(g->told);
}

static ef_status group_new(told_group *g, size_t most, size_t n_observers,
                           ef_error *error) {
  const size_t n = most + 1;
  *g = (told_group){.n_observers = n_observers,
                    .place = malloc(n * sizeof *g->place),
                    .difference =
                        malloc(n * n_observers * sizeof *g->difference),
                    .measurement_sd = malloc(n * sizeof *g->measurement_sd),
                    .batch_sd = malloc(n * sizeof *g->batch_sd),
                    .told = malloc(n * sizeof *g->told)};
  if (g->place != NULL && g->difference != NULL && g->measurement_sd != NULL &&
      g->batch_sd != NULL && g->told != NULL) {
    return EF_OK;
  }
  return message_fail(error, EF_NO_MEMORY, "out of memory for answers");
}

/* Its differences are in place already. */
static void group_add(told_group *g, const work *w, size_t place) {
  const double sd = w->outcome[place].sd;
  const double batch_sd = w->s->options->batch_sd;
  g->place[g->n] = place;
  g->measurement_sd[g->n] = isnan(sd) ? 0.0 : sd;
  g->batch_sd[g->n] = isnan(batch_sd) ? 0.0 : batch_sd;
  ++g->n;
}

static ef_teller *teller_of(compare_scene *s, ef_propagation propagation,
                            ef_error *error) {
  ef_teller **teller = &s->teller[propagation];
  if (*teller != NULL)
    return *teller;
  ef_told_apart_settings settings = s->told;
  settings.propagation = propagation;
  *teller = ef_teller_new(&s->jnd.record, &settings, error);
  return *teller;
}

static ef_status group_tell(told_group *g, const work *w,
                            ef_propagation propagation, ef_error *error) {
  const compare_scene *s = w->s;
  if (g->n == 0)
    return EF_OK;
  ef_teller *teller = teller_of(w->s, propagation, error);
  if (teller == NULL)
    return error->status;
  const ef_judged asked = {.difference = g->difference,
                           .n_observers = g->n_observers,
                           .measurement_sd = g->measurement_sd,
                           .batch_sd = g->batch_sd};
  const ef_status status =
      ef_teller_tell(teller, g->n, &asked, s->options->jobs, g->told, error);
  for (size_t i = 0; i < g->n && status == EF_OK; ++i)
    w->outcome[g->place[i]].told = g->told[i];
  g->n = 0;
  return status;
}

static ef_propagation propagation_of(const compare_scene *s, const outcome *o) {
  const bool by_slope = s->told.propagation == EF_PROPAGATE_FIRST_ORDER ||
                        (!s->always_draws && is_small(s, o));
  return by_slope ? EF_PROPAGATE_FIRST_ORDER : EF_PROPAGATE_MONTE_CARLO;
}

ef_status judge_standard(work *w, ef_error *error) {
  const size_t n = w->n * w->n_looks;
  ef_status status = EF_OK;
  for (int way = 0; way < 2 && status == EF_OK; ++way) {
    told_group g;
    status = group_new(&g, n, 1, error);
    for (size_t i = 0; i < n && status == EF_OK; ++i) {
      if ((int)propagation_of(w->s, &w->outcome[i]) != way)
        continue;
      g.difference[g.n] = w->outcome[i].difference;
      group_add(&g, w, i);
    }
    if (status == EF_OK)
      status = group_tell(&g, w, (ef_propagation)way, error);
    group_free(&g);
  }
  return status;
}

/* What nobody is asked about. */
void judge_nothing(work *w) {
  const ef_estimate none = {NONE, NONE, NONE, NONE};
  for (size_t i = 0; i < w->n * w->n_looks; ++i) {
    w->outcome[i].told =
        (ef_told_apart){none, none, none, none, none, none, NONE, NONE, NONE};
  }
}

/* ---- People ------------------------------------------------------------ */

/* For a chart: where they see sight `i` under one light. */
static ef_status keep_cloud(const work *w, size_t under, size_t i,
                            const ef_spread *spread, ef_error *error) {
  const compare_scene *s = w->s;
  const pair *of = &w->pairs[w->sight[i].pair];
  const size_t width = finish_file_head(s->standard)->grid.count;
  if (s->clouds == NULL)
    return EF_OK;
  cloud_pair kept = {.id = of->line,
                     .p95 = spread->p95,
                     .named = {NONE, NONE}};
  snprintf(kept.name, sizeof kept.name, "%.50s, %.50s, people",
           of->sample_name, ef_illuminant_name(s->looks.at[under].illuminant));
  return clouds_offer(s->clouds, s->crowd[under],
                      ef_population_count(s->people.population), &kept,
                      w->spectrum[0] + i * width, w->spectrum[1] + i * width,
                      s->options->jobs, error);
}

/* The sights first .. first + n under one light, as the people see them. */
static ef_status see(work *w, size_t under, size_t first, size_t n,
                     told_group *g, ef_spread *spread, ef_error *error) {
  const compare_scene *s = w->s;
  const size_t width = finish_file_head(s->standard)->grid.count;
  ef_status status =
      ef_crowd_spread(s->crowd[under], n, w->spectrum[0] + first * width,
                      w->spectrum[1] + first * width, s->options->jobs, spread,
                      g->difference, error);
  for (size_t i = 0; i < n && status == EF_OK; ++i) {
    outcome *o = work_outcome(w, first + i, under);
    o->population_mean = spread[i].mean;
    o->population_p95 = spread[i].p95;
    group_add(g, w, (first + i) * w->n_looks + under);
    status = keep_cloud(w, under, first + i, &spread[i], error);
  }
  if (status != EF_OK || !s->jnd.is_known)
    return status;
  return group_tell(g, w, s->told.propagation, error);
}

/* The people stand in the place of the first observer. */
ef_status judge_people(work *w, ef_error *error) {
  const compare_scene *s = w->s;
  const size_t n_people = ef_population_count(s->people.population);
  size_t at_once = MOST_SEEN / n_people;
  at_once = at_once < 1 ? 1 : at_once > w->n ? w->n : at_once;
  told_group g;
  ef_spread *spread = malloc((at_once + 1) * sizeof *spread);
  ef_status status = group_new(&g, at_once, n_people, error);
  if (status == EF_OK && spread == NULL)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for people");
  for (size_t k = 0; k < w->n_looks && status == EF_OK; ++k) {
    if (s->crowd[k] == NULL)
      continue;
    for (size_t i = 0; i < w->n && status == EF_OK; i += at_once) {
      const size_t left = w->n - i;
      status = see(w, k, i, left < at_once ? left : at_once, &g, spread, error);
      g.n = 0;
    }
  }
  free(spread);
  group_free(&g);
  return status;
}
