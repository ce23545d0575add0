/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Isolation on two measured displays against a second implementation, whose
 * figures (surfaces/cone_isolation_check.csv) and the measured spectra are not
 * part of this repository: EVENFIELD_REFERENCE names their folder. Spectra: R.
 * Mantiuk, K. J. Kim, A. G. Rempel & W. Heidrich, ACM Transactions on Graphics
 * 30(4), 40 (2011). Opponent space: Derrington, Krauskopf & Lennie 1984, units
 * of Brainard 1996 (appendix to Kaiser & Boynton). Nine figures each. */
#include <stdlib.h>

#include <evenfield/stimulus.h>

#include "figures.h"
#include "near.h"

enum { FIRST_NM = 390, LAST_NM = 780, SAMPLES = LAST_NM - FIRST_NM + 1 };
static const ef_grid whole_nm = {SAMPLES, FIRST_NM, 1, NULL};

/* Half a unit of the ninth figure, and a little for the sums. */
static const double nine_figures = 6e-9;

typedef struct scene {
  figures checks;
  const char *name; /* "crt", "led_lcd" */
  ef_device *device;
  ef_observer *observer;
  ef_stimulator *stimulator;
} scene;

/* The second implementation takes the spectra at whole nanometres, linearly
 * interpolated, zero outside. */
static ef_device *whole_nanometres(const char *file) {
  figures f = figures_reference(file);
  double *nm = calloc(f.n_rows, sizeof *nm);
  double *value = calloc(3 * f.n_rows, sizeof *value);
  static double light[4 * SAMPLES];
  assert_true(nm != NULL && value != NULL);
  for (size_t i = 0; i < f.n_rows; i++) {
    nm[i] = figures_number(&f, i, 0);
    for (size_t c = 0; c < 3; c++)
      value[c * f.n_rows + i] = figures_number(&f, i, 1 + c);
  }
  const ef_grid own = {f.n_rows, 0, 0, nm};
  assert_int_equal(ef_resample(&own, 3, value, &whole_nm, EF_INTERPOLATE_LINEAR,
                               EF_EXTEND_ZERO, light, NULL),
                   EF_OK);
  static const char *const names[] = {"red", "green", "blue"};
  ef_error error;
  ef_spectra *spectra =
      ef_spectra_new(3, names, &whole_nm, EF_LIGHT, light, &error);
  ef_device *device =
      ef_display_from_spectra("measured", spectra, NULL, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  ef_spectra_free(spectra);
  free(value);
  free(nm);
  figures_free(&f);
  return device;
}

static scene scene_new(const char *name, const char *file) {
  ef_error error;
  scene s = {.checks = figures_reference("cone_isolation_check.csv"),
             .name = name,
             .device = whole_nanometres(file),
             .observer = ef_observer_new("cie-2015-2", &error)};
  s.stimulator = ef_stimulator_new(s.device, s.observer, NULL, NULL, &error);
  if (s.stimulator == NULL)
    fail_msg("%s", error.message);
  return s;
}

static void scene_free(scene *s) {
  ef_stimulator_free(s->stimulator);
  ef_observer_free(s->observer);
  ef_device_free(s->device);
  figures_free(&s->checks);
}

/* The figure of a quantity, row and column. */
static double check_of(const scene *s, const char *quantity, const char *row,
                       const char *column) {
  const figures *f = &s->checks;
  for (size_t i = 0; i < f->n_rows; i++)
    if (strcmp(figures_text(f, i, 0), s->name) == 0 &&
        strcmp(figures_text(f, i, 1), quantity) == 0 &&
        strcmp(figures_text(f, i, 2), row) == 0 &&
        strcmp(figures_text(f, i, 3), column) == 0)
      return figures_number(f, i, 4);
  fail_msg("no %s %s %s %s", s->name, quantity, row, column);
  return 0;
}

static void expect(const scene *s, deviation *d, double actual,
                   const char *quantity, const char *row, const char *column) {
  char where[96];
  const double expected = check_of(s, quantity, row, column);
  snprintf(where, sizeof where, "%s %s %s %s", s->name, quantity, row, column);
  /* Relative to the figure, or to 1 for zeros. */
  const double size = expected != 0 ? fabs(expected) : 1;
  deviation_add(d, actual / size, expected / size, where);
}

static const char *const cones[] = {"l", "m", "s"};
static const char *const guns[] = {"r", "g", "b"};
static const double half[3] = {0.5, 0.5, 0.5};

/* Weighted as there: 683 x the sum x k_l, k_m, k_s. */
static void factors(const scene *s, double factor[3]) {
  const ef_mb_scale k = ef_observer_mb_scale(s->observer);
  factor[0] = 683 * k.k_l;
  factor[1] = 683 * k.k_m;
  factor[2] = 683 * k.k_s;
}

static void excitations(const scene *s, deviation *d) {
  const double *matrix = ef_stimulator_matrix(s->stimulator);
  double factor[3], excitation[EF_N_RECEPTORS];
  factors(s, factor);
  ef_stimulator_excitations(s->stimulator, half, excitation);
  for (size_t c = 0; c < 3; c++) {
    for (size_t i = 0; i < 3; i++)
      expect(s, d, factor[c] * matrix[3 * c + i], "primary_to_lms", cones[c],
             guns[i]);
    expect(s, d, factor[c] * excitation[c], "background_lms", cones[c], "");
  }
  const ef_mb mb =
      ef_lms_to_mb((ef_lms){excitation[0], excitation[1], excitation[2]},
                   ef_observer_mb_scale(s->observer));
  expect(s, d, mb.mb_l, "background_macleod_boynton", "l", "");
  expect(s, d, mb.mb_s, "background_macleod_boynton", "s", "");
}

static ef_isolation isolate(const scene *s, const char *direction) {
  ef_error error;
  ef_direction way;
  ef_isolation out = {0};
  const ef_isolate_settings settings = ef_isolate_settings_default();
  if (ef_direction_parse(direction, &way, &error) != EF_OK ||
      ef_isolate(s->stimulator, &way, &settings, &out, &error) != EF_OK)
    fail_msg("%s: %s", direction, error.message);
  return out;
}

static void increments(const scene *s, deviation *d) {
  static const char *const symbols[] = {"L", "M", "S"};
  for (size_t c = 0; c < 3; c++) {
    const ef_isolation way = isolate(s, symbols[c]);
    expect(s, d, way.largest, "max_bipolar_cone_contrast", "", cones[c]);
    for (size_t i = 0; i < 3; i++)
      expect(s, d, way.modulation[i] / way.along,
             "rgb_increment_per_unit_cone_contrast", guns[i], cones[c]);
  }
  const ef_isolation way = isolate(s, "isoluminant red-green");
  expect(s, d, way.contrast[0], "max_isoluminant_lm_contrast", "", "l");
  expect(s, d, way.contrast[1], "max_isoluminant_lm_contrast", "", "m");
}

static void opponent_axes(const scene *s, deviation *d) {
  static const char *const axes[] = {"lum", "l_minus_m", "s_minus_lum"};
  ef_dkl_space space;
  double factor[3], excitation[EF_N_RECEPTORS];
  factors(s, factor);
  ef_stimulator_excitations(s->stimulator, half, excitation);
  assert_int_equal(ef_dkl_space_make(s->stimulator, excitation, &space, NULL),
                   EF_OK);
  for (size_t k = 0; k < 3; k++) {
    for (size_t c = 0; c < 3; c++) {
      expect(s, d, space.to_dkl[3 * k + c] / (factor[c] * excitation[c]),
             "dkl_from_lms_increment", axes[k], cones[c]);
      expect(s, d, space.from_dkl[3 * c + k], "cone_contrast_of_unit_dkl",
             cones[c], axes[k]);
    }
  }
}

static void check_display(const char *name, const char *file) {
  scene s = scene_new(name, file);
  deviation d = {0};
  excitations(&s, &d);
  increments(&s, &d);
  opponent_axes(&s, &d);
  deviation_print(&d, "relative, nine figures given");
  assert_near(d.largest, 0, nine_figures);
  scene_free(&s);
}

static void crt(void **state) {
  (void)state;
  check_display("crt", "display_spd_crt.csv");
}

static void led_lcd(void **state) {
  (void)state;
  check_display("led_lcd", "display_spd_led_lcd.csv");
}

int main(void) {
  if (figures_no_reference("measured displays"))
    return 0;
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(crt),
      cmocka_unit_test(led_lcd),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
