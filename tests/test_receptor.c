/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>

#include <evenfield/observer.h>

#include "fail_alloc.h"
#include "near.h"

static ef_observer *make(const char *name) {
  ef_error error;
  ef_observer *const observer = ef_observer_new(name, &error);
  if (observer == NULL) fail_msg("%s: %s", name, error.message);
  return observer;
}

static ef_illuminant *light(const char *name) {
  ef_error error;
  ef_illuminant *const illuminant = ef_illuminant_new(name, &error);
  if (illuminant == NULL) fail_msg("%s", error.message);
  return illuminant;
}

static ef_alpha_opic of_light(const char *name, double factor) {
  const ef_grid grid = ef_grid_standard();
  const ef_viewing viewing = ef_viewing_default(NULL);
  double power[471], channel[EF_ALPHA_OPIC_CHANNELS];
  ef_illuminant *const illuminant = light(name);
  assert_int_equal(ef_illuminant_sample(illuminant, &grid, power, NULL), EF_OK);
  for (size_t i = 0; i < grid.count; ++i) power[i] *= factor;
  ef_weights *const weights =
      ef_alpha_opic_weights(&grid, &viewing, NULL, NULL);
  assert_int_equal(ef_weights_channels(weights), EF_ALPHA_OPIC_CHANNELS);
  assert_int_equal(ef_weights_apply(weights, 1, power, 1, channel, NULL),
                   EF_OK);
  ef_weights_free(weights);
  ef_illuminant_free(illuminant);
  return ef_alpha_opic_from(channel);
}

/* CIE S 026/E:2018: alpha-opic efficacy of luminous radiation of D65 in mW/lm.
 * Half a unit of the last digit; the melanopic spectrum of ours has three
 * figures only and comes out one unit higher. */
static void efficacies_of_d65(void **state) {
  (void)state;
  const double published[EF_N_RECEPTORS] = {1.6289, 1.4558, 0.8173, 1.4497,
                                            1.3262};
  const ef_alpha_opic d65 = of_light("D65", 1);
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    printf("# D65 %s: %.5f mW/lm, published %.4f\n",
           ef_receptor_name((ef_receptor)r), d65.efficacy_mw_lm[r],
           published[r]);
    assert_near(d65.efficacy_mw_lm[r], published[r],
                r == EF_MELANOPSIN ? 1e-4 : 0.5e-4);
    assert_near(d65.daylight_ratio[r], 1, 1e-4);
    assert_true(ef_alpha_opic_d65_mw_lm((ef_receptor)r) == published[r]);
  }
}

/* Definitions of the quantities, for a light that is not D65. */
static void quantities_belong_together(void **state) {
  (void)state;
  const ef_alpha_opic a = of_light("A", 1), twice = of_light("A", 2);
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    const double d65 = ef_alpha_opic_d65_mw_lm((ef_receptor)r);
    assert_near_relative(twice.quantity[r], 2 * a.quantity[r], 1e-14);
    assert_near_relative(twice.efficacy_mw_lm[r], a.efficacy_mw_lm[r], 1e-13);
    assert_near_relative(a.equivalent_d65[r],
                         a.daylight_ratio[r] * a.photopic, 1e-13);
    assert_near_relative(a.quantity[r],
                         a.efficacy_mw_lm[r] * a.photopic / 1000, 1e-13);
    assert_near_relative(a.daylight_ratio[r] * d65, a.efficacy_mw_lm[r], 1e-13);
  }
  assert_near_relative(a.scotopic, 1700 * a.quantity[EF_ROD], 1e-14);
  /* Tungsten light does less to short-wave receptors than daylight does. */
  assert_true(a.daylight_ratio[EF_S_CONE] < a.daylight_ratio[EF_MELANOPSIN] &&
              a.daylight_ratio[EF_MELANOPSIN] < a.daylight_ratio[EF_ROD] &&
              a.daylight_ratio[EF_ROD] < 1);
}

static void darkness_has_no_ratios(void **state) {
  (void)state;
  const double channel[EF_ALPHA_OPIC_CHANNELS] = {0};
  const ef_alpha_opic dark = ef_alpha_opic_from(channel);
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    assert_true(dark.quantity[r] == 0 && dark.equivalent_d65[r] == 0);
    assert_true(isnan(dark.efficacy_mw_lm[r]) &&
                isnan(dark.daylight_ratio[r]));
  }
}

/* Surfaces: luminance 100 for the perfect diffuser, ratios of the light. */
static void surfaces_reflect_the_light(void **state) {
  (void)state;
  const ef_grid grid = {.count = 41, .start_nm = 380, .step_nm = 10};
  ef_illuminant *const illuminant = light("LED-B3");
  const ef_viewing viewing = ef_viewing_default(illuminant);
  double half[41], channel[EF_ALPHA_OPIC_CHANNELS];
  for (size_t i = 0; i < 41; ++i) half[i] = 0.5;
  ef_weights *const weights =
      ef_alpha_opic_weights(&grid, &viewing, NULL, NULL);
  ef_weights_apply(weights, 1, half, 1, channel, NULL);
  const ef_alpha_opic surface = ef_alpha_opic_from(channel);
  const ef_alpha_opic direct = of_light("LED-B3", 1);
  assert_near(surface.photopic, 50, 1e-10);
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    assert_near_relative(surface.efficacy_mw_lm[r], direct.efficacy_mw_lm[r],
                         1e-12);
  }
  ef_weights_free(weights);
  ef_illuminant_free(illuminant);
}

/* EF_RECEPTORS: the observer's own cones, then rods and melanopsin. */
static void receptors_begin_with_the_cones(void **state) {
  (void)state;
  const char *const names[] = {"cie-1931", "cie-2015-10", "model:age=70",
                               "deuteranope"};
  const size_t n = ef_grid_standard().count;
  for (size_t k = 0; k < 4; ++k) {
    ef_observer *const observer = make(names[k]);
    const ef_channels cones = ef_observer_channels(observer, EF_CONES);
    const ef_channels all = ef_observer_channels(observer, EF_RECEPTORS);
    assert_int_equal(cones.count, 3);
    assert_int_equal(all.count, EF_N_RECEPTORS);
    assert_same_bits(all.value, cones.value, 3 * n);
    assert_string_equal(all.name[EF_L_CONE], "l_bar");
    assert_string_equal(all.name[EF_ROD], "rhodopic");
    assert_string_equal(all.name[EF_MELANOPSIN], "melanopic");
    for (size_t r = EF_ROD; r <= EF_MELANOPSIN; ++r) {
      double peak = 0;
      for (size_t i = 0; i < n; ++i) peak = fmax(peak, all.value[r * n + i]);
      assert_near(peak, 1, k == 2 ? 0 : 1e-12);
    }
    ef_observer_free(observer);
  }
}

static double value_at(const ef_observer *observer, size_t receptor,
                       size_t nm) {
  const ef_channels all = ef_observer_channels(observer, EF_RECEPTORS);
  return all.value[receptor * all.grid.count + nm - 360];
}

/* V'(lambda) of 1951 at three wavelengths, CIE 018:2019; an older lens takes
 * away at short wavelengths, by the change of its density. */
static void rods_see_through_the_lens(void **state) {
  (void)state;
  ef_observer *const young = make("cie-1964");
  ef_observer *const same = make("model:age=32,field=10");
  ef_observer *const old = make("model:age=80,field=10");
  const ef_cone_model at_32 = {.age_years = 32, .field_deg = 10};
  const ef_cone_model at_80 = {.age_years = 80, .field_deg = 10};
  const ef_grid two = {.count = 2, .start_nm = 430, .step_nm = 100};
  double before[2], after[2];
  assert_true(value_at(young, EF_ROD, 400) == 0.00929);
  assert_true(value_at(young, EF_ROD, 380) == 0.000589);
  assert_true(value_at(young, EF_ROD, 555) == 0.402);
  ef_cone_model_media(&at_32, &two, before, NULL, NULL);
  ef_cone_model_media(&at_80, &two, after, NULL, NULL);
  for (size_t r = EF_ROD; r <= EF_MELANOPSIN; ++r) {
    const double young_ratio =
        value_at(young, r, 430) / value_at(young, r, 530);
    const double same_ratio = value_at(same, r, 430) / value_at(same, r, 530);
    const double old_ratio = value_at(old, r, 430) / value_at(old, r, 530);
    const double density =
        (after[0] - before[0]) - (after[1] - before[1]);
    assert_near_relative(same_ratio, young_ratio, 1e-13);
    assert_near_relative(old_ratio, young_ratio * pow(10, -density), 1e-12);
  }
  ef_observer_free(young);
  ef_observer_free(same);
  ef_observer_free(old);
}

/* Weights for five channels come from the same call as for three. */
static void receptors_fold_like_any_channels(void **state) {
  (void)state;
  ef_observer *const observer = make("cie-2015-10");
  const ef_grid grid = ef_grid_standard();
  const ef_viewing viewing = ef_viewing_default(NULL);
  ef_weights *const weights = ef_observer_weights(
      observer, EF_RECEPTORS, &grid, &viewing, NULL, NULL);
  ef_weights *const standard =
      ef_alpha_opic_weights(&grid, &viewing, NULL, NULL);
  assert_int_equal(ef_weights_channels(weights), EF_N_RECEPTORS);
  /* CIE S 026 takes its cones from the 10 degree fundamentals, to 780 nm. */
  const double *const own = ef_weights_matrix(weights);
  const double *const published = ef_weights_matrix(standard);
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    assert_same_bits(own + r * grid.count, published + r * grid.count,
                     780 - 360 + 1);
  }
  ef_weights_free(weights);
  ef_weights_free(standard);
  ef_observer_free(observer);
}

static bool make_weights(void *context) {
  (void)context;
  const ef_grid grid = {.count = 10, .start_nm = 400, .step_nm = 30};
  const ef_viewing viewing = ef_viewing_default(NULL);
  ef_weights *const weights =
      ef_alpha_opic_weights(&grid, &viewing, NULL, NULL);
  ef_weights_free(weights);
  return weights != NULL;
}

static void weights_survive_a_lack_of_memory(void **state) {
  (void)state;
  assert_true(fail_alloc_each(make_weights, NULL) >= 3);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(efficacies_of_d65),
      cmocka_unit_test(quantities_belong_together),
      cmocka_unit_test(darkness_has_no_ratios),
      cmocka_unit_test(surfaces_reflect_the_light),
      cmocka_unit_test(receptors_begin_with_the_cones),
      cmocka_unit_test(rods_see_through_the_lens),
      cmocka_unit_test(receptors_fold_like_any_channels),
      cmocka_unit_test(weights_survive_a_lack_of_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
