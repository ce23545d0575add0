/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_settings.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "message.h"

static bool has_blanks(const answers *a) {
  bool has_zero = false, has_negative = false;
  for (size_t i = 0; i < a->n; ++i) {
    has_zero = has_zero || a->level[i] == 0.0;
    has_negative = has_negative || a->level[i] < 0.0;
  }
  return has_zero && !has_negative;
}

ef_shape panel_shape_for(const command_options *options, ef_task task,
                         bool has_blanks_too) {
  if (options->model >= 0)
    return (ef_shape)options->model;
  switch (task) {
  case EF_TASK_2IFC:
  case EF_TASK_TRIANGLE:
    return EF_SHAPE_WEIBULL;
  case EF_TASK_YES_NO:
  case EF_TASK_SAME_DIFFERENT:
    return has_blanks_too ? EF_SHAPE_DETECTION : EF_SHAPE_GAUSSIAN;
  default:
    return EF_SHAPE_GAUSSIAN;
  }
}

ef_shape panel_shape(const command_options *options, const answers *a) {
  return panel_shape_for(options, a->task, has_blanks(a));
}

ef_axis panel_axis(const command_options *options, ef_shape shape) {
  return options->axis < 0 ? ef_shape_axis(shape) : (ef_axis)options->axis;
}

ef_status panel_check_levels(const answers *a, ef_axis axis, ef_error *error) {
  for (size_t i = 0; i < a->n && axis == EF_AXIS_LOG; ++i) {
    if (!(a->level[i] < 0.0))
      continue;
    message_fail(error, EF_MALFORMED,
                 "level is %g, and a logarithmic axis has no place below 0: "
                 "give the size of the difference, or use --model gaussian",
                 a->level[i]);
    error->line = a->line[i];
    snprintf(error->field, sizeof error->field, "level");
    return message_place(error, a->file);
  }
  return EF_OK;
}

/* "75%" or "0.75". */
static bool parse_share(const char *typed, double *share) {
  const size_t length = strlen(typed);
  const bool is_percent = length > 0 && typed[length - 1] == '%';
  if (!ef_number_parse(typed, length - (is_percent ? 1 : 0), '.', share))
    return false;
  if (is_percent)
    *share /= 100.0;
  return *share > 0.0 && *share < 1.0;
}

ef_status panel_criterion(const command_options *options, ef_task task,
                          double *criterion, ef_error *error) {
  static const char d_prime[] = "d-prime:";
  const size_t n = sizeof d_prime - 1;
  const char *typed = options->criterion;
  *criterion = (double)NAN;
  if (typed == NULL || parse_share(typed, criterion))
    return EF_OK;
  double value;
  const bool is_d_prime = strncmp(typed, d_prime, n) == 0 &&
                          ef_number_parse(typed + n, strlen(typed + n), '.',
                                          &value) &&
                          value > 0.0;
  if (!is_d_prime) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--criterion is a share of answers such as 75%% or "
                        "0.75, or d-prime:1, not \"%.100s\"",
                        typed);
  }
  if (isnan(ef_task_chance(task))) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--criterion d-prime is for tasks without false "
                        "alarms; %s: use --model detection, which takes d' of "
                        "1",
                        ef_task_name(task));
  }
  *criterion = ef_task_proportion(task, (double)NAN, value);
  return EF_OK;
}

ef_interval_settings panel_intervals(const command_options *options) {
  const command_options *o = options;
  ef_interval_settings s = ef_interval_settings_default();
  s.method = o->intervals == 1 ? EF_INTERVAL_BOOTSTRAP : EF_INTERVAL_PROFILE;
  if (!isnan(o->samples))
    s.n_samples = (size_t)o->samples;
  if (!isnan(o->seed))
    s.seed = (uint64_t)o->seed;
  s.jobs = o->jobs;
  return s;
}
