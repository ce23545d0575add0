/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Stimulators, directions and isolation: what is refused and with which words,
 * and small cases worked by hand. */
#include <stdlib.h>

#include "fail_alloc.h"
#include "heard.h"
#include "invented_display.h"
#include "invented_stimulator.h"
#include "near.h"
#include "stimulus/stimulus_private.h"

/* ---- Directions as text ------------------------------------------------- */

static void directions_are_read(void **state) {
  (void)state;
  ef_direction d = invented_direction("L=0.1, m=-0.05,Mel=+2e-1", "");
  assert_int_equal(d.kind, EF_DIRECTION_CONTRAST);
  assert_near(d.contrast[EF_L_CONE], 0.1, 0);
  assert_near(d.contrast[EF_M_CONE], -0.05, 0);
  assert_near(d.contrast[EF_MELANOPSIN], 0.2, 0);
  assert_int_equal(d.role[EF_M_CONE], EF_RECEPTOR_CHANGED);
  assert_int_equal(d.role[EF_S_CONE], EF_RECEPTOR_SILENT);
  assert_int_equal(d.role[EF_ROD], EF_RECEPTOR_IGNORED);
  d = invented_direction("-S,+rod", "mel");
  assert_near(d.contrast[EF_S_CONE], -1, 0);
  assert_near(d.contrast[EF_ROD], 1, 0);
  assert_int_equal(d.role[EF_MELANOPSIN], EF_RECEPTOR_SILENT);
  d = invented_direction("Luminance", "");
  for (size_t c = 0; c < 3; c++)
    assert_near(d.contrast[c], 1, 0);
  d = invented_direction("isoluminant red-green", "rod,mel");
  assert_int_equal(d.kind, EF_DIRECTION_ISOLUMINANT);
  assert_near(d.angle_deg, 0, 0);
  assert_int_equal(d.role[EF_ROD], EF_RECEPTOR_SILENT);
  d = invented_direction("isoluminant tritan", "");
  assert_near(d.angle_deg, 90, 0);
  d = invented_direction("isoluminant:-37.5", "");
  assert_near(d.angle_deg, -37.5, 0);
  d = invented_direction("DKL:0.1,-0.2, 0.3", "");
  assert_near(d.dkl[1], -0.2, 0);
  assert_near(d.dkl[2], 0.3, 0);
  d = invented_direction("macleod-boynton:0.003,-0.01", "");
  assert_int_equal(d.kind, EF_DIRECTION_MB);
  assert_near(d.mb[0], 0.003, 0);
  assert_near(d.mb[1], -0.01, 0);
}

static void refuse_direction(const char *text, ef_status status,
                             const char *message) {
  ef_direction d;
  ef_error error;
  assert_int_equal(ef_direction_parse(text, &d, &error), status);
  assert_int_equal(error.status, status);
  assert_string_equal(error.message, message);
}

static void bad_directions_are_refused(void **state) {
  (void)state;
  refuse_direction("luminence", EF_UNKNOWN_NAME,
                   "no direction is called 'luminence'; near names: luminance");
  refuse_direction("L,L=0.5", EF_INVALID, "direction 'L,L=0.5' names L twice");
  refuse_direction("L=abc", EF_INVALID,
                   "'L=abc' in direction 'L=abc': expected a receptor, '=' and "
                   "a number, such as M=-0.05");
  refuse_direction("-L=0.1", EF_INVALID,
                   "'-L=0.1' in direction '-L=0.1': expected a receptor, '=' "
                   "and a number, such as M=-0.05");
  refuse_direction("dkl:1,2", EF_INVALID,
                   "direction 'dkl:1,2' has 2 numbers; expected 3");
  refuse_direction("isoluminant:north", EF_INVALID,
                   "'north' in direction 'isoluminant:north' is no number");
  refuse_direction("macleod-boynton:1,2,3", EF_INVALID,
                   "direction 'macleod-boynton:1,2,3' has 3 numbers; expected "
                   "2");
  ef_direction d;
  assert_int_equal(ef_direction_parse("", &d, NULL), EF_UNKNOWN_NAME);
  assert_int_equal(ef_direction_parse("S,,M", &d, NULL), EF_UNKNOWN_NAME);
  ef_receptor receptor;
  ef_error error;
  assert_int_equal(ef_receptor_find("cone", &receptor, &error),
                   EF_UNKNOWN_NAME);
  assert_string_equal(error.message,
                      "no receptor is called 'cone'; known: L, M, S, rod, mel");
}

static void roles_do_not_contradict(void **state) {
  (void)state;
  ef_error error;
  ef_direction d = invented_direction("S", "");
  assert_int_equal(ef_direction_set_role(&d, "L,S", EF_RECEPTOR_SILENT, &error),
                   EF_INVALID);
  assert_string_equal(error.message, "S cannot be both changed and silenced");
  assert_int_equal(
      ef_direction_set_role(&d, "L,rods", EF_RECEPTOR_IGNORED, &error),
      EF_UNKNOWN_NAME);
  assert_int_equal(d.role[EF_L_CONE], EF_RECEPTOR_SILENT); /* left as it was */
  assert_int_equal(ef_direction_set_role(&d, "L", EF_RECEPTOR_IGNORED, &error),
                   EF_OK);
  assert_int_equal(d.role[EF_L_CONE], EF_RECEPTOR_IGNORED);
  assert_int_equal(ef_direction_set_role(&d, "L", EF_RECEPTOR_CHANGED, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "a list of receptors is silenced or ignored");
  d = invented_direction("isoluminant:20", "");
  assert_int_equal(ef_direction_set_role(&d, "M", EF_RECEPTOR_IGNORED, &error),
                   EF_INVALID);
  assert_string_equal(error.message, "M cannot be ignored: this direction "
                                     "itself says what the cones do");
}

/* ---- Stimulators -------------------------------------------------------- */

static void devices_without_spectra_are_refused(void **state) {
  (void)state;
  ef_error error;
  ef_device *device = ef_display_from_encoding("srgb", NULL, NULL);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  assert_null(ef_stimulator_new(device, observer, NULL, NULL, &error));
  assert_int_equal(error.status, EF_NO_ANSWER);
  assert_string_equal(error.message,
                      "'srgb' is known by chromaticities only; what receptors "
                      "get of it takes the spectra of its primaries");
  assert_null(ef_stimulator_new(NULL, observer, NULL, NULL, &error));
  assert_error(&error, EF_INVALID, "needs a device and an observer");
  ef_device_free(device);
  ef_observer_free(observer);
}

static void luminance_weights_are_checked(void **state) {
  (void)state;
  ef_error error;
  heard said = {0};
  const ef_notes notes = heard_notes(&said);
  ef_device *device = invented_primaries(3);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  const double negative[3] = {2, -0.1, 0}, none[3] = {0, 0, 1};
  assert_null(ef_stimulator_new(device, observer, negative, NULL, &error));
  assert_error(&error, EF_INVALID, "");
  assert_string_equal(error.message,
                      "luminance weight of M is -0.1; expected 0 or more");
  assert_null(ef_stimulator_new(device, observer, none, NULL, &error));
  assert_string_equal(error.message, "luminance weights 0:0:1; L and M cannot "
                                     "both be without");
  ef_stimulator *s = ef_stimulator_new(device, observer, NULL, &notes, &error);
  assert_non_null(s);
  assert_string_equal(said.text,
                      "cie-1931 has no cones of its own: excitations are those "
                      "of the CIE 2006 fundamentals for 2 degrees, and so is "
                      "what counts as isoluminant\n");
  /* k_l / (k_l + k_m) of CIE 170-2:2015 */
  assert_near(ef_stimulator_luminance_weights(s)[0],
              0.68990272 / (0.68990272 + 0.34832189), 1e-15);
  assert_near(ef_stimulator_luminance_weights(s)[2], 0, 0);
  assert_ptr_equal(ef_stimulator_device(s), device);
  assert_ptr_equal(ef_stimulator_observer(s), observer);
  ef_stimulator_free(s);
  ef_stimulator_free(NULL);
  ef_observer_free(observer);
  ef_device_free(device);
}

static void luminance_is_that_of_the_setup(void **state) {
  (void)state;
  invented i = invented_new(5, "cie-1964");
  ef_setup *setup = ef_setup_new(i.device, i.observer, NULL, NULL, NULL);
  const double all[5] = {1, 1, 1, 1, 1}, some[5] = {0.2, 0.7, 0, 1, 0.4};
  assert_near_relative(ef_stimulator_luminance_cd_m2(i.stimulator, all),
                       ef_setup_luminance_cd_m2(setup), 1e-14);
  assert_near_relative(
      ef_stimulator_luminance_cd_m2(i.stimulator, some),
      ef_setup_xyz(setup, some, NULL).Y / ef_setup_scale(setup), 1e-14);
  ef_setup_free(setup);
  invented_free(&i);
  ef_device *relative = invented_display(false);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_stimulator *s = ef_stimulator_new(relative, observer, NULL, NULL, NULL);
  assert_true(isnan(ef_stimulator_luminance_cd_m2(s, all)));
  ef_stimulator_free(s);
  ef_observer_free(observer);
  ef_device_free(relative);
}

/* ---- Isolation ---------------------------------------------------------- */

static void refuse(const invented *i, const ef_direction *direction,
                   const ef_isolate_settings *settings, ef_status status,
                   const char *message) {
  ef_error error;
  ef_isolation out;
  assert_int_equal(ef_isolate(i->stimulator, direction, settings, &out, &error),
                   status);
  assert_string_equal(error.message, message);
}

static void bad_settings_are_refused(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_direction s_cone = invented_direction("S", "");
  ef_isolate_settings settings = ef_isolate_settings_default();
  settings.background[1] = 1.2;
  refuse(&i, &s_cone, &settings, EF_INVALID,
         "the background has 1.2 of primary 'green'; the gamut holds 0 to 1");
  settings.background[1] = (double)NAN;
  refuse(&i, &s_cone, &settings, EF_INVALID,
         "the background has nan of primary 'green'; the gamut holds 0 to 1");
  settings = ef_isolate_settings_default();
  settings.contrast = -0.1;
  refuse(&i, &s_cone, &settings, EF_INVALID,
         "a contrast of -0.1 is wanted; expected more than 0 (a direction has "
         "the signs)");
  settings = ef_isolate_settings_default();
  settings.background_rule = EF_BACKGROUND_FREE;
  settings.least_share = 1;
  refuse(&i, &s_cone, &settings, EF_INVALID,
         "the background is to have at least 1 of what full drive gives; "
         "expected more than 0 and less than 1");
  settings = ef_isolate_settings_default();
  ef_direction nothing = invented_direction("L=0", "");
  refuse(&i, &nothing, &settings, EF_INVALID,
         "the direction changes no receptor; name at least one");
  nothing = invented_direction("L", "");
  nothing.contrast[EF_L_CONE] = INFINITE;
  refuse(&i, &nothing, &settings, EF_INVALID,
         "a contrast of inf for L; expected a finite number");
  invented_free(&i);
}

static void too_much_is_refused_with_the_largest(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_direction s_cone = invented_direction("S", "");
  ef_isolate_settings settings = ef_isolate_settings_default();
  ef_isolation whole;
  char expected[300];
  assert_int_equal(ef_isolate(i.stimulator, &s_cone, &settings, &whole, NULL),
                   EF_OK);
  /* Blue makes nearly all of S. */
  assert_int_equal(whole.held_low, 1);
  assert_int_equal(whole.held_high, 1);
  settings.contrast = 1.5;
  snprintf(expected, sizeof expected,
           "a contrast of 1.5 along this direction is wanted; the largest in "
           "gamut is %.6g (limit: blue at zero, blue at full drive)",
           whole.largest);
  refuse(&i, &s_cone, &settings, EF_NO_ANSWER, expected);
  settings = ef_isolate_settings_default();
  settings.background[0] = 1;
  refuse(&i, &s_cone, &settings, EF_NO_ANSWER,
         "the background leaves no room along this direction (limit: blue at "
         "full drive)");
  invented_free(&i);
}

static void receptors_that_cannot_be_separated_are_told(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_isolate_settings settings = ef_isolate_settings_default();
  ef_direction d = invented_direction("mel", "rod");
  refuse(&i, &d, &settings, EF_NO_ANSWER,
         "5 receptors (L, M, S, rod, mel) cannot be controlled by 3 primaries; "
         "ignore some or add primaries");
  invented_free(&i);
  /* M cones that hold the L pigment follow L. */
  i = invented_new(4, "deuteranope");
  d = invented_direction("M", "");
  refuse(&i, &d, &settings, EF_NO_ANSWER,
         "the primaries cannot separate L, M, S: rank 2 of 3");
  d = invented_direction("S", "");
  ef_isolation out;
  assert_int_equal(ef_isolate(i.stimulator, &d, &settings, &out, NULL), EF_OK);
  assert_int_equal(out.n_controlled, 3);
  assert_int_equal(out.rank, 2);
  assert_near(out.contrast[EF_M_CONE], 0, 1e-12);
  d = invented_direction("isoluminant red-green", "");
  refuse(&i, &d, &settings, EF_NO_ANSWER,
         "the primaries cannot separate L, M, S: rank 2 of 3");
  invented_free(&i);
  i = invented_new(4, "tritanope");
  d = invented_direction("S", "");
  refuse(&i, &d, &settings, EF_INVALID,
         "the background gives S an excitation of 0, against which there is no "
         "contrast; expected more than 0");
  d = invented_direction("isoluminant tritan", "");
  refuse(&i, &d, &settings, EF_INVALID,
         "the background gives S an excitation of 0; a cone-opponent direction "
         "needs all three above 0");
  d = invented_direction("L,M", "");
  assert_int_equal(ef_direction_set_role(&d, "S", EF_RECEPTOR_IGNORED, NULL),
                   EF_OK);
  assert_int_equal(ef_isolate(i.stimulator, &d, &settings, &out, NULL), EF_OK);
  assert_true(isnan(out.contrast[EF_S_CONE]));
  invented_free(&i);
}

/* L and M differ by 1e-9 of their weight on the second primary. By hand: the
 * largest singular value is 2.088, the smallest 5e-10 / sqrt(2) of the part of
 * the second axis that is orthogonal to the rows of L and S, 0.913. */
static void a_bad_condition_is_told(void **state) {
  (void)state;
  ef_stimulator s = {.n = 3,
                     .matrix = {2, 1, 1,        /* L */
                                2, 1 + 1e-9, 1, /* M */
                                0, 1, 5 /* S */}};
  const ef_receptor_role role[EF_N_RECEPTORS] = {
      EF_RECEPTOR_CHANGED, EF_RECEPTOR_SILENT, EF_RECEPTOR_SILENT};
  const double contrast[EF_N_RECEPTORS] = {1, 0, 0};
  const double excitation[EF_N_RECEPTORS] = {2, 2, 3, 1, 1};
  ef__rows rows;
  ef_error error;
  assert_int_equal(ef__rows_make(&s, role, contrast, excitation, &rows, &error),
                   EF_NO_ANSWER);
  assert_string_equal(error.message,
                      "the primaries cannot separate L, M, S: condition number "
                      "6.47e+09, so that no more than half of the digits are "
                      "left");
}

/* The third primary is all luminance and nothing to S, and there is no black: a
 * background may not go dark for S. S is then full drive against the least. */
static void a_background_does_not_go_dark(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  ef_stimulator s = {.device = i.device,
                     .observer = i.observer,
                     .n = 3,
                     .y = {1, 2, 3},
                     .matrix = {1, 2, 3, /* L */
                                1, 3, 1, /* M */
                                5, 1, 0 /* S */}};
  ef_direction direction = invented_direction("S", "");
  for (int c = 0; c < 2; c++)
    direction.role[c] = EF_RECEPTOR_IGNORED;
  ef_isolate_settings settings = ef_isolate_settings_default();
  settings.background_rule = EF_BACKGROUND_FREE;
  settings.least_share = 0.2;
  settings.modulation = EF_PULSE;
  ef_isolation out;
  ef_error error;
  if (ef_isolate(&s, &direction, &settings, &out, &error) != EF_OK)
    fail_msg("%s", error.message);
  assert_near_relative(out.largest, 4.0, 2e-6);
  /* With both signs it is 1: from nothing to twice the background. */
  settings.modulation = EF_SYMMETRIC;
  if (ef_isolate(&s, &direction, &settings, &out, &error) != EF_OK)
    fail_msg("%s", error.message);
  assert_near_relative(out.largest, 1.0, 2e-6);
  invented_free(&i);
}

/* Two receptors, three primaries, no black: worked by hand. Contrast per
 * amount L (1, 1, 0), M (0, 1, 1) at half of each primary; to change L by 1 and
 * leave M alone, x + y = t, y = -z: t is largest with x, y = 0.5, z = -0.5. */
static void a_small_case_by_hand(void **state) {
  (void)state;
  ef__rows rows = {
      .n = 2, .n_primaries = 3, .gain = {1, 1, 0, 0, 1, 1}, .target = {1, 0}};
  const double background[3] = {0.5, 0.5, 0.5}, low[3] = {0.5, 0.25, 0.5};
  double down[3], up[3], modulation[3], along;
  ef__isolate_room(EF_SYMMETRIC, 3, background, down, up);
  assert_int_equal(
      ef__isolate_largest(&rows, down, up, modulation, &along, NULL), EF_OK);
  assert_near(along, 1, 1e-15);
  assert_near(modulation[1], 0.5, 1e-15);
  assert_near(modulation[2], -0.5, 1e-15);
  /* A pulse has more room up: x to 0.5, y to 0.5 with z at -0.5. */
  ef__isolate_room(EF_PULSE, 3, low, down, up);
  assert_near(up[1], 0.75, 0);
  assert_near(down[1], 0.25, 0);
  assert_int_equal(
      ef__isolate_largest(&rows, down, up, modulation, &along, NULL), EF_OK);
  assert_near(along, 1, 1e-15);
}

static bool try_stimulator(void *context) {
  invented *i = context;
  ef_error error = {.status = EF_OK};
  ef_stimulator *s =
      ef_stimulator_new(i->device, i->observer, NULL, NULL, &error);
  const bool made = s != NULL;
  if (!made)
    assert_int_equal(error.status, EF_NO_MEMORY);
  ef_stimulator_free(s);
  return made;
}

static void memory_that_fails_is_told(void **state) {
  (void)state;
  invented i = invented_new(4, "cie-2015-2");
  assert_true(fail_alloc_each(try_stimulator, &i) > 3);
  invented_free(&i);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(directions_are_read),
      cmocka_unit_test(bad_directions_are_refused),
      cmocka_unit_test(roles_do_not_contradict),
      cmocka_unit_test(devices_without_spectra_are_refused),
      cmocka_unit_test(luminance_weights_are_checked),
      cmocka_unit_test(luminance_is_that_of_the_setup),
      cmocka_unit_test(bad_settings_are_refused),
      cmocka_unit_test(too_much_is_refused_with_the_largest),
      cmocka_unit_test(receptors_that_cannot_be_separated_are_told),
      cmocka_unit_test(a_bad_condition_is_told),
      cmocka_unit_test(a_background_does_not_go_dark),
      cmocka_unit_test(a_small_case_by_hand),
      cmocka_unit_test(memory_that_fails_is_told),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
