/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Posterior over threshold, width and lapse rate on a grid. */
#include "panel/panel_private.h"

#include <math.h>
#include <string.h>

static double even(double low, double high, size_t n, size_t i) {
  return n > 1 ? low + (high - low) * (double)i / (double)(n - 1)
               : 0.5 * (low + high);
}

ef_status ef__posterior_new(ef__posterior *out, size_t n_levels,
                            const double threshold[2], const double width[2],
                            double lapse_max, void **block, ef_error *error) {
  ef__grid *const g = &out->grid;
  size_t n_pairs, n_table;
  *block = NULL;
  const bool fits = ef__size_multiply(g->n_thresholds, g->n_widths, &n_pairs) &&
                    ef__size_multiply(n_pairs, g->n_lapses, &out->n_places) &&
                    ef__size_multiply(out->n_places, n_levels, &n_table);
  if (!fits)
    return ef__error_memory(error, "the grid");
  const size_t size = sizeof(double);
  const ef__part part[] = {
      {&g->threshold, g->n_thresholds, size},
      {&g->width, g->n_widths, size},
      {&g->lapse, g->n_lapses, size},
      {&out->weight, out->n_places, size},
      {&out->share, n_table, size},
  };
  *block = ef__allocate_block(sizeof part / sizeof part[0], part);
  if (*block == NULL)
    return ef__error_memory(error, "the grid");
  out->n_levels = n_levels;
  for (size_t i = 0; i < g->n_lapses; ++i)
    g->lapse[i] = even(0, lapse_max, g->n_lapses, i);
  if (g->n_lapses == 1)
    g->lapse[0] = lapse_max;
  ef__posterior_place(out, threshold, width);
  return EF_OK;
}

void ef__posterior_place(ef__posterior *p, const double threshold[2],
                         const double width[2]) {
  ef__grid *const g = &p->grid;
  for (size_t i = 0; i < g->n_thresholds; ++i)
    g->threshold[i] = even(threshold[0], threshold[1], g->n_thresholds, i);
  for (size_t i = 0; i < g->n_widths; ++i)
    g->width[i] = exp(even(log(width[0]), log(width[1]), g->n_widths, i));
  ef__posterior_reset(p);
}

/* First and last of n sums of weights that leave more than a ten-millionth
 * outside, with a neighbour on either side. */
static void holding(size_t n, const double *mass, size_t *first, size_t *last) {
  double below = 0, above = 0;
  *first = 0;
  *last = n - 1;
  while (*first < n - 1 && below + mass[*first] < 1e-7)
    below += mass[(*first)++];
  while (*last > *first && above + mass[*last] < 1e-7)
    above += mass[(*last)--];
  if (*first > 0)
    (*first)--;
  if (*last < n - 1)
    (*last)++;
}

/* Whether places first to last are few enough of n to be worth a finer grid. */
static bool is_narrow(size_t n, size_t first, size_t last) {
  return n >= 9 && last > first && 2 * (last - first) < n - 1;
}

bool ef__posterior_narrow(ef__posterior *p, double *scratch) {
  const ef__grid *const g = &p->grid;
  size_t first, last;
  bool is_changed = false;
  double threshold[2] = {g->threshold[0], g->threshold[g->n_thresholds - 1]};
  double width[2] = {g->width[0], g->width[g->n_widths - 1]};
  const size_t size = g->n_widths * g->n_lapses;
  memset(scratch, 0, g->n_thresholds * sizeof *scratch);
  for (size_t i = 0; i < p->n_places; ++i)
    scratch[i / size] += p->weight[i];
  holding(g->n_thresholds, scratch, &first, &last);
  if (is_narrow(g->n_thresholds, first, last)) {
    threshold[0] = g->threshold[first];
    threshold[1] = g->threshold[last];
    is_changed = true;
  }
  memset(scratch, 0, g->n_widths * sizeof *scratch);
  for (size_t i = 0; i < p->n_places; ++i)
    scratch[i / g->n_lapses % g->n_widths] += p->weight[i];
  holding(g->n_widths, scratch, &first, &last);
  if (is_narrow(g->n_widths, first, last)) {
    width[0] = g->width[first];
    width[1] = g->width[last];
    is_changed = true;
  }
  if (is_changed)
    ef__posterior_place(p, threshold, width);
  return is_changed;
}

void ef__posterior_reset(ef__posterior *p) {
  for (size_t i = 0; i < p->n_places; ++i)
    p->weight[i] = 1 / (double)p->n_places;
}

void ef__posterior_share(const ef__posterior *p, double t, bool is_blank,
                         double *share) {
  const ef__grid *const g = &p->grid;
  for (size_t i = 0; i < g->n_thresholds; ++i) {
    for (size_t j = 0; j < g->n_widths; ++j) {
      const double eta = p->eta + (t - g->threshold[i]) / g->width[j];
      for (size_t k = 0; k < g->n_lapses; ++k) {
        double rest;
        ef__model_share(&p->model, eta, is_blank, p->guess, g->lapse[k],
                        share++, &rest);
      }
    }
  }
}

void ef__posterior_update(ef__posterior *p, size_t level, bool is_positive) {
  const double *const share = p->share + level * p->n_places;
  double total = 0;
  for (size_t i = 0; i < p->n_places; ++i) {
    p->weight[i] *= is_positive ? share[i] : 1 - share[i];
    total += p->weight[i];
  }
  /* An answer that no place of the grid allows says nothing about them. */
  if (!(total > 0)) {
    ef__posterior_reset(p);
    return;
  }
  for (size_t i = 0; i < p->n_places; ++i)
    p->weight[i] /= total;
}

static double x_ln_x(double x) {
  return x > 0 ? x * log(x) : 0;
}

/* Places that share what is aimed at stand together. */
static size_t group_size(const ef__posterior *p, ef_next_aim aim) {
  const ef__grid *const g = &p->grid;
  return aim == EF_NEXT_THRESHOLD ? g->n_widths * g->n_lapses : g->n_lapses;
}

/* With m1 and m0 the masses of a group together with a positive or negative
 * answer and P their totals, the expected entropy sum_a P_a H(m_a / P_a) is
 * -sum m1 ln m1 - sum m0 ln m0 + P1 ln P1 + P0 ln P0. */
double ef__posterior_expected(const ef__posterior *p, size_t level,
                              ef_next_aim aim) {
  const size_t size = group_size(p, aim);
  const double *share = p->share + level * p->n_places;
  const double *weight = p->weight;
  double entropy = 0, positive = 0, negative = 0;
  for (size_t group = 0; group < p->n_places / size; ++group) {
    double both = 0, with = 0;
    for (size_t i = 0; i < size; ++i) {
      both += weight[i];
      with += weight[i] * share[i];
    }
    const double without = fmax(both - with, 0);
    entropy -= x_ln_x(with) + x_ln_x(without);
    positive += with;
    negative += without;
    weight += size;
    share += size;
  }
  return entropy + x_ln_x(positive) + x_ln_x(negative);
}

double ef__posterior_entropy(const ef__posterior *p, ef_next_aim aim) {
  const size_t size = group_size(p, aim);
  double entropy = 0;
  for (size_t at = 0; at < p->n_places; at += size) {
    double mass = 0;
    for (size_t i = 0; i < size; ++i)
      mass += p->weight[at + i];
    entropy -= x_ln_x(mass);
  }
  return entropy;
}

double ef__posterior_mean(const ef__posterior *p, double *variance) {
  const ef__grid *const g = &p->grid;
  const size_t size = g->n_widths * g->n_lapses;
  double mean = 0, square = 0;
  const double origin = g->threshold[0];
  for (size_t i = 0; i < p->n_places; ++i) {
    const double t = g->threshold[i / size] - origin;
    mean += p->weight[i] * t;
    square += p->weight[i] * t * t;
  }
  *variance = fmax(square - mean * mean, 0);
  return origin + mean;
}
