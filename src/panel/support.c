/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the answers can carry: a threshold, or the reason why not. */
#include "panel/panel_private.h"

#include <math.h>

/* Twice the gain in log likelihood at 5 %, one degree of freedom. */
#define CHI_SQUARE_95 3.8414588206941259584

/* Shares of positive answers that the asymptotes allow. */
typedef struct limits {
  double low_least, low_most, high_least, high_most;
} limits;

static limits limits_of(const ef__likelihood *likelihood) {
  const ef__model *const model = &likelihood->model;
  const double lapse_low = likelihood->low[EF__LAPSE];
  const double lapse_high = likelihood->high[EF__LAPSE];
  if (model->lapses_both_ways)
    return (limits){lapse_low, lapse_high, 1 - lapse_high, 1 - lapse_low};
  const double a = ef__model_guess_rate(model, likelihood->low[EF__GUESS]);
  const double b = ef__model_guess_rate(model, likelihood->high[EF__GUESS]);
  return (limits){fmin(a, b), fmax(a, b), 1 - lapse_high, 1 - lapse_low};
}

static double inside(double value, double low, double high) {
  return fmin(fmax(value, low), high);
}

/* Half the deviance of rows [from, to) at one share. */
static double rows_at(const ef__data *data, size_t from, size_t to,
                      double share) {
  double value = 0;
  for (size_t i = from; i < to; ++i) {
    const double n = data->shown[i], k = data->positive[i];
    value += ef__likelihood_part(k, n, share) +
             ef__likelihood_part(n - k, n, 1 - share);
  }
  return value;
}

static double pooled(const ef__data *data, size_t from, size_t to) {
  double n = 0, k = 0;
  for (size_t i = from; i < to; ++i) {
    n += data->shown[i];
    k += data->positive[i];
  }
  return n > 0 ? k / n : 0;
}

static size_t first_row(const ef__data *data) {
  return data->has_blank ? 1 : 0;
}

ef__verdict ef__support_before(const ef__likelihood *likelihood) {
  const ef__data *const data = likelihood->data;
  const size_t from = first_row(data), n = data->n - from;
  const size_t wanted = ef__is_estimated(likelihood, EF__SLOPE) ? 2 : 1;
  ef__verdict verdict = {EF_SUPPORT_FULL, 0, 0};
  if (n < wanted || data->n < ef__parameter_count(likelihood)) {
    verdict.support = EF_SUPPORT_FEW_LEVELS;
    return verdict;
  }
  const double share = pooled(data, from, data->n);
  if (share >= 1)
    verdict.support = EF_SUPPORT_ALL_POSITIVE;
  else if (share <= 0)
    verdict.support = EF_SUPPORT_NONE_POSITIVE;
  return verdict;
}

/* The best fit without a threshold: one share for all levels; with the width
 * given, all levels on one of the asymptotes. */
static double flat_value(const ef__likelihood *likelihood) {
  const ef__data *const data = likelihood->data;
  const limits l = limits_of(likelihood);
  const size_t from = first_row(data);
  const double blanks = rows_at(
      data, 0, from, inside(pooled(data, 0, from), l.low_least, l.low_most));
  const double share = pooled(data, from, data->n);
  if (ef__is_estimated(likelihood, EF__SLOPE)) {
    return blanks + rows_at(data, from, data->n,
                            inside(share, l.low_least, l.high_most));
  }
  const double low = inside(pooled(data, 0, data->n), l.low_least, l.low_most);
  const double high = inside(share, l.high_least, l.high_most);
  return fmin(rows_at(data, 0, data->n, low),
              blanks + rows_at(data, from, data->n, high));
}

/* Asymptotes of the largest likelihood for rows [0, below) and [above, n). */
static void step_asymptotes(const ef__likelihood *likelihood, size_t below,
                            size_t above, double *low, double *high) {
  const ef__data *const data = likelihood->data;
  const limits l = limits_of(likelihood);
  *high = l.high_most;
  if (!likelihood->model.lapses_both_ways) {
    *low = inside(pooled(data, 0, below), l.low_least, l.low_most);
    if (above < data->n)
      *high = inside(pooled(data, above, data->n), l.high_least, l.high_most);
    return;
  }
  double n = 0, lapses = 0;
  for (size_t i = 0; i < below; ++i) {
    n += data->shown[i];
    lapses += data->positive[i];
  }
  for (size_t i = above; i < data->n; ++i) {
    n += data->shown[i];
    lapses += data->shown[i] - data->positive[i];
  }
  *low = inside(n > 0 ? lapses / n : 0, l.low_least, l.low_most);
  *high = 1 - *low;
}

/* Half the deviance of infinite slope: rows below `cut` on the lower asymptote,
 * the others on the upper one, but for row `cut` when it `stands_between`. */
static double step_value(const ef__likelihood *likelihood, size_t cut,
                         bool stands_between) {
  const ef__data *const data = likelihood->data;
  const size_t above = stands_between ? cut + 1 : cut;
  double low, high;
  step_asymptotes(likelihood, cut, above, &low, &high);
  const double own = inside(pooled(data, cut, above), low, high);
  return rows_at(data, 0, cut, low) + rows_at(data, cut, above, own) +
         rows_at(data, above, data->n, high);
}

/* The best step, those between two rows first. */
static double best_step(const ef__likelihood *likelihood,
                        ef__verdict *verdict) {
  const size_t from = first_row(likelihood->data);
  const size_t n = likelihood->data->n;
  double least = (double)INFINITY;
  for (size_t cut = from + 1; cut < n; ++cut) {
    const double value = step_value(likelihood, cut, false);
    if (value >= least)
      continue;
    least = value;
    verdict->row_low = cut - 1;
    verdict->row_high = cut;
  }
  for (size_t cut = from; cut < n; ++cut) {
    const double value = step_value(likelihood, cut, true);
    if (value >= least)
      continue;
    least = value;
    verdict->row_low = verdict->row_high = cut;
  }
  return least;
}

/* Below -1.96 the answers fall with the level: score test of no slope. */
static double trend(const ef__data *data) {
  const size_t from = first_row(data);
  const double share = pooled(data, from, data->n);
  double score = 0, square = 0;
  for (size_t i = from; i < data->n; ++i) {
    score += data->t[i] * (data->positive[i] - data->shown[i] * share);
    square += data->shown[i] * data->t[i] * data->t[i];
  }
  return score / sqrt(share * (1 - share) * square);
}

ef__verdict ef__support_after(const ef__likelihood *likelihood,
                              const ef__minimum *fit) {
  const ef__data *const data = likelihood->data;
  ef__verdict verdict = {EF_SUPPORT_FULL, 0, 0};
  if (2 * (flat_value(likelihood) - fit->value) < CHI_SQUARE_95) {
    verdict.support =
        ef__is_estimated(likelihood, EF__SLOPE) && trend(data) < -1.96
            ? EF_SUPPORT_FALLING
            : EF_SUPPORT_FLAT;
    return verdict;
  }
  if (!ef__is_estimated(likelihood, EF__SLOPE)) {
    verdict.support = fit->converged ? EF_SUPPORT_FULL : EF_SUPPORT_STALLED;
    return verdict;
  }
  const double least = best_step(likelihood, &verdict);
  /* The slope of the search is bounded, so it comes near the step and no
   * nearer; a maximum at a finite slope lies clearly below. */
  if (fit->value > least - 1e-6)
    verdict.support = EF_SUPPORT_STEP;
  else
    verdict.support = fit->converged ? EF_SUPPORT_FULL : EF_SUPPORT_STALLED;
  return verdict;
}

double ef__row_level(const ef__data *data, ef_axis axis, size_t row) {
  if (data->level != NULL)
    return data->level[row];
  return ef__axis_level(axis, data->centre + data->scale * data->t[row]);
}

static ef_status few_levels(const ef__likelihood *likelihood, ef_error *error) {
  const ef__data *const data = likelihood->data;
  const size_t n = data->n - first_row(data);
  const size_t wanted = ef__parameter_count(likelihood);
  if (n < 2) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "%zu level%s%s: a curve needs at least two different "
                         "levels",
                         n, n == 1 ? "" : "s",
                         data->has_blank ? " besides the blanks" : "");
  }
  return ef__error_set(error, EF_NO_ANSWER,
                       "%zu levels cannot carry %zu parameters: show more "
                       "levels, or fix the lapse rate",
                       data->n, wanted);
}

ef_status ef__support_error(const ef__likelihood *likelihood,
                            const ef_fit_settings *settings,
                            const ef__verdict *verdict, ef_error *error) {
  const ef__data *const data = likelihood->data;
  const size_t from = first_row(data);
  const char *const positive = ef_task_positive(settings->task);
  double n = 0, k = 0;
  for (size_t i = from; i < data->n; ++i) {
    n += data->shown[i];
    k += data->positive[i];
  }
  switch (verdict->support) {
  case EF_SUPPORT_FULL:
  case EF_SUPPORT_STEP:
    return EF_OK;
  case EF_SUPPORT_FEW_LEVELS:
    return few_levels(likelihood, error);
  case EF_SUPPORT_ALL_POSITIVE:
    return ef__error_set(error, EF_NO_ANSWER,
                         "all %.0f answers are \"%s\": the threshold lies "
                         "below the lowest level, %g; show lower levels",
                         n, positive,
                         ef__row_level(data, settings->axis, from));
  case EF_SUPPORT_NONE_POSITIVE:
    return ef__error_set(error, EF_NO_ANSWER,
                         "none of %.0f answers is \"%s\": the threshold lies "
                         "above the highest level, %g; show higher levels",
                         n, positive,
                         ef__row_level(data, settings->axis, data->n - 1));
  case EF_SUPPORT_FLAT:
    return ef__error_set(error, EF_NO_ANSWER,
                         "the answers do not depend on the level: %.0f of %.0f "
                         "are \"%s\", and one share for all levels fits as "
                         "well; show levels on both sides of the threshold, "
                         "and more trials",
                         k, n, positive);
  case EF_SUPPORT_FALLING:
    return ef__error_set(error, EF_NO_ANSWER,
                         "fewer answers are \"%s\" at higher levels, where "
                         "more are expected: check the sign of the levels and "
                         "which answer is counted",
                         positive);
  case EF_SUPPORT_STALLED:
    break;
  }
  return ef__error_set(error, EF_NO_ANSWER,
                       "the search for the largest likelihood did not end: fix "
                       "the lapse rate, or show more levels");
}
