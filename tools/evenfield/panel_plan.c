/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_plan.h"

#include <math.h>
#include <string.h>

#include "message.h"

/* Trials of one observer: an hour's sitting has some 300. */
static const size_t sizes[PLAN_SIZES] = {40, 80, 120, 160, 320};

/* Choosing levels takes a sum over a grid for each answer: a search over
 * thousands of trials would take minutes. */
enum { MOST_ALONE = 10000, EXPERIMENTS = 400 };

/* ---- Settings ---------------------------------------------------------- */

static ef_status read_levels(const command_options *o, ef_plan_settings *s,
                             ef_error *error) {
  double value;
  if (o->levels == NULL)
    return EF_OK;
  if (!ef_number_parse(o->levels, strlen(o->levels), '.', &value) ||
      value != floor(value) || value < 2 || value > PLAN_MOST_LEVELS) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--levels of `panel plan` is how many levels are "
                        "shown, 2 to %d, not \"%.100s\"",
                        PLAN_MOST_LEVELS, o->levels);
  }
  s->n_levels = (size_t)value;
  return EF_OK;
}

static ef_status set_settings(panel_plan *p, ef_error *error) {
  const command_options *o = p->options;
  ef_task task;
  if (ef_task_find(o->task != NULL ? o->task : "2ifc", &task, error) != EF_OK)
    return message_option(error, "task", "");
  p->settings = ef_plan_settings_default(task, o->expected_jnd);
  ef_plan_settings *s = &p->settings;
  p->precision = isnan(o->precision) ? 0.1 : o->precision;
  s->n_experiments = isnan(o->samples) ? EXPERIMENTS : (size_t)o->samples;
  s->other_jnd = o->other_jnd;
  if (!isnan(o->seed))
    s->seed = (uint64_t)o->seed;
  if (!isnan(o->spread))
    s->spread = o->spread;
  if (!isnan(o->lapse))
    s->lapse = o->lapse;
  if (!isnan(o->false_alarms))
    s->false_alarms = o->false_alarms;
  s->jobs = o->jobs;
  return read_levels(o, s, error);
}

/* ---- Simulating -------------------------------------------------------- */

static ef_status try_size(panel_plan *p, size_t k, size_t i, ef_error *error) {
  const ef_plan_settings *s = &p->settings;
  plan_choice *c = &p->choice[k][i];
  const ef_status status =
      ef_plan_simulate(s, p->procedure[k], sizes[i], &c->row, error);
  if (status != EF_OK)
    return status;
  /* Above that a group of observers would have holes. */
  c->is_sound = (double)c->row.n_failed <= 0.05 * (double)c->row.n_experiments;
  /* What is off for everybody leaves less room for chance: squares add. */
  const double wanted = log1p(p->precision), off = log(c->row.median);
  c->n_observers =
      isfinite(c->row.sd_ln) && fabs(off) < wanted
          ? ef_plan_observers(s->spread, c->row.sd_ln,
                              expm1(sqrt(wanted * wanted - off * off)))
          : 0;
  c->group_power = (double)NAN;
  if (!isnan(s->other_jnd) && c->n_observers > 0) {
    c->group_power = ef_plan_power(s->spread, c->row.sd_ln, c->n_observers,
                                   s->other_jnd / s->jnd);
  }
  return EF_OK;
}

static void choose(panel_plan *p, size_t k) {
  size_t least = 0;
  p->best[k] = -1;
  for (size_t i = 0; i < PLAN_SIZES; ++i) {
    const plan_choice *c = &p->choice[k][i];
    const size_t n = c->n_observers * c->row.n_trials;
    if (n == 0 || !c->is_sound || (p->best[k] >= 0 && n >= least))
      continue;
    p->best[k] = (int)i;
    least = n;
  }
}

static ef_status search_alone(panel_plan *p, size_t k, ef_error *error) {
  ef_plan_row row;
  p->alone[k] = 0;
  if (p->procedure[k] == EF_PROCEDURE_ADAPTIVE)
    return EF_OK;
  ef_error reason;
  const ef_status status = ef_plan_search(
      &p->settings, p->procedure[k], p->precision, MOST_ALONE, &row, &reason);
  if (status == EF_OK)
    p->alone[k] = row.n_trials;
  else if (status != EF_NO_ANSWER)
    *error = reason;
  return status == EF_NO_ANSWER ? EF_OK : status;
}

ef_status panel_plan_make(panel_plan *p, const command_options *options,
                          ef_error *error) {
  *p = (panel_plan){.options = options};
  ef_status status = set_settings(p, error);
  if (status != EF_OK)
    return status;
  const ef_task task = p->settings.task;
  p->procedure[p->n_procedures++] = EF_PROCEDURE_CONSTANT;
  if (task == EF_TASK_2IFC || task == EF_TASK_TRIANGLE)
    p->procedure[p->n_procedures++] = EF_PROCEDURE_UP_DOWN;
  p->procedure[p->n_procedures++] = EF_PROCEDURE_ADAPTIVE;
  bool has_any = false;
  for (size_t k = 0; k < p->n_procedures; ++k) {
    for (size_t i = 0; i < PLAN_SIZES && status == EF_OK; ++i)
      status = try_size(p, k, i, error);
    if (status == EF_OK)
      status = search_alone(p, k, error);
    if (status != EF_OK) {
      if (status == EF_INVALID)
        error->status = EF_UNKNOWN_NAME; /* options that do not go together */
      return error->status;
    }
    choose(p, k);
    has_any = has_any || p->best[k] >= 0;
  }
  p->n_levels = p->settings.n_levels;
  ef_plan_levels(&p->settings, p->n_levels, p->level);
  if (has_any)
    return EF_OK;
  return message_fail(error, EF_NO_ANSWER,
                      "no panel of up to 100000 observers gives a precision of "
                      "%g: allow a larger --precision",
                      p->precision);
}
