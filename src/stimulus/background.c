/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Background and modulation together. With the two extremes u and v of the
 * modulation as unknowns (background plus and minus the modulation, or, for a
 * pulse, its top and the background) the gamut is a plain box. A contrast t
 * along the direction asks of each receptor that changes
 *   E d = t c (e0 + E a),
 * which is linear in u and v for a given t. Whether t can be reached is a
 * linear programme, and what can be reached with t can be reached with less,
 * so halving the interval finds the largest. */
#include <math.h>
#include <string.h>

#include "base/base_private.h"
#include "stimulus/stimulus_private.h"

/* How background and modulation are made of u and v. */
typedef struct shape {
  double background[2], modulation[2];
} shape;

static shape shape_of(ef_modulation modulation) {
  if (modulation == EF_PULSE)
    return (shape){{0, 1}, {1, -1}};
  return (shape){{0.5, 0.5}, {0.5, -0.5}};
}

typedef struct question {
  const ef_stimulator *stimulator;
  const ef_isolate_settings *settings;
  shape form;
  size_t n_rows, n_columns;
  ef__simplex *simplex;
  ef__rows rows; /* independent receptors, at the reference */
  double reference[EF_N_RECEPTORS];  /* excitations by a background of the
                                        rule */
  double excitation[EF_N_RECEPTORS]; /* that the rule keeps for the cones */
} question;

/* ---- The programme for one t -------------------------------------------- */

/* E d - t c E a - s c reference = t c e0: with s = 0 the contrast is t. With
 * d = 0 and the reference as background s is -t, so that t can be reached
 * exactly when the largest s is not below 0. */
static void receptor_row(const question *q, size_t k, double t, double *row,
                         double *right) {
  const ef_stimulator *const stimulator = q->stimulator;
  const size_t n = stimulator->n, r = (size_t)q->rows.receptor[k];
  const double c = q->rows.target[k];
  for (size_t i = 0; i < n; ++i) {
    const double e = stimulator->matrix[r * n + i];
    for (size_t side = 0; side < 2; ++side) {
      row[side * n + i] =
          e * (q->form.modulation[side] - t * c * q->form.background[side]);
    }
  }
  row[2 * n] = -c * q->reference[r];
  *right = t * c * stimulator->dark[r];
}

static void cone_row(const question *q, size_t r, double *row, double *right) {
  const size_t n = q->stimulator->n;
  for (size_t i = 0; i < n; ++i) {
    for (size_t side = 0; side < 2; ++side) {
      row[side * n + i] =
          q->stimulator->matrix[r * n + i] * q->form.background[side];
    }
  }
  *right = q->excitation[r] - q->stimulator->dark[r];
}

/* What the background gives, less a slack, is the least that the rule allows;
 * returns how large the slack may be. `light` and `dark` are luminance or one
 * receptor's excitations. */
static double least_row(const question *q, const double *light, double dark,
                        size_t slack, double *row, double *right) {
  const size_t n = q->stimulator->n;
  double full = dark;
  for (size_t i = 0; i < n; ++i) {
    full += light[i];
    for (size_t side = 0; side < 2; ++side)
      row[side * n + i] = light[i] * q->form.background[side];
  }
  row[slack] = -1;
  const double least = q->settings->least_share * full;
  *right = least - dark;
  return full - least;
}

/* More than s can be, in either direction. */
static double most_s(const question *q, double t) {
  const size_t n = q->stimulator->n;
  double most = HUGE_VAL;
  for (size_t k = 0; k < q->rows.n; ++k) {
    const size_t r = (size_t)q->rows.receptor[k];
    const double c = fabs(q->rows.target[k]);
    double sum = q->stimulator->dark[r];
    for (size_t i = 0; i < n; ++i)
      sum += fabs(q->stimulator->matrix[r * n + i]);
    if (c > 0)
      most = fmin(most, (sum + t * c * sum) / (c * q->reference[r]));
  }
  return 1.5 * most;
}

/* Of a free background: rows from the m-th on. */
static void least_rows(const question *q, size_t m, ef__table *p) {
  const ef_stimulator *const stimulator = q->stimulator;
  const size_t n = stimulator->n, width = p->n_columns;
  size_t slack = 2 * n + 1;
  p->high[slack] = least_row(q, stimulator->y, stimulator->dark_y, slack,
                             p->row + m * width, &p->right[m]);
  for (size_t k = 0; k < q->rows.n; ++k) {
    const size_t r = (size_t)q->rows.receptor[k];
    if (q->rows.target[k] == 0)
      continue;
    ++slack;
    ++m;
    p->high[slack] =
        least_row(q, stimulator->matrix + r * n, stimulator->dark[r], slack,
                  p->row + m * width, &p->right[m]);
  }
}

/* Rows and limits for one t, without a gain: u, v, s, slacks. */
static void fill_table(const question *q, double t, ef__table *p) {
  const size_t n = q->stimulator->n, width = q->n_columns;
  *p = (ef__table){.n_rows = q->n_rows, .n_columns = width};
  for (size_t j = 0; j < 2 * n; ++j)
    p->high[j] = 1;
  size_t m = 0;
  for (; m < q->rows.n; ++m)
    receptor_row(q, m, t, p->row + m * width, &p->right[m]);
  if (q->settings->background_rule == EF_BACKGROUND_FREE) {
    least_rows(q, m, p);
    return;
  }
  for (size_t r = 0; r < 3; ++r, ++m)
    cone_row(q, r, p->row + m * width, &p->right[m]);
}

/* Size of the tables. */
static void count(question *q) {
  const size_t n = q->stimulator->n;
  q->n_rows = q->rows.n + 3;
  q->n_columns = 2 * n + 1;
  if (q->settings->background_rule != EF_BACKGROUND_FREE)
    return;
  size_t n_changed = 0;
  for (size_t k = 0; k < q->rows.n; ++k)
    n_changed += q->rows.target[k] != 0;
  q->n_rows = q->rows.n + 1 + n_changed;
  q->n_columns = 2 * n + 2 + n_changed;
}

/* True when the contrast t can be reached. */
static bool reaches(const question *q, double t) {
  const size_t s = 2 * q->stimulator->n;
  ef__table p;
  double x[EF__TABLE_COLUMNS], value;
  fill_table(q, t, &p);
  p.high[s] = most_s(q, t);
  p.low[s] = -p.high[s];
  p.gain[s] = 1;
  return ef__table_solve_next(&p, q->simplex, x, &value) == EF__SIMPLEX_BEST &&
         value >= 0;
}

/* The middle of the backgrounds that reach t: the mean of those with most and
 * with least of each unknown. A corner would stand at limits, and with them the
 * modulation would have to be just the one found here. */
static bool take_background(const question *q, double t, double *background) {
  const size_t n = q->stimulator->n, n_ends = 4 * n;
  ef__table p;
  double x[EF__TABLE_COLUMNS], value;
  fill_table(q, t, &p);
  for (size_t i = 0; i < n; ++i)
    background[i] = 0;
  for (size_t k = 0; k < n_ends; ++k) {
    p.gain[k / 2] = k % 2 == 0 ? 1 : -1;
    if (ef__table_solve_next(&p, q->simplex, x, &value) != EF__SIMPLEX_BEST)
      return false;
    p.gain[k / 2] = 0;
    for (size_t i = 0; i < n; ++i) {
      background[i] +=
          (q->form.background[0] * x[i] + q->form.background[1] * x[n + i]) /
          (double)n_ends;
    }
  }
  for (size_t i = 0; i < n; ++i)
    background[i] = fmin(fmax(background[i], 0), 1);
  return true;
}

/* ---- The largest t ------------------------------------------------------ */

static ef_status find_largest(const question *q, double *background,
                              ef_error *error) {
  const double below = 1e-6; /* of the largest: room for a background */
  double size = 0;           /* contrast of one unit along the direction */
  for (size_t k = 0; k < q->rows.n; ++k)
    size = fmax(size, fabs(q->rows.target[k]));
  double low = 0, high = 1 / size;
  if (!reaches(q, 0)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "no background keeps the rule and leaves the silent "
                         "receptors alone");
  }
  /* Least shares and given cones bound it. */
  for (int k = 0; k < 100 && reaches(q, high); ++k) {
    low = high;
    high *= 2;
  }
  while (high - low > 1e-9 * high && high * size > 1e-12) {
    const double middle = low + (high - low) / 2;
    if (reaches(q, middle)) {
      low = middle;
    } else {
      high = middle;
    }
  }
  if (take_background(q, low * (1 - below), background))
    return EF_OK;
  return ef__error_set(error, EF_NO_ANSWER,
                       "the best background was not found: the receptors are "
                       "hardly separable (condition number %.3g)",
                       q->rows.condition_number);
}

/* One pass: the direction as it is at `at`. */
static ef_status choose_once(question *q,
                             const ef_receptor_role role[EF_N_RECEPTORS],
                             const double contrast[EF_N_RECEPTORS],
                             const double *at, double *background,
                             ef_error *error) {
  ef_status status =
      ef__rows_make(q->stimulator, role, contrast, at, &q->rows, error);
  if (status != EF_OK)
    return status;
  count(q);
  q->simplex = ef__simplex_new(q->n_rows, q->n_columns);
  if (q->simplex == NULL)
    return ef__error_memory(error, "a background");
  status = find_largest(q, background, error);
  ef__simplex_free(q->simplex);
  return status;
}

static bool agree(const double *a, const double *b) {
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    if (!(fabs(a[r] - b[r]) <= 1e-12))
      return false;
  }
  return true;
}

ef_status ef__background_choose(const ef_stimulator *stimulator,
                                const ef_direction *direction,
                                const ef_isolate_settings *settings,
                                double background[EF_MAX_DRIVES],
                                ef_error *error) {
  enum { MOST_PASSES = 30 };
  const bool is_free = settings->background_rule == EF_BACKGROUND_FREE;
  question q = {.stimulator = stimulator,
                .settings = settings,
                .form = shape_of(settings->modulation)};
  for (size_t i = 0; i < stimulator->n && is_free; ++i)
    background[i] = 1;
  ef_stimulator_excitations(stimulator, background, q.reference);
  memcpy(q.excitation, q.reference, sizeof q.excitation);
  double at[EF_N_RECEPTORS], contrast[EF_N_RECEPTORS] = {0};
  double last[EF_N_RECEPTORS];
  ef_receptor_role role[EF_N_RECEPTORS];
  memcpy(at, q.reference, sizeof at);
  ef_status status = EF_OK;
  for (int pass = 0; pass < MOST_PASSES && status == EF_OK; ++pass) {
    memcpy(last, contrast, sizeof last);
    status =
        ef_direction_resolve(stimulator, direction, at, role, contrast, error);
    if (status != EF_OK || (pass > 0 && agree(last, contrast)))
      break;
    status = choose_once(&q, role, contrast, at, background, error);
    ef_stimulator_excitations(stimulator, background, at);
  }
  return status;
}
