/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Fits of published answers beside those of R's glm, which are maximum
 * likelihood of the same model: coefficients, standard errors, deviance,
 * Pearson's chi-square, log likelihood (sources in the CSV files). */
#include <stdlib.h>

#include <evenfield/panel.h>

#include "figures.h"
#include "near.h"

enum { MAX_LEVELS = 16 };

typedef struct counts {
  size_t n;
  double level[MAX_LEVELS];
  size_t shown[MAX_LEVELS], positive[MAX_LEVELS];
} counts;

static counts counts_of(const figures *data, const char *set) {
  counts c = {0};
  for (size_t row = 0; row < data->n_rows; ++row) {
    if (strcmp(figures_text(data, row, 0), set) != 0)
      continue;
    assert_true(c.n < MAX_LEVELS);
    c.level[c.n] = figures_number(data, row, 1);
    c.shown[c.n] = (size_t)figures_number(data, row, 2);
    c.positive[c.n++] = (size_t)figures_number(data, row, 3);
  }
  assert_true(c.n > 0);
  return c;
}

static ef_fit fit_of(const counts *c, const char *link, bool is_log) {
  const ef_responses responses = {c->n, c->level, c->shown, c->positive};
  ef_fit_settings settings = ef_fit_settings_default(EF_TASK_GREATER_LESS);
  settings.shape = strcmp(link, "probit") == 0  ? EF_SHAPE_GAUSSIAN
                   : strcmp(link, "logit") == 0 ? EF_SHAPE_LOGISTIC
                                                : EF_SHAPE_WEIBULL;
  settings.axis = is_log ? EF_AXIS_LOG : EF_AXIS_LINEAR;
  settings.lapse = 0;
  ef_fit fit;
  ef_error error;
  if (ef_fit_responses(&responses, &settings, &fit, &error) != EF_OK)
    fail_msg("%s", error.message);
  return fit;
}

/* Printed to nine digits. glm takes its standard errors from the weights one
 * step before the last, which leaves some 3e-8 in them. */
static void compare(double value, double printed, const char *where,
                    const char *what, deviation *largest) {
  char place[96];
  snprintf(place, sizeof place, "%.60s %.30s", where, what);
  deviation_add(largest, value / printed, 1, place);
  assert_near_relative(value, printed, 1e-7);
}

static void check_row(const figures *f, const figures *data, size_t row,
                      deviation *largest) {
  const char *const set = figures_text(f, row, 0);
  const bool is_log = figures_number(f, row, 1) == 1;
  const counts c = counts_of(data, set);
  const ef_fit fit = fit_of(&c, figures_text(f, row, 2), is_log);
  char where[64];
  snprintf(where, sizeof where, "%.40s %.20s", set, figures_text(f, row, 2));
  ef_psychometric curve = fit.curve;
  curve.axis = EF_AXIS_LINEAR; /* x is on the axis of the fit */
  const struct {
    const char *column;
    double value;
  } check[] = {
      {"intercept", fit.intercept},
      {"slope", fit.slope},
      {"se_intercept", fit.se_intercept},
      {"se_slope", fit.se_slope},
      {"x50", ef_psychometric_level(&curve, 0.5)},
      {"x75", ef_psychometric_level(&curve, 0.75)},
      {"x84", ef_psychometric_level(&curve, 0.84)},
      {"deviance", fit.deviance},
      {"pearson", fit.pearson},
      {"loglik", fit.log_likelihood},
      /* on a logarithmic axis the level's is ln 10 x level times that of t */
      {"se_x50", is_log ? fit.equality.se / fit.equality.value / log(10)
                        : fit.equality.se},
  };
  for (size_t i = 0; i < sizeof check / sizeof check[0]; ++i) {
    compare(check[i].value,
            figures_number(f, row, figures_column(f, check[i].column)), where,
            check[i].column, largest);
  }
  assert_int_equal(fit.degrees,
                   (int)figures_number(f, row, figures_column(f, "df")));
  assert_int_equal(fit.support, EF_SUPPORT_FULL);
}

static void glm_of_r(void **state) {
  (void)state;
  figures f = figures_read("published", "psychometric-fits.csv");
  figures data = figures_read("published", "psychometric-data.csv");
  deviation largest = {0};
  for (size_t row = 0; row < f.n_rows; ++row)
    check_row(&f, &data, row, &largest);
  assert_int_equal(f.n_rows, 13);
  deviation_print(&largest, "glm of R, relative");
  figures_free(&f);
  figures_free(&data);
}

/* S. Hecht, S. Shlaer & M. H. Pirenne, J. Gen. Physiol. 25 (1942) 819: the
 * threshold lies between 54 and 148 quanta at the cornea (their summary); it
 * was taken at 60 % seen (from memory). */
static void threshold_of_vision(void **state) {
  (void)state;
  static const char *const set[] = {"hsp1942-SS-1", "hsp1942-SS-2",
                                    "hsp1942-SH-2", "hsp1942-MHP-1"};
  figures data = figures_read("published", "psychometric-data.csv");
  for (size_t i = 0; i < 4; ++i) {
    const counts c = counts_of(&data, set[i]);
    const ef_fit fit = fit_of(&c, "probit", true);
    const double quanta = ef_psychometric_level(&fit.curve, 0.6);
    printf("# %s: seen at 60 %% with %.1f quanta\n", set[i], quanta);
    assert_true(quanta > 54 && quanta < 148);
  }
  figures_free(&data);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(glm_of_r),
      cmocka_unit_test(threshold_of_vision),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
