/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a population gets of a modulation, and the modulation that keeps most
 * from it. */
#include <stdlib.h>

#include "gen.h"
#include "heard.h"
#include "invented_stimulator.h"
#include "near.h"

enum { MOST = EF_MAX_DRIVES, COUNT = 40 };

static ef_population *population_new(size_t count, double scale, double field) {
  ef_population_settings settings = ef_population_settings_default();
  settings.count = count;
  settings.seed = 5;
  settings.deviation_scale = scale;
  settings.mean.field_deg = field;
  if (scale == 0)
    settings.age_min_years = settings.age_max_years = 32;
  ef_error error;
  ef_population *population = ef_population_new(&settings, &error);
  if (population == NULL)
    fail_msg("%s", error.message);
  return population;
}

static ef_isolate_settings random_settings(gen *g) {
  ef_isolate_settings settings = ef_isolate_settings_default();
  gen_fill(g, MOST, 0.2, 0.8, settings.background);
  return settings;
}

static ef_isolation isolate(const invented *i, const ef_direction *direction,
                            const ef_isolate_settings *settings) {
  ef_isolation out;
  ef_error error;
  if (ef_isolate(i->stimulator, direction, settings, &out, &error) != EF_OK)
    fail_msg("%s", error.message);
  return out;
}

static ef_isolation robust(const invented *i, const ef_direction *direction,
                           const ef_isolate_settings *settings,
                           const ef_population *population) {
  ef_isolation out;
  ef_error error;
  if (ef_isolate_robust(i->stimulator, direction, settings, population, 0, &out,
                        NULL, &error) != EF_OK)
    fail_msg("%s", error.message);
  return out;
}

static void spread(const invented *i, const ef_isolation *way,
                   const ef_population *population,
                   ef_receptor_spread out[EF_N_RECEPTORS], double *contrast) {
  ef_error error;
  if (ef_isolation_spread(i->stimulator, way, population, 0, out, contrast,
                          NULL, &error) != EF_OK)
    fail_msg("%s", error.message);
}

/* Objective of the robust modulation, without the weight of its length. */
static double mean_square(const invented *i, const ef_isolation *way,
                          const ef_population *population) {
  ef_receptor_spread all[EF_N_RECEPTORS];
  double sum = 0;
  spread(i, way, population, all, NULL);
  for (size_t r = 0; r < EF_N_RECEPTORS; r++)
    if (way->role[r] == EF_RECEPTOR_SILENT)
      sum += all[r].rms * all[r].rms;
  return sum;
}

static void members_without_deviations_are_the_observer(void **state) {
  (void)state;
  invented i = invented_new(5, "model");
  ef_population *population = population_new(7, 0, 2);
  gen g = gen_new(1);
  for (int k = 0; k < 20; k++) {
    const ef_isolate_settings settings = random_settings(&g);
    const ef_direction direction = invented_direction("S", "rod,mel");
    const ef_isolation way = isolate(&i, &direction, &settings);
    ef_receptor_spread out[EF_N_RECEPTORS];
    double contrast[7 * EF_N_RECEPTORS];
    spread(&i, &way, population, out, contrast);
    for (size_t r = 0; r < EF_N_RECEPTORS; r++) {
      assert_near(out[r].mean, way.contrast[r], 1e-12);
      assert_near(out[r].worst, 0, 1e-12);
      for (size_t m = 0; m < 7; m++)
        assert_near(contrast[m * EF_N_RECEPTORS + r], way.contrast[r], 1e-12);
    }
  }
  ef_population_free(population);
  invented_free(&i);
}

/* Each member as an observer of its own, and the light as spectra. */
static void members_see_the_spectra(void **state) {
  (void)state;
  invented i = invented_new(4, "cie-2015-10");
  ef_population *population = population_new(COUNT, 1, 10);
  const ef_direction direction = invented_direction("L,-M", "mel");
  const ef_isolate_settings settings = ef_isolate_settings_default();
  const ef_isolation way = isolate(&i, &direction, &settings);
  const ef_grid *grid = ef_device_grid(i.device);
  double *light = calloc(2 * grid->count, sizeof *light);
  double contrast[COUNT * EF_N_RECEPTORS];
  ef_receptor_spread out[EF_N_RECEPTORS];
  deviation d = {0};
  spread(&i, &way, population, out, contrast);
  for (size_t s = 0; s < 2; s++) {
    double drive[4];
    for (size_t j = 0; j < 4; j++)
      drive[j] = ef_device_drive(
          i.device, j, way.background[j] + (s == 1 ? way.modulation[j] : 0));
    assert_int_equal(ef_device_spectrum(i.device, drive,
                                        light + s * grid->count, NULL, NULL),
                     EF_OK);
  }
  const ef_viewing viewing = ef_viewing_default(NULL);
  for (size_t m = 0; m < COUNT; m += 7) {
    const ef_cone_model model = ef_population_member(population, m);
    ef_observer *observer = ef_observer_from_model(&model, NULL);
    ef_weights *weights =
        ef_observer_weights(observer, EF_RECEPTORS, grid, &viewing, NULL, NULL);
    double channel[2 * EF_N_RECEPTORS];
    char where[24];
    snprintf(where, sizeof where, "member %zu", m);
    ef_weights_apply(weights, 2, light, 1, channel, NULL);
    for (size_t r = 0; r < EF_N_RECEPTORS; r++)
      deviation_add(&d, contrast[m * EF_N_RECEPTORS + r],
                    channel[EF_N_RECEPTORS + r] / channel[r] - 1, where);
    ef_weights_free(weights);
    ef_observer_free(observer);
  }
  deviation_print(&d, "contrast of members, by their own weights");
  assert_near(d.largest, 0, 1e-12);
  free(light);
  ef_population_free(population);
  invented_free(&i);
}

/* Mean, root mean square, percentile and worst again from the contrasts. */
static void figures_are_those_of_the_contrasts(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  ef_population *population = population_new(21, 1, 2);
  const ef_direction direction = invented_direction("L=0.5,M=-0.25", "");
  ef_isolate_settings settings = ef_isolate_settings_default();
  settings.contrast = 0.01;
  const ef_isolation way = isolate(&i, &direction, &settings);
  double contrast[21 * EF_N_RECEPTORS];
  ef_receptor_spread out[EF_N_RECEPTORS];
  spread(&i, &way, population, out, contrast);
  assert_near(out[EF_L_CONE].intended, 0.005, 0);
  assert_near(out[EF_M_CONE].intended, -0.0025, 0);
  assert_near(out[EF_S_CONE].intended, 0, 0);
  assert_near(out[EF_ROD].intended, way.contrast[EF_ROD], 0);
  for (size_t r = 0; r < EF_N_RECEPTORS; r++) {
    double off[21], mean = 0, square = 0;
    for (size_t m = 0; m < 21; m++) {
      const double c = contrast[m * EF_N_RECEPTORS + r];
      off[m] = fabs(c - out[r].intended);
      mean += c / 21;
      square += off[m] * off[m] / 21;
    }
    assert_near(out[r].mean, mean, 1e-16);
    assert_near(out[r].rms, sqrt(square), 1e-16);
    assert_near(off[out[r].member], out[r].worst, 0);
    /* Place 0.95 x 20 = 19 of 0 to 20: one is above, 19 are not. */
    size_t n_above = 0;
    for (size_t m = 0; m < 21; m++) {
      n_above += off[m] > out[r].p95 * (1 + 1e-12);
      assert_true(off[m] <= out[r].worst);
    }
    assert_int_equal(n_above, 1);
  }
  ef_population_free(population);
  invented_free(&i);
}

static void tritanopes_get_nothing_in_s(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  ef_population_settings settings = ef_population_settings_default();
  settings.count = 5;
  settings.mean.deficiency = EF_TRITANOPE;
  ef_population *population = ef_population_new(&settings, NULL);
  const ef_direction direction = invented_direction("S", "");
  const ef_isolate_settings at = ef_isolate_settings_default();
  const ef_isolation way = isolate(&i, &direction, &at);
  ef_receptor_spread out[EF_N_RECEPTORS];
  spread(&i, &way, population, out, NULL);
  assert_near(out[EF_S_CONE].mean, 0, 0);
  assert_near(out[EF_S_CONE].worst, way.along, 1e-15);
  assert_true(isfinite(out[EF_L_CONE].rms));
  ef_population_free(population);
  invented_free(&i);
}

static void check_robust(const ef_isolation *plain, const ef_isolation *way) {
  for (size_t r = 0; r < EF_N_RECEPTORS; r++)
    if (plain->role[r] == EF_RECEPTOR_CHANGED)
      assert_near(way->contrast[r], plain->contrast[r], 1e-12);
  for (size_t j = 0; j < way->n_primaries; j++) {
    const double step = fabs(way->modulation[j]);
    assert_true(way->background[j] - step >= -1e-15);
    assert_true(way->background[j] + step <= 1 + 1e-15);
    assert_near(way->background[j], plain->background[j], 0);
  }
}

/* The robust modulation plus something that the changed receptors do not see,
 * still in gamut. False when it leaves the gamut. */
static bool disturb(const invented *i, gen *g, const ef_isolation *way,
                    ef_isolation *out) {
  const size_t n = way->n_primaries;
  const double *matrix = ef_stimulator_matrix(i->stimulator);
  double row[EF_N_RECEPTORS][MOST], v[MOST];
  size_t n_rows = 0;
  const double size = pow(10, gen_between(g, -6, -1));
  for (size_t j = 0; j < n; j++)
    v[j] = size * gen_normal(g);
  for (size_t r = 0; r < EF_N_RECEPTORS; r++) {
    if (way->role[r] != EF_RECEPTOR_CHANGED)
      continue;
    memcpy(row[n_rows], matrix + r * n, n * sizeof v[0]);
    n_rows++;
  }
  for (size_t k = 0; k < n_rows; k++) { /* Gram-Schmidt */
    for (size_t m = 0; m < k; m++) {
      double dot = 0;
      for (size_t j = 0; j < n; j++)
        dot += row[m][j] * row[k][j];
      for (size_t j = 0; j < n; j++)
        row[k][j] -= dot * row[m][j];
    }
    double length = 0;
    for (size_t j = 0; j < n; j++)
      length += row[k][j] * row[k][j];
    for (size_t j = 0; j < n; j++)
      row[k][j] /= sqrt(length);
    double dot = 0;
    for (size_t j = 0; j < n; j++)
      dot += row[k][j] * v[j];
    for (size_t j = 0; j < n; j++)
      v[j] -= dot * row[k][j];
  }
  *out = *way;
  for (size_t j = 0; j < n; j++) {
    out->modulation[j] += v[j];
    if (way->background[j] - fabs(out->modulation[j]) < 0 ||
        way->background[j] + fabs(out->modulation[j]) > 1)
      return false;
  }
  return true;
}

static void nothing_in_gamut_leaves_less(void **state) {
  (void)state;
  static const struct {
    const char *change, *silent;
  } plan[] = {{"S", ""}, {"L,-M", ""}, {"mel", "rod"}, {"S,mel", "rod"}};
  gen g = gen_new(2);
  double gained = 0;
  int n_cases = 0, n_inside = 0;
  for (size_t n = 3; n <= MOST; n++) {
    invented i = invented_new(n, "cie-2015-2");
    ef_population *population = population_new(COUNT, 1, 2);
    for (size_t k = 0; k < 4; k++) {
      if (k >= 2 && n < 5)
        continue;
      ef_direction direction =
          invented_direction(plan[k].change, plan[k].silent);
      ef_isolate_settings settings = random_settings(&g);
      const ef_isolation whole = isolate(&i, &direction, &settings);
      settings.contrast = whole.largest * (n % 2 == 0 ? 1 : 0.4);
      const ef_isolation plain = isolate(&i, &direction, &settings);
      const ef_isolation way = robust(&i, &direction, &settings, population);
      check_robust(&plain, &way);
      const double least = mean_square(&i, &way, population);
      const double before = mean_square(&i, &plain, population);
      /* What the length may weigh: 1e-9 of the weights, which are of the size
       * of contrasts per amount (below 3), times squares of amounts. */
      assert_true(least <= before + 1e-8);
      gained += sqrt(least / before);
      n_cases++;
      for (int t = 0; t < 40; t++) {
        ef_isolation other;
        const bool inside = disturb(&i, &g, &way, &other);
        const double share = pow(10, gen_between(&g, -4, 0));
        /* Towards the plain modulation there is always room. */
        for (size_t j = 0; j < n && !inside; j++)
          other.modulation[j] =
              way.modulation[j] +
              share * (plain.modulation[j] - way.modulation[j]);
        n_inside += inside;
        assert_true(mean_square(&i, &other, population) >= least - 1e-8);
      }
    }
    ef_population_free(population);
    invented_free(&i);
  }
  printf("# the residual is on average %.2f of the plain modulation's\n",
         gained / n_cases);
  assert_true(gained / n_cases < 0.95);
  assert_true(n_inside > 300);
}

static void threads_change_nothing(void **state) {
  (void)state;
  invented i = invented_new(6, "cie-2015-2");
  ef_population *population = population_new(1100, 1, 2); /* two blocks */
  const ef_direction direction = invented_direction("S", "rod,mel");
  const ef_isolate_settings settings = ef_isolate_settings_default();
  ef_isolation way[2];
  ef_receptor_spread out[2][EF_N_RECEPTORS];
  memset(way, 0, sizeof way);
  memset(out, 0, sizeof out);
  for (int t = 0; t < 2; t++) {
    assert_int_equal(ef_isolate_robust(i.stimulator, &direction, &settings,
                                       population, t == 0 ? 1 : 3, &way[t],
                                       NULL, NULL),
                     EF_OK);
    assert_int_equal(ef_isolation_spread(i.stimulator, &way[t], population,
                                         t == 0 ? 3 : 1, out[t], NULL, NULL,
                                         NULL),
                     EF_OK);
  }
  assert_same_bits(way[0].modulation, way[1].modulation, 6);
  for (size_t r = 0; r < EF_N_RECEPTORS; r++) {
    assert_same_bits(&out[0][r].rms, &out[1][r].rms, 1);
    assert_same_bits(&out[0][r].p95, &out[1][r].p95, 1);
  }
  ef_population_free(population);
  invented_free(&i);
}

static void bad_questions_are_refused(void **state) {
  (void)state;
  ef_error error;
  heard said = {0};
  const ef_notes notes = heard_notes(&said);
  invented i = invented_new(4, "cie-2015-2");
  ef_population *population = population_new(3, 1, 10);
  const ef_direction all = invented_direction("L,M,S", "");
  const ef_isolate_settings settings = ef_isolate_settings_default();
  ef_isolation way;
  assert_int_equal(ef_isolate_robust(i.stimulator, &all, &settings, population,
                                     1, &way, &notes, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "no receptor is to be silent, so that there is nothing "
                      "to keep from a population");
  const ef_direction s = invented_direction("S", "");
  assert_int_equal(ef_isolate_robust(i.stimulator, &s, &settings, population, 1,
                                     &way, &notes, &error),
                   EF_OK);
  assert_string_equal(said.text,
                      "the population looks at a field of 10 degrees, observer "
                      "cie-2015-2 at one of 2\n");
  way.n_primaries = 3;
  ef_receptor_spread out[EF_N_RECEPTORS];
  assert_int_equal(ef_isolation_spread(i.stimulator, &way, population, 1, out,
                                       NULL, NULL, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "a modulation of 3 primaries is shown on 4");
  ef_population_free(population);
  invented_free(&i);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(members_without_deviations_are_the_observer),
      cmocka_unit_test(members_see_the_spectra),
      cmocka_unit_test(figures_are_those_of_the_contrasts),
      cmocka_unit_test(tritanopes_get_nothing_in_s),
      cmocka_unit_test(nothing_in_gamut_leaves_less),
      cmocka_unit_test(threads_change_nothing),
      cmocka_unit_test(bad_questions_are_refused),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
