/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What holds for every isolating modulation. */
#include <stdlib.h>

#include "gen.h"
#include "invented_stimulator.h"
#include "near.h"

enum { MOST = EF_MAX_DRIVES };

/* Four digits to lose: conditions of these displays are below 1e4. */
static const double rounding = 1e-12;

static ef_isolate_settings random_settings(gen *g) {
  ef_isolate_settings settings = ef_isolate_settings_default();
  gen_fill(g, MOST, 0.1, 0.9, settings.background);
  settings.modulation = gen_unit(g) < 0.5 ? EF_SYMMETRIC : EF_PULSE;
  return settings;
}

/* Random roles with at most n controlled receptors, at least one to change. */
static ef_direction random_direction(gen *g, size_t n) {
  ef_direction d = {.kind = EF_DIRECTION_CONTRAST};
  size_t n_controlled = 0;
  for (size_t k = 0; k < EF_N_RECEPTORS; k++) {
    const size_t r = (k + gen_below(g, EF_N_RECEPTORS)) % EF_N_RECEPTORS;
    if (d.role[r] != EF_RECEPTOR_IGNORED || n_controlled == n)
      continue;
    const bool changes = n_controlled == 0 || gen_unit(g) < 0.3;
    d.role[r] = changes ? EF_RECEPTOR_CHANGED : EF_RECEPTOR_SILENT;
    d.contrast[r] = changes ? gen_between(g, -1, 1) : 0;
    n_controlled++;
  }
  return d;
}

static ef_isolation isolate(const invented *i, const ef_direction *direction,
                            const ef_isolate_settings *settings) {
  ef_isolation out;
  ef_error error;
  if (ef_isolate(i->stimulator, direction, settings, &out, &error) != EF_OK)
    fail_msg("%s", error.message);
  return out;
}

/* Contrasts by the excitations of the two lights. */
static void contrasts_of(const invented *i, const ef_isolation *way,
                         double sign, double out[EF_N_RECEPTORS]) {
  double amount[MOST], before[EF_N_RECEPTORS], after[EF_N_RECEPTORS];
  for (size_t k = 0; k < way->n_primaries; k++)
    amount[k] = way->background[k] + sign * way->modulation[k];
  ef_stimulator_excitations(i->stimulator, way->background, before);
  ef_stimulator_excitations(i->stimulator, amount, after);
  for (size_t r = 0; r < EF_N_RECEPTORS; r++)
    out[r] = after[r] / before[r] - 1;
}

static void check_contrasts(const invented *i, const ef_direction *direction,
                            const ef_isolation *way) {
  double contrast[EF_N_RECEPTORS];
  contrasts_of(i, way, 1, contrast);
  for (size_t r = 0; r < EF_N_RECEPTORS; r++) {
    assert_near(contrast[r], way->contrast[r], rounding);
    if (direction->role[r] == EF_RECEPTOR_SILENT)
      assert_near(way->contrast[r], 0, rounding);
    if (direction->role[r] == EF_RECEPTOR_CHANGED)
      assert_near(way->contrast[r], way->along * direction->contrast[r],
                  rounding);
  }
}

/* Both extremes lie in the gamut, and one amount at a limit. */
static void check_edge(const ef_isolation *way) {
  const double sides[] = {1, way->modulation_kind == EF_SYMMETRIC ? -1 : 0};
  double closest = 1;
  for (size_t k = 0; k < way->n_primaries; k++) {
    for (size_t s = 0; s < 2; s++) {
      const double at = way->background[k] + sides[s] * way->modulation[k];
      assert_true(at >= -1e-14 && at <= 1 + 1e-14);
      closest = fmin(closest, fmin(at, 1 - at));
    }
  }
  assert_near(closest, 0, 1e-9);
  assert_true((way->held_low | way->held_high) != 0);
}

static void silent_receptors_are_silent(void **state) {
  (void)state;
  gen g = gen_new(11);
  double worst = 0;
  for (size_t n = 3; n <= MOST; n++) {
    invented i = invented_new(n, "cie-2015-10");
    for (int k = 0; k < 200; k++) {
      ef_isolate_settings settings = random_settings(&g);
      const ef_direction direction = random_direction(&g, n);
      const ef_isolation way = isolate(&i, &direction, &settings);
      check_contrasts(&i, &direction, &way);
      check_edge(&way);
      assert_int_equal(way.rank, way.n_controlled);
      for (size_t r = 0; r < EF_N_RECEPTORS; r++)
        if (direction.role[r] == EF_RECEPTOR_SILENT)
          worst = fmax(worst, fabs(way.contrast[r]));
    }
    invented_free(&i);
  }
  printf("# largest contrast of a silent receptor %.2g\n", worst);
}

/* A part of the largest is that part of the modulation, and a little more than
 * the largest is refused. */
static void contrast_grows_in_proportion_to_the_edge(void **state) {
  (void)state;
  gen g = gen_new(12);
  for (size_t n = 3; n <= MOST; n++) {
    invented i = invented_new(n, "cie-2015-2");
    for (int k = 0; k < 40; k++) {
      ef_isolate_settings settings = random_settings(&g);
      const ef_direction direction = random_direction(&g, n);
      const ef_isolation whole = isolate(&i, &direction, &settings);
      assert_true(whole.along == whole.largest);
      const double share = gen_between(&g, 0.01, 1);
      settings.contrast = share * whole.largest;
      const ef_isolation part = isolate(&i, &direction, &settings);
      assert_true(part.largest == whole.largest);
      assert_int_equal(part.held_high, whole.held_high);
      for (size_t j = 0; j < n; j++)
        assert_near(part.modulation[j], share * whole.modulation[j], 1e-15);
      check_contrasts(&i, &direction, &part);
      settings.contrast = whole.largest * (1 + 1e-9);
      ef_isolation none;
      ef_error error;
      assert_int_equal(
          ef_isolate(i.stimulator, &direction, &settings, &none, &error),
          EF_NO_ANSWER);
      assert_non_null(strstr(error.message, "the largest in gamut is"));
    }
    invented_free(&i);
  }
}

/* A fourth primary without room to move leaves the three others with what they
 * can do in closed form; with room it can only help. */
static void programme_equals_the_closed_form(void **state) {
  (void)state;
  gen g = gen_new(13);
  deviation d = {0};
  int n_better = 0;
  for (size_t n = 3; n <= 5; n++) {
    invented few = invented_new(n, "cie-2015-2");
    invented more = invented_new(n + 1, "cie-2015-2");
    for (int k = 0; k < 100; k++) {
      ef_direction direction = {.kind = EF_DIRECTION_CONTRAST};
      for (size_t r = 0; r < n; r++) {
        direction.role[r] = r == 0 || gen_unit(&g) < 0.5 ? EF_RECEPTOR_CHANGED
                                                         : EF_RECEPTOR_SILENT;
        direction.contrast[r] = gen_between(&g, -1, 1);
      }
      ef_isolate_settings settings = random_settings(&g);
      settings.modulation = EF_SYMMETRIC;
      settings.background[n] = 0;
      const ef_isolation closed = isolate(&few, &direction, &settings);
      const ef_isolation programme = isolate(&more, &direction, &settings);
      deviation_add(&d, programme.largest / closed.largest, 1, "largest");
      for (size_t j = 0; j < n; j++)
        deviation_add(&d, programme.modulation[j], closed.modulation[j],
                      "modulation");
      assert_near(programme.modulation[n], 0, 0);
      settings.background[n] = 1e-3;
      n_better += isolate(&more, &direction, &settings).largest >
                  closed.largest * (1 + 1e-6);
    }
    invented_free(&few);
    invented_free(&more);
  }
  deviation_print(&d, "programme against the closed form");
  assert_near(d.largest, 0, 1e-10);
  printf("# with room in the further primary %d of 300 are larger\n", n_better);
  assert_true(n_better > 250);
}

static void a_released_receptor_is_never_worse(void **state) {
  (void)state;
  gen g = gen_new(14);
  for (size_t n = 3; n <= MOST; n++) {
    invented i = invented_new(n, "cie-1964");
    for (int k = 0; k < 60; k++) {
      const ef_isolate_settings settings = random_settings(&g);
      ef_direction direction = random_direction(&g, n);
      double largest = isolate(&i, &direction, &settings).largest;
      for (size_t r = 0; r < EF_N_RECEPTORS; r++) {
        if (direction.role[r] != EF_RECEPTOR_SILENT)
          continue;
        direction.role[r] = EF_RECEPTOR_IGNORED;
        const double now = isolate(&i, &direction, &settings).largest;
        assert_true(now >= largest * (1 - 1e-12));
        largest = now;
      }
    }
    invented_free(&i);
  }
}

/* The light itself, through drives and spectra, summed by the weights. */
static void spectra_give_the_same_contrasts(void **state) {
  (void)state;
  gen g = gen_new(15);
  invented i = invented_new(6, "model:age=51,field=6");
  const ef_grid *grid = ef_device_grid(i.device);
  ef_viewing viewing = ef_viewing_default(NULL);
  viewing.absolute = true;
  ef_weights *weights =
      ef_observer_weights(i.observer, EF_RECEPTORS, grid, &viewing, NULL, NULL);
  double *light = calloc(2 * grid->count, sizeof *light);
  for (int k = 0; k < 50; k++) {
    const ef_isolate_settings settings = random_settings(&g);
    const ef_direction direction = random_direction(&g, 6);
    const ef_isolation way = isolate(&i, &direction, &settings);
    double drive[2][MOST], channel[2 * EF_N_RECEPTORS];
    for (size_t j = 0; j < 6; j++) {
      drive[0][j] = ef_device_drive(i.device, j, way.background[j]);
      drive[1][j] =
          ef_device_drive(i.device, j, way.background[j] + way.modulation[j]);
    }
    for (size_t s = 0; s < 2; s++)
      assert_int_equal(ef_device_spectrum(i.device, drive[s],
                                          light + s * grid->count, NULL, NULL),
                       EF_OK);
    assert_int_equal(ef_weights_apply(weights, 2, light, 1, channel, NULL),
                     EF_OK);
    for (size_t r = 0; r < EF_N_RECEPTORS; r++)
      /* Drives are amounts again to 1e-14. */
      assert_near(channel[EF_N_RECEPTORS + r] / channel[r] - 1, way.contrast[r],
                  1e-12);
  }
  free(light);
  ef_weights_free(weights);
  invented_free(&i);
}

/* ---- Directions --------------------------------------------------------- */

static void opponent_axes_are_each_others_inverse(void **state) {
  (void)state;
  gen g = gen_new(16);
  for (int k = 0; k < 100; k++) {
    invented i = invented_new(3, "cie-2015-2");
    double weight[3], excitation[3];
    gen_fill(&g, 3, 0.05, 1, weight);
    if (k % 2 == 0)
      weight[2] = 0;
    gen_fill(&g, 3, 0.1, 5, excitation);
    ef_stimulator_free(i.stimulator);
    i.stimulator = ef_stimulator_new(i.device, i.observer, weight, NULL, NULL);
    ef_dkl_space space;
    assert_int_equal(ef_dkl_space_make(i.stimulator, excitation, &space, NULL),
                     EF_OK);
    for (size_t row = 0; row < 3; row++) {
      double length = 0, light = 0;
      for (size_t col = 0; col < 3; col++) {
        double sum = 0;
        for (size_t c = 0; c < 3; c++)
          sum += space.to_dkl[3 * row + c] * space.from_dkl[3 * c + col];
        assert_near(sum, row == col, 1e-13);
        const double contrast = space.from_dkl[3 * col + row];
        length += contrast * contrast;
        light += weight[col] * excitation[col] * contrast;
      }
      assert_near(length, 1, 1e-14);
      if (row > 0)
        assert_near(light, 0, 1e-14);
    }
    invented_free(&i);
  }
}

static void isoluminant_directions_keep_personal_luminance(void **state) {
  (void)state;
  gen g = gen_new(17);
  for (int k = 0; k < 60; k++) {
    invented i = invented_new(3 + (size_t)k % 3, "cie-2015-10");
    double weight[3];
    gen_fill(&g, 3, 0.1, 2, weight);
    weight[2] *= 0.1;
    ef_stimulator_free(i.stimulator);
    i.stimulator = ef_stimulator_new(i.device, i.observer, weight, NULL, NULL);
    ef_direction direction =
        invented_direction("isoluminant:0", k % 3 == 2 ? "rod" : "");
    direction.angle_deg = gen_between(&g, -400, 400);
    const ef_isolate_settings settings = random_settings(&g);
    const ef_isolation way = isolate(&i, &direction, &settings);
    assert_near(way.luminance_change, 0, rounding);
    double light = 0;
    for (size_t c = 0; c < 3; c++)
      light += weight[c] * way.excitation[c] * way.contrast[c];
    assert_near(light, 0, 1e-10);
    invented_free(&i);
  }
}

/* Half of the asked distance is half of the asked steps, at the luminance of
 * the background. */
static void chromaticity_steps_come_out(void **state) {
  (void)state;
  gen g = gen_new(18);
  invented i = invented_new(3, "cie-2015-2");
  const ef_mb_scale scale = ef_observer_mb_scale(i.observer);
  for (int k = 0; k < 200; k++) {
    ef_direction direction = invented_direction("macleod-boynton:0,0", "");
    direction.mb[0] = gen_between(&g, -0.02, 0.02);
    direction.mb[1] = gen_between(&g, -0.02, 0.02);
    const ef_isolate_settings settings = random_settings(&g);
    const ef_isolation way = isolate(&i, &direction, &settings);
    ef_mb at[2];
    for (size_t s = 0; s < 2; s++) {
      double lms[3];
      for (size_t c = 0; c < 3; c++)
        lms[c] = way.excitation[c] * (1 + (s == 1 ? way.contrast[c] : 0));
      at[s] = ef_lms_to_mb((ef_lms){lms[0], lms[1], lms[2]}, scale);
    }
    assert_near(at[1].mb_l - at[0].mb_l, way.along * direction.mb[0], 1e-13);
    assert_near(at[1].mb_s - at[0].mb_s, way.along * direction.mb[1], 1e-13);
    assert_near_relative(at[1].luminance, at[0].luminance, 1e-13);
  }
  invented_free(&i);
}

/* ---- Backgrounds -------------------------------------------------------- */

static void check_rule(const invented *i, const ef_isolate_settings *settings,
                       const ef_isolation *way) {
  const double all[MOST] = {1, 1, 1, 1, 1, 1, 1, 1};
  double given[EF_N_RECEPTORS];
  for (size_t j = 0; j < way->n_primaries; j++)
    assert_true(way->background[j] >= 0 && way->background[j] <= 1);
  if (settings->background_rule == EF_BACKGROUND_FREE) {
    const double least = settings->least_share * (1 - 1e-11);
    ef_stimulator_excitations(i->stimulator, all, given);
    assert_true(way->luminance_cd_m2 >=
                least * ef_stimulator_luminance_cd_m2(i->stimulator, all));
    for (size_t r = 0; r < EF_N_RECEPTORS; r++)
      if (way->role[r] == EF_RECEPTOR_CHANGED)
        assert_true(way->excitation[r] >= least * given[r]);
    return;
  }
  ef_stimulator_excitations(i->stimulator, settings->background, given);
  for (size_t c = 0; c < 3; c++)
    assert_near_relative(way->excitation[c], given[c], 1e-11);
}

/* A background of the same rule near `at` or anywhere; false when none. */
static bool other_background(gen *g, const invented *i,
                             const ef_isolation *best, double share,
                             double *out) {
  const double all[MOST] = {1, 1, 1, 1, 1, 1, 1, 1};
  const size_t n = ef_stimulator_n_primaries(i->stimulator);
  const bool near = gen_unit(g) < 0.7;
  const double step = pow(10, gen_between(g, -5, -0.5));
  for (size_t j = 0; j < n; j++) {
    const double x = near ? best->background[j] + step * gen_between(g, -1, 1)
                          : gen_between(g, -0.3, 1.3);
    out[j] = fmin(fmax(x, 0), 1);
  }
  double excitation[EF_N_RECEPTORS], full[EF_N_RECEPTORS];
  ef_stimulator_excitations(i->stimulator, out, excitation);
  ef_stimulator_excitations(i->stimulator, all, full);
  for (size_t r = 0; r < EF_N_RECEPTORS; r++)
    if (best->role[r] == EF_RECEPTOR_CHANGED && excitation[r] < share * full[r])
      return false;
  return ef_stimulator_luminance_cd_m2(i->stimulator, out) >=
         share * ef_stimulator_luminance_cd_m2(i->stimulator, all);
}

/* No background tried by chance does better, near or far. */
static void free_background_is_never_beaten_by_chance(void **state) {
  (void)state;
  gen g = gen_new(19);
  for (size_t n = 3; n <= 6; n++) {
    invented i = invented_new(n, "cie-2015-2");
    for (int k = 0; k < 16; k++) {
      ef_isolate_settings settings = random_settings(&g);
      const ef_direction direction = random_direction(&g, n);
      settings.background_rule = EF_BACKGROUND_FREE;
      settings.least_share = gen_between(&g, 0.05, 0.6);
      const ef_isolation best = isolate(&i, &direction, &settings);
      check_rule(&i, &settings, &best);
      check_contrasts(&i, &direction, &best);
      ef_isolate_settings trial = settings;
      trial.background_rule = EF_BACKGROUND_GIVEN;
      int n_tried = 0;
      for (int t = 0; t < 500; t++) {
        ef_isolation way;
        if (!other_background(&g, &i, &best, settings.least_share,
                              trial.background) ||
            ef_isolate(i.stimulator, &direction, &trial, &way, NULL) != EF_OK)
          continue;
        n_tried++;
        assert_true(way.largest <= best.largest * (1 + 2e-6));
      }
      assert_true(n_tried > 100);
    }
    invented_free(&i);
  }
}

/* Metamers of the background: never worse than itself, and cones are kept. */
static void metameric_background_is_never_worse(void **state) {
  (void)state;
  gen g = gen_new(20);
  int n_better = 0;
  for (size_t n = 3; n <= 7; n++) {
    invented i = invented_new(n, "cie-2015-10");
    for (int k = 0; k < 30; k++) {
      ef_isolate_settings settings = random_settings(&g);
      const ef_direction direction =
          k % 3 == 0 ? invented_direction("isoluminant:30", "")
                     : random_direction(&g, n);
      const ef_isolation given = isolate(&i, &direction, &settings);
      settings.background_rule = EF_BACKGROUND_SAME_CONES;
      const ef_isolation best = isolate(&i, &direction, &settings);
      check_rule(&i, &settings, &best);
      assert_true(best.largest >= given.largest * (1 - 2e-6));
      n_better += best.largest > given.largest * (1 + 1e-6);
    }
    invented_free(&i);
  }
  printf("# larger than at the background itself: %d of 150\n", n_better);
  assert_true(n_better > 60);
}

/* All rules find something for all of many random questions, silent to
 * rounding: corners of these programmes are often degenerate. */
static void every_question_has_an_answer(void **state) {
  (void)state;
  double worst = 0;
  for (uint64_t seed = 1; seed <= 600; seed++) {
    gen g = gen_new(seed);
    const size_t n = 3 + seed % 6;
    invented i = invented_new(n, "cie-2015-2");
    ef_isolate_settings settings = random_settings(&g);
    const ef_direction direction = random_direction(&g, n);
    settings.background_rule =
        seed % 2 == 0 ? EF_BACKGROUND_FREE : EF_BACKGROUND_SAME_CONES;
    settings.least_share = gen_between(&g, 0.02, 0.7);
    const ef_isolation way = isolate(&i, &direction, &settings);
    check_rule(&i, &settings, &way);
    check_contrasts(&i, &direction, &way);
    for (size_t r = 0; r < EF_N_RECEPTORS; r++)
      if (direction.role[r] == EF_RECEPTOR_SILENT)
        worst = fmax(worst, fabs(way.contrast[r]));
    invented_free(&i);
  }
  printf("# largest contrast of a silent receptor %.2g\n", worst);
}

/* The direction that is reported is that of the background that is reported. */
static void free_background_and_direction_agree(void **state) {
  (void)state;
  static const char *const texts[] = {"isoluminant red-green",
                                      "isoluminant tritan", "isoluminant:137",
                                      "dkl:0.3,-0.2,0.9"};
  for (size_t n = 3; n <= 5; n++) {
    invented i = invented_new(n, "cie-2015-2");
    for (size_t k = 0; k < 4; k++) {
      const ef_direction direction = invented_direction(texts[k], "");
      ef_isolate_settings settings = ef_isolate_settings_default();
      settings.least_share = 0.3;
      settings.background_rule = EF_BACKGROUND_FREE;
      const ef_isolation way = isolate(&i, &direction, &settings);
      check_rule(&i, &settings, &way);
      ef_dkl_space space;
      assert_int_equal(
          ef_dkl_space_make(i.stimulator, way.excitation, &space, NULL), EF_OK);
      if (direction.kind == EF_DIRECTION_ISOLUMINANT) {
        const double *to = space.to_dkl, *c = way.contrast;
        const double angle = direction.angle_deg * 3.14159265358979323846 / 180;
        assert_near(to[0] * c[0] + to[1] * c[1] + to[2] * c[2], 0, 1e-12);
        assert_near(to[3] * c[0] + to[4] * c[1] + to[5] * c[2],
                    way.along * cos(angle), 1e-12);
        assert_near(to[6] * c[0] + to[7] * c[1] + to[8] * c[2],
                    way.along * sin(angle), 1e-12);
      }
    }
    invented_free(&i);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(silent_receptors_are_silent),
      cmocka_unit_test(contrast_grows_in_proportion_to_the_edge),
      cmocka_unit_test(programme_equals_the_closed_form),
      cmocka_unit_test(a_released_receptor_is_never_worse),
      cmocka_unit_test(spectra_give_the_same_contrasts),
      cmocka_unit_test(opponent_axes_are_each_others_inverse),
      cmocka_unit_test(isoluminant_directions_keep_personal_luminance),
      cmocka_unit_test(chromaticity_steps_come_out),
      cmocka_unit_test(free_background_is_never_beaten_by_chance),
      cmocka_unit_test(metameric_background_is_never_worse),
      cmocka_unit_test(every_question_has_an_answer),
      cmocka_unit_test(free_background_and_direction_agree),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
