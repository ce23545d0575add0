/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <evenfield/observer.h>

#include "fail_alloc.h"
#include "gen.h"
#include "near.h"

static ef_observer *make(const char *name) {
  ef_error error;
  ef_observer *const observer = ef_observer_new(name, &error);
  if (observer == NULL) fail_msg("%s", error.message);
  return observer;
}

static ef_illuminant *make_light(const char *name) {
  ef_error error;
  ef_illuminant *const illuminant = ef_illuminant_new(name, &error);
  if (illuminant == NULL) fail_msg("%s", error.message);
  return illuminant;
}

static double channel_at(const ef_channels *channels, size_t c, int nm) {
  return channels->value[c * channels->grid.count + (size_t)(nm - 360)];
}

/* ---- Names and properties ---------------------------------------------- */

static void names_are_taken(void **state) {
  (void)state;
  const char *const *names;
  const size_t n = ef_observer_names(&names);
  assert_int_equal(n, 4);
  assert_int_equal(ef_observer_names(NULL), 4);
  for (size_t i = 0; i < n; ++i) {
    ef_observer *const observer = make(names[i]);
    assert_string_equal(ef_observer_name(observer), names[i]);
    assert_true(strlen(ef_observer_about(observer)) > 20);
    ef_observer_free(observer);
  }
  ef_observer *const upper = make("CIE-1931");
  assert_string_equal(ef_observer_name(upper), "cie-1931");
  ef_observer_free(upper);
  ef_observer_free(NULL);
}

static void unknown_name_gives_the_nearest(void **state) {
  (void)state;
  ef_error error;
  assert_null(ef_observer_new("cie-1932", &error));
  assert_error(&error, EF_UNKNOWN_NAME, "'cie-1932'");
  assert_error(&error, EF_UNKNOWN_NAME, "cie-1931");
  assert_null(ef_observer_new("", &error));
  assert_error(&error, EF_UNKNOWN_NAME, "cie-2015-10");
  assert_null(ef_observer_new("nobody", NULL));
}

typedef struct expectation {
  const char *name;
  double field_deg, k_m;
  bool borrowed;
} expectation;

static void properties(void **state) {
  (void)state;
  const expectation expected[] = {{"cie-1931", 2, 683, true},
                                  {"cie-1964", 10, 683, true},
                                  {"cie-2015-2", 2, 683.358, false},
                                  {"cie-2015-10", 10, 683.599, false}};
  for (size_t i = 0; i < 4; ++i) {
    ef_observer *const observer = make(expected[i].name);
    assert_near(ef_observer_field_deg(observer), expected[i].field_deg, 0);
    assert_near(ef_observer_k_m(observer), expected[i].k_m, 0);
    assert_int_equal(ef_observer_cones_borrowed(observer),
                     expected[i].borrowed);
    const ef_mb_scale scale = ef_observer_mb_scale(observer);
    assert_near(scale.k_l, expected[i].field_deg == 2 ? 0.68990272 : 0.69283932,
                0);
    assert_near(scale.k_m, expected[i].field_deg == 2 ? 0.34832189 : 0.34967567,
                0);
    assert_near(scale.k_s, expected[i].field_deg == 2 ? 0.0371597 : 0.0554786,
                0);
    ef_observer_free(observer);
  }
}

/* ---- Channels ---------------------------------------------------------- */

/* Rows of ISO/CIE 11664-1:2019 and CIE 170-1:2006. */
static void channels_are_the_tables(void **state) {
  (void)state;
  ef_observer *const cie_1931 = make("cie-1931");
  const ef_channels xyz = ef_observer_channels(cie_1931, EF_TRISTIMULUS);
  assert_int_equal(xyz.count, 3);
  assert_string_equal(xyz.name[0], "x_bar");
  const ef_grid standard = ef_grid_standard();
  assert_true(ef_grid_equal(&xyz.grid, &standard));
  assert_near(channel_at(&xyz, 0, 360), 0.0001299, 0);
  assert_near(channel_at(&xyz, 1, 555), 1, 0);
  assert_near(channel_at(&xyz, 0, 600), 1.0622, 0);
  assert_near(channel_at(&xyz, 2, 830), 0, 0);
  const ef_channels cones = ef_observer_channels(cie_1931, EF_CONES);
  assert_string_equal(cones.name[2], "s_bar");
  assert_near(channel_at(&cones, 0, 390), 4.15003e-4, 0);
  assert_near(channel_at(&cones, 2, 390), 9.54729e-3, 0);
  ef_observer_free(cie_1931);
  ef_observer *const cie_1964 = make("cie-1964");
  const ef_channels wide = ef_observer_channels(cie_1964, EF_CONES);
  assert_near(channel_at(&wide, 0, 390), 4.07619e-4, 0);
  ef_observer_free(cie_1964);
}

/* Not tabulated counts as zero: cones below 390 nm, S above 615 nm, and what
 * is made of them. */
static void zero_where_nothing_is_tabulated(void **state) {
  (void)state;
  ef_observer *const observer = make("cie-2015-2");
  const ef_channels cones = ef_observer_channels(observer, EF_CONES);
  const ef_channels xyz = ef_observer_channels(observer, EF_TRISTIMULUS);
  for (int nm = 360; nm < 390; ++nm) {
    for (size_t c = 0; c < 3; ++c) {
      assert_near(channel_at(&cones, c, nm), 0, 0);
      assert_near(channel_at(&xyz, c, nm), 0, 0);
    }
  }
  assert_true(channel_at(&cones, 2, 615) > 0);
  for (int nm = 616; nm <= 830; ++nm) {
    assert_near(channel_at(&cones, 2, nm), 0, 0);
    assert_near(channel_at(&xyz, 2, nm), 0, 0);
    assert_true(channel_at(&cones, 0, nm) > 0);
  }
  ef_observer_free(observer);
}

/* ---- Observers from spectra -------------------------------------------- */

enum { N_TEN = 41 }; /* 380 to 780 nm at 10 nm */
static const ef_grid ten_nm = {.count = N_TEN, .start_nm = 380, .step_nm = 10};

/* Every tenth row of a built-in observer. */
static ef_spectra *thinned(const char *name, size_t n, double factor) {
  ef_observer *const observer = make(name);
  const ef_channels xyz = ef_observer_channels(observer, EF_TRISTIMULUS);
  double value[4 * N_TEN];
  for (size_t c = 0; c < n; ++c) {
    for (size_t i = 0; i < N_TEN; ++i) {
      value[c * N_TEN + i] =
          factor * channel_at(&xyz, c % 3, 380 + 10 * (int)i);
    }
  }
  ef_spectra *const spectra =
      ef_spectra_new(n, NULL, &ten_nm, EF_LIGHT, value, NULL);
  assert_non_null(spectra);
  ef_observer_free(observer);
  return spectra;
}

static void from_spectra(void **state) {
  (void)state;
  ef_spectra *const spectra = thinned("cie-1964", 3, 1);
  ef_error error;
  ef_observer *const own =
      ef_observer_from_spectra("panel mean", spectra, &error);
  assert_non_null(own);
  ef_observer *const original = make("cie-1964");
  assert_string_equal(ef_observer_name(own), "panel mean");
  assert_near(ef_observer_k_m(own), 683, 0);
  assert_near(ef_observer_field_deg(own), 2, 0);
  assert_true(ef_observer_cones_borrowed(own));
  const ef_channels a = ef_observer_channels(own, EF_TRISTIMULUS);
  const ef_channels b = ef_observer_channels(original, EF_TRISTIMULUS);
  for (int nm = 360; nm <= 830; ++nm) {
    for (size_t c = 0; c < 3; ++c) {
      const double expected =
          nm < 380 || nm > 780 ? 0 : channel_at(&b, c, nm);
      /* Rows as they are; between them Sprague's polynomials, for which 10 nm
       * is a little coarse on the steep blue side of z_bar (peak 2). */
      assert_near(channel_at(&a, c, nm), expected, nm % 10 == 0 ? 0 : 1e-2);
    }
  }
  ef_observer_free(original);
  ef_observer_free(own);
  ef_spectra_free(spectra);
}

static void refuses(const char *what, ef_spectra *spectra) {
  ef_error error;
  assert_null(ef_observer_from_spectra("mine", spectra, &error));
  assert_error(&error, EF_INVALID, what);
  assert_error(&error, EF_INVALID, "'mine'");
  ef_spectra_free(spectra);
}

static void from_spectra_refuses(void **state) {
  (void)state;
  refuses("2 functions", thinned("cie-1931", 2, 1));
  refuses("4 functions", thinned("cie-1931", 4, 1));
  refuses("zero or depend", thinned("cie-1931", 3, 0));
  double value[3 * N_TEN];
  gen g = gen_new(3);
  gen_fill(&g, 2 * N_TEN, 0, 1, value);
  for (size_t i = 0; i < N_TEN; ++i) {
    value[2 * N_TEN + i] = 0.3 * value[i] - 2 * value[N_TEN + i];
  }
  refuses("zero or depend",
          ef_spectra_new(3, NULL, &ten_nm, EF_LIGHT, value, NULL));
  const ef_grid infrared = {.count = N_TEN, .start_nm = 900, .step_nm = 10};
  gen_fill(&g, 3 * N_TEN, 0, 1, value);
  refuses("zero or depend",
          ef_spectra_new(3, NULL, &infrared, EF_LIGHT, value, NULL));
}

/* ---- Weights ----------------------------------------------------------- */

typedef struct kept {
  size_t n;
  char line[300];
} kept;

static void keep(void *cookie, const char *line) {
  kept *const k = cookie;
  ++k->n;
  snprintf(k->line, sizeof k->line, "%s", line);
}

static ef_weights *weigh(const ef_observer *observer, ef_channel_role role,
                         const ef_grid *samples, const ef_viewing *viewing,
                         kept *notes) {
  ef_error error;
  const ef_notes sink = {keep, notes};
  ef_weights *const weights = ef_observer_weights(
      observer, role, samples, viewing, notes != NULL ? &sink : NULL, &error);
  if (weights == NULL) fail_msg("%s", error.message);
  return weights;
}

/* Sum of a channel's weights: what a spectrum of ones gives. */
static double of_ones(const ef_weights *weights, size_t c) {
  const size_t n = ef_weights_samples(weights);
  double sum = 0;
  for (size_t i = 0; i < n; ++i) sum += ef_weights_matrix(weights)[c * n + i];
  return sum;
}

/* On any sampling the perfect diffuser has the white point. */
static void diffuser_is_white(void **state) {
  (void)state;
  ef_illuminant *const d65 = make_light("D65");
  ef_observer *const observer = make("cie-1931");
  const ef_viewing viewing = ef_viewing_default(d65);
  const ef_channel_role roles[] = {EF_TRISTIMULUS, EF_CONES};
  for (size_t r = 0; r < 2; ++r) {
    double white[3];
    assert_int_equal(
        ef_observer_white(observer, roles[r], d65, NULL, white, NULL), EF_OK);
    ef_weights *const weights =
        weigh(observer, roles[r], &ten_nm, &viewing, NULL);
    for (size_t c = 0; c < 3; ++c) {
      /* Sprague's coefficients add up to 1 but for the rounding of some 500
       * products. */
      assert_near_relative(of_ones(weights, c), white[c], 1e-13);
    }
    ef_weights_free(weights);
    if (roles[r] != EF_TRISTIMULUS) continue;
    assert_near(white[0], 95.0471, 5e-5); /* 1 nm, 360 to 830 nm */
    assert_near(white[1], 100, 1e-12);
    assert_near(white[2], 108.8829, 5e-5);
  }
  ef_observer_free(observer);
  ef_illuminant_free(d65);
}

/* Cones of surfaces are on the scale on which the observer's own y_bar gives
 * 100: for an observer made of its cones, V = k_l L + k_m M. */
static void cones_of_white_have_luminance_100(void **state) {
  (void)state;
  ef_illuminant *const a = make_light("A");
  ef_observer *const observer = make("cie-2015-10");
  double lms[3];
  assert_int_equal(ef_observer_white(observer, EF_CONES, a, NULL, lms, NULL),
                   EF_OK);
  const ef_mb_scale scale = ef_observer_mb_scale(observer);
  assert_near(scale.k_l * lms[0] + scale.k_m * lms[1], 100, 1e-11);
  ef_observer_free(observer);
  ef_illuminant_free(a);
}

/* An equal-energy light of 1 W sr^-1 m^-2 nm^-1 has the sum of y_bar (1931:
 * 106.856917 over 1 nm steps) times 683 as its luminance. */
static void lights_are_summed(void **state) {
  (void)state;
  ef_observer *const observer = make("cie-1931");
  ef_viewing viewing = ef_viewing_default(NULL);
  assert_int_equal(viewing.kind, EF_LIGHT);
  const ef_grid standard = ef_grid_standard();
  ef_weights *relative =
      weigh(observer, EF_TRISTIMULUS, &standard, &viewing, NULL);
  assert_near(of_ones(relative, 0), 106.865469, 5e-7);
  assert_near(of_ones(relative, 1), 106.856917, 5e-7);
  assert_near(of_ones(relative, 2), 106.892251, 5e-7);
  viewing.absolute = true;
  ef_weights *const absolute =
      weigh(observer, EF_TRISTIMULUS, &standard, &viewing, NULL);
  assert_near_relative(of_ones(absolute, 1), 683 * of_ones(relative, 1), 1e-14);
  ef_weights_free(absolute);
  ef_weights_free(relative);
  /* 5 nm sums from 380 to 780 nm, times 5: published as 21.371328. */
  viewing.absolute = false;
  viewing.working =
      (ef_grid){.count = 81, .start_nm = 380, .step_nm = 5};
  relative = weigh(observer, EF_TRISTIMULUS, &viewing.working, &viewing, NULL);
  assert_near(of_ones(relative, 1), 5 * 21.371328, 5 * 5e-7);
  ef_weights_free(relative);
  ef_observer_free(observer);
}

static void working_grid_holds_the_tables(void **state) {
  (void)state;
  ef_observer *const observer = make("cie-1964");
  ef_viewing viewing = ef_viewing_default(NULL);
  viewing.working = (ef_grid){.count = 95, .start_nm = 360, .step_nm = 5};
  ef_weights *const weights =
      weigh(observer, EF_TRISTIMULUS, &viewing.working, &viewing, NULL);
  const ef_channels xyz = ef_observer_channels(observer, EF_TRISTIMULUS);
  for (size_t c = 0; c < 3; ++c) {
    for (size_t i = 0; i < 95; ++i) {
      assert_near(ef_weights_matrix(weights)[c * 95 + i],
                  5 * channel_at(&xyz, c, 360 + 5 * (int)i), 0);
    }
  }
  ef_weights_free(weights);
  ef_observer_free(observer);
}

static void note_when_samples_end_early(void **state) {
  (void)state;
  ef_observer *const observer = make("cie-1931");
  ef_illuminant *const d65 = make_light("D65");
  ef_viewing viewing = ef_viewing_default(d65);
  const ef_grid narrow = {.count = 26, .start_nm = 450, .step_nm = 10};
  kept notes = {0};
  ef_weights *weights =
      weigh(observer, EF_TRISTIMULUS, &narrow, &viewing, &notes);
  assert_int_equal(notes.n, 1);
  assert_non_null(strstr(notes.line, "of z_bar lies outside"));
  assert_non_null(strstr(notes.line, "450 to 700 nm"));
  assert_non_null(strstr(notes.line, "end values were held"));
  double percent = 0;
  assert_int_equal(sscanf(notes.line, "%lf %%", &percent), 1);
  assert_near(percent, 100 * ef_weights_outside(weights, 2), 0.005);
  assert_true(percent > 30);
  ef_weights_free(weights);
  viewing = ef_viewing_default(NULL);
  weights = weigh(observer, EF_TRISTIMULUS, &narrow, &viewing, &notes);
  assert_int_equal(notes.n, 2);
  assert_non_null(strstr(notes.line, "zero was taken"));
  ef_weights_free(weights);
  weights = weigh(observer, EF_TRISTIMULUS, &ten_nm, &viewing, &notes);
  assert_int_equal(notes.n, 2); /* 380 to 780 nm is enough */
  ef_weights_free(weights);
  ef_illuminant_free(d65);
  ef_observer_free(observer);
}

static void viewing_is_checked(void **state) {
  (void)state;
  ef_error error;
  ef_observer *const observer = make("cie-1931");
  ef_illuminant *const d65 = make_light("D65");
  ef_viewing viewing = ef_viewing_default(d65);
  viewing.kind = EF_LIGHT;
  assert_null(ef_observer_weights(observer, EF_CONES, &ten_nm, &viewing, NULL,
                                  &error));
  assert_error(&error, EF_INVALID, "not in illuminant 'D65'");
  viewing = ef_viewing_default(NULL);
  viewing.kind = EF_SURFACE;
  assert_null(ef_observer_weights(observer, EF_CONES, &ten_nm, &viewing, NULL,
                                  &error));
  assert_error(&error, EF_INVALID, "an illuminant is needed");
  const double uneven[] = {400, 500, 550};
  viewing = ef_viewing_default(d65);
  viewing.working = (ef_grid){.count = 3, .wavelength_nm = uneven};
  assert_null(ef_observer_weights(observer, EF_CONES, &ten_nm, &viewing, NULL,
                                  &error));
  assert_error(&error, EF_INVALID, "even steps");
  const ef_grid empty = {.count = 0, .start_nm = 400, .step_nm = 10};
  viewing = ef_viewing_default(d65);
  assert_null(ef_observer_weights(observer, EF_CONES, &empty, &viewing, NULL,
                                  &error));
  assert_int_equal(error.status, EF_INVALID);
  /* A light that this observer does not see. */
  viewing.working = (ef_grid){.count = 5, .start_nm = 900, .step_nm = 10};
  assert_null(ef_observer_weights(observer, EF_CONES, &ten_nm, &viewing, NULL,
                                  &error));
  assert_error(&error, EF_INVALID, "'D65' is dark");
  double white[3];
  assert_int_equal(ef_observer_white(observer, EF_CONES, d65, &viewing.working,
                                     white, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "'D65' is dark");
  ef_illuminant_free(d65);
  ef_observer_free(observer);
}

/* ---- Memory ------------------------------------------------------------ */

static bool new_observer(void *context) {
  ef_error error = {.status = EF_OK};
  ef_observer *const observer = ef_observer_new(context, &error);
  if (observer == NULL) assert_int_equal(error.status, EF_NO_MEMORY);
  ef_observer_free(observer);
  return observer != NULL;
}

static bool new_from_spectra(void *context) {
  ef_error error = {.status = EF_OK};
  ef_observer *const observer =
      ef_observer_from_spectra("mine", context, &error);
  if (observer == NULL) assert_int_equal(error.status, EF_NO_MEMORY);
  ef_observer_free(observer);
  return observer != NULL;
}

typedef struct scene {
  const ef_observer *observer;
  const ef_illuminant *illuminant;
} scene;

static bool new_weights(void *context) {
  const scene *const s = context;
  const ef_viewing viewing = ef_viewing_default(s->illuminant);
  ef_error error = {.status = EF_OK};
  ef_weights *const weights = ef_observer_weights(
      s->observer, EF_TRISTIMULUS, &ten_nm, &viewing, NULL, &error);
  if (weights == NULL) assert_int_equal(error.status, EF_NO_MEMORY);
  ef_weights_free(weights);
  return weights != NULL;
}

static bool white(void *context) {
  const scene *const s = context;
  double xyz[3];
  ef_error error = {.status = EF_OK};
  return ef_observer_white(s->observer, EF_TRISTIMULUS, s->illuminant, NULL,
                           xyz, &error) == EF_OK;
}

static void out_of_memory(void **state) {
  (void)state;
  assert_true(fail_alloc_each(new_observer, "cie-1931") > 0);
  assert_true(fail_alloc_each(new_observer, "cie-2015-10") > 0);
  ef_spectra *const spectra = thinned("cie-1931", 3, 1);
  assert_true(fail_alloc_each(new_from_spectra, spectra) > 1);
  ef_spectra_free(spectra);
  ef_observer *const observer = make("cie-1931");
  ef_illuminant *const d65 = make_light("D65");
  scene s = {observer, d65};
  assert_true(fail_alloc_each(new_weights, &s) > 2);
  assert_true(fail_alloc_each(white, &s) > 0);
  ef_illuminant_free(d65);
  ef_observer_free(observer);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(names_are_taken),
      cmocka_unit_test(unknown_name_gives_the_nearest),
      cmocka_unit_test(properties),
      cmocka_unit_test(channels_are_the_tables),
      cmocka_unit_test(zero_where_nothing_is_tabulated),
      cmocka_unit_test(from_spectra),
      cmocka_unit_test(from_spectra_refuses),
      cmocka_unit_test(diffuser_is_white),
      cmocka_unit_test(cones_of_white_have_luminance_100),
      cmocka_unit_test(lights_are_summed),
      cmocka_unit_test(working_grid_holds_the_tables),
      cmocka_unit_test(note_when_samples_end_early),
      cmocka_unit_test(viewing_is_checked),
      cmocka_unit_test(out_of_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
