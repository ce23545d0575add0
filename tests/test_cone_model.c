/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>

#include "fail_alloc.h"
#include "gen.h"
#include "near.h"
#include "observer/model_private.h"

enum { L, M, S };

static ef_observer *make(const char *name) {
  ef_error error;
  ef_observer *const observer = ef_observer_new(name, &error);
  if (observer == NULL) fail_msg("%s: %s", name, error.message);
  return observer;
}

/* ---- Curves ------------------------------------------------------------ */

/* The spline is exact for a cubic: no other end condition would be. */
static void curve_returns_a_cubic(void **state) {
  (void)state;
  for (size_t n = 5; n <= 9; ++n) {
    double value[9];
    ef__curve curve;
    for (size_t i = 0; i < n; ++i) {
      const double x = 37 + 3 * (double)i - 50;
      value[i] = 0.31 - 0.7 * x + 0.011 * x * x - 0.0029 * x * x * x;
    }
    ef__curve_fit(&curve, n, 37, 3, value);
    for (int k = 0; k <= 60; ++k) {
      const double w = 37 + 3 * (double)(n - 1) * k / 60;
      const double x = w - 50;
      assert_near(ef__curve_at(&curve, w),
                  0.31 - 0.7 * x + 0.011 * x * x - 0.0029 * x * x * x, 1e-11);
    }
  }
}

static void curve_goes_on_straight(void **state) {
  (void)state;
  const double value[6] = {0.2, 0.5, 0.1, 0.9, 0.7, 0.75};
  ef__curve curve;
  ef__curve_fit(&curve, 6, 400, 5, value);
  const double inside = (ef__curve_at(&curve, 400.001) - value[0]) / 0.001;
  assert_near(ef__curve_at(&curve, 390), value[0] - 10 * inside, 1e-3);
  const double end = (value[5] - ef__curve_at(&curve, 424.999)) / 0.001;
  assert_near(ef__curve_at(&curve, 437), value[5] + 12 * end, 1e-3);
}

/* ---- Model ------------------------------------------------------------- */

static ef_cone_model random_model(gen *g) {
  ef_cone_model model = {.age_years = gen_between(g, 20, 80),
                         .field_deg = gen_between(g, 1, 10),
                         .lens_percent = gen_between(g, -50, 80),
                         .macular_percent = gen_between(g, -100, 100)};
  for (size_t i = 0; i < 3; ++i) {
    model.density_percent[i] = gen_between(g, -40, 40);
    model.shift_nm[i] = gen_between(g, -5, 5);
  }
  return model;
}

/* Peak of 1 to the nearest 0.1 nm; nothing negative, nothing outside. */
static void fundamentals_have_unit_peaks(void **state) {
  (void)state;
  gen g = gen_new(5);
  const ef_grid tenths = {.count = 4701, .start_nm = 360, .step_nm = 0.1};
  double *const value = malloc(3 * tenths.count * sizeof *value);
  for (int round = 0; round < 20; ++round) {
    const ef_cone_model model = random_model(&g);
    const ef_cone_units units = round % 2 == 0 ? EF_ENERGY : EF_QUANTAL;
    ef_error error;
    assert_int_equal(
        ef_cone_model_fundamentals(&model, units, &tenths, value, &error),
        EF_OK);
    for (size_t c = 0; c < 3; ++c) {
      double peak = 0;
      for (size_t i = 0; i < tenths.count; ++i) {
        const double v = value[c * tenths.count + i];
        assert_true(v >= 0 && v <= 1 + 1e-9);
        if (v > peak) peak = v;
        if (ef_grid_wavelength(&tenths, i) < 389.95) assert_true(v == 0);
      }
      /* The grid's tenths and the model's differ by their rounding. */
      assert_near(peak, 1, 1e-9);
    }
  }
  free(value);
}

/* A quantum carries energy in proportion to 1 / wavelength. */
static void units_differ_by_wavelength(void **state) {
  (void)state;
  const ef_grid grid = {.count = 300, .start_nm = 395, .step_nm = 1};
  double energy[900], quantal[900];
  const ef_cone_model model = {.age_years = 61, .field_deg = 4.5,
                               .shift_nm = {1, -2, 0.5}};
  ef_cone_model_fundamentals(&model, EF_ENERGY, &grid, energy, NULL);
  ef_cone_model_fundamentals(&model, EF_QUANTAL, &grid, quantal, NULL);
  for (size_t c = 0; c < 3; ++c) {
    const double factor = energy[c * 300 + 40] / (435 * quantal[c * 300 + 40]);
    for (size_t i = 0; i < 220; ++i) {
      assert_near_relative(energy[c * 300 + i],
                           factor * (395 + (double)i) * quantal[c * 300 + i],
                           1e-13);
    }
  }
}

/* Any grid gives the same values at the same wavelengths. */
static void grids_agree(void **state) {
  (void)state;
  const double uneven_nm[] = {300, 389.9, 390, 412.5, 555, 615, 699.25, 830,
                              831};
  const ef_grid uneven = {.count = 9, .wavelength_nm = uneven_nm};
  const ef_cone_model model = {.age_years = 70, .field_deg = 1};
  double value[27];
  ef_cone_model_fundamentals(&model, EF_ENERGY, &uneven, value, NULL);
  for (size_t i = 0; i < 9; ++i) {
    const ef_grid one = {.count = 1, .start_nm = uneven_nm[i]};
    double alone[3];
    ef_cone_model_fundamentals(&model, EF_ENERGY, &one, alone, NULL);
    for (size_t c = 0; c < 3; ++c) {
      assert_same_bits(&alone[c], &value[9 * c + i], 1);
    }
  }
  assert_true(value[0] == 0 && value[1] == 0 && value[8] == 0);
  assert_true(value[2] > 0 && value[7] > 0);
}

/* A shift moves the pigment and nothing else: where media are flat (from 660
 * nm) a fundamental in quanta, before it is divided by its peak, moves. */
static void shift_is_along_wavelength(void **state) {
  (void)state;
  const ef_grid grid = {.count = 121, .start_nm = 670, .step_nm = 1};
  ef_cone_model model = ef_cone_model_default();
  double mean[363], shifted[363];
  ef_cone_model_fundamentals(&model, EF_QUANTAL, &grid, mean, NULL);
  model.shift_nm[L] = 4;
  ef_cone_model_fundamentals(&model, EF_QUANTAL, &grid, shifted, NULL);
  const double factor = shifted[10] / mean[6];
  for (size_t i = 4; i < 121; ++i) {
    assert_near_relative(shifted[i], factor * mean[i - 4], 1e-12);
  }
  assert_same_bits(shifted + 121, mean + 121, 242);
}

/* Directions that follow from the equations alone. */
static void departures_act_where_they_should(void **state) {
  (void)state;
  const ef_grid at = {.count = 2, .start_nm = 430, .step_nm = 30};
  const ef_cone_model mean = ef_cone_model_default();
  double lens[2], more[2], macular[2], less[2], density[3], own[3];
  ef_cone_model_media(&mean, &at, lens, macular, NULL);
  ef_cone_model model = mean;
  model.lens_percent = 18.7;
  model.macular_percent = -36.5;
  model.density_percent[M] = 9;
  ef_cone_model_media(&model, &at, more, less, NULL);
  for (size_t i = 0; i < 2; ++i) {
    assert_near_relative(more[i], 1.187 * lens[i], 1e-14);
    assert_near_relative(less[i], 0.635 * macular[i], 1e-14);
  }
  ef_cone_model_peak_densities(&mean, density, NULL);
  ef_cone_model_peak_densities(&model, own, NULL);
  assert_near_relative(own[M], 1.09 * density[M], 1e-14);
  assert_true(own[L] == density[L] && own[S] == density[S]);
}

static void check_refused(const ef_cone_model *model, const char *message) {
  ef_error error = {.status = EF_OK};
  double value[3];
  const ef_grid grid = {.count = 1, .start_nm = 500};
  assert_int_equal(ef_cone_model_check(model, &error), EF_INVALID);
  assert_string_equal(error.message, message);
  assert_int_equal(
      ef_cone_model_fundamentals(model, EF_ENERGY, &grid, value, NULL),
      EF_INVALID);
  assert_int_equal(ef_cone_model_tristimulus(model, &grid, value, NULL),
                   EF_INVALID);
  assert_int_equal(ef_cone_model_media(model, &grid, value, NULL, NULL),
                   EF_INVALID);
  assert_int_equal(ef_cone_model_peak_densities(model, value, NULL),
                   EF_INVALID);
  assert_null(ef_observer_from_model(model, NULL));
}

static void ranges_are_held(void **state) {
  (void)state;
  ef_cone_model model = ef_cone_model_default();
  model.age_years = 19.5;
  check_refused(&model,
                "the age is 19.5 years; the observer model takes 20 to 80");
  model.age_years = 81;
  check_refused(&model,
                "the age is 81 years; the observer model takes 20 to 80");
  model.age_years = NOT_A_NUMBER;
  check_refused(&model,
                "the age is nan years; the observer model takes 20 to 80");
  model = ef_cone_model_default();
  model.field_deg = 0.5;
  check_refused(&model,
                "the field is 0.5 degrees; the observer model takes 1 to 10");
  model.field_deg = 12;
  check_refused(&model,
                "the field is 12 degrees; the observer model takes 1 to 10");
  model = ef_cone_model_default();
  model.macular_percent = -101;
  check_refused(&model, "the macular density is -101 %; the observer model "
                        "takes -100 to 400");
  model = ef_cone_model_default();
  model.shift_nm[S] = 41;
  check_refused(&model, "the S pigment shift is 41 nm; the observer model "
                        "takes -40 to 40");
  model = ef_cone_model_default();
  model.deficiency = (ef_deficiency)9;
  check_refused(&model, "there is no deficiency number 9");
  ef_error error;
  double matrix[9];
  assert_int_equal(ef_cone_xyz_matrix(0.9, matrix, NULL, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, "the field is 0.9 degrees");
  const ef_grid wide = {.count = 2, .start_nm = 380, .step_nm = 10};
  const ef_cone_model mean = ef_cone_model_default();
  assert_int_equal(ef_cone_model_media(&mean, &wide, matrix, NULL, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "the densities of the eye are known from 390 to 830 nm; "
                      "the grid goes from 380 to 390");
}

/* ---- Names ------------------------------------------------------------- */

static void names_make_models(void **state) {
  (void)state;
  const struct {
    const char *name;
    ef_cone_model model;
  } expected[] = {
      {"model", {.age_years = 32, .field_deg = 2}},
      {"model:age=45,field=4", {.age_years = 45, .field_deg = 4}},
      {"MODEL:Field=4.5", {.age_years = 32, .field_deg = 4.5}},
      {"model:lens=10,macular=-20,density-l=1,density-m=2,density-s=3,"
       "shift-l=4,shift-m=-5,shift-s=6,age=20,field=10",
       {20, 10, 10, -20, {1, 2, 3}, {4, -5, 6}, EF_TRICHROMAT}},
      {"protanope", {.age_years = 32, .field_deg = 2,
                     .deficiency = EF_PROTANOPE}},
      {"tritanope:field=10", {.age_years = 32, .field_deg = 10,
                              .deficiency = EF_TRITANOPE}},
      {"protanomalous:shift=12", {.age_years = 32, .field_deg = 2,
                                  .shift_nm = {-12, 0, 0}}},
      {"deuteranomalous:age=60,shift=7,shift-m=1",
       {.age_years = 60, .field_deg = 2, .shift_nm = {0, 8, 0}}},
  };
  for (size_t i = 0; i < sizeof expected / sizeof *expected; ++i) {
    bool is_model = false;
    ef_cone_model model;
    ef_error error;
    if (ef__model_parse(expected[i].name, &is_model, &model, &error) != EF_OK) {
      fail_msg("%s", error.message);
    }
    assert_true(is_model);
    assert_memory_equal(&model, &expected[i].model, sizeof model);
  }
}

static void models_make_names(void **state) {
  (void)state;
  gen g = gen_new(8);
  for (int round = 0; round < 200; ++round) {
    ef_cone_model model = random_model(&g);
    model.deficiency = (ef_deficiency)gen_below(&g, 4);
    char name[EF__MODEL_NAME];
    ef_cone_model back;
    bool is_model;
    ef__model_name(&model, name);
    assert_int_equal(ef__model_parse(name, &is_model, &back, NULL), EF_OK);
    assert_memory_equal(&back, &model, sizeof model);
  }
  char name[EF__MODEL_NAME];
  ef_cone_model model = ef_cone_model_default();
  ef__model_name(&model, name);
  assert_string_equal(name, "model:age=32,field=2");
  model.deficiency = EF_TRITANOPE;
  model.shift_nm[L] = -1.5;
  ef__model_name(&model, name);
  assert_string_equal(name, "tritanope:age=32,field=2,shift-l=-1.5");
}

static void wrong_names_are_answered(void **state) {
  (void)state;
  const struct {
    const char *name;
    ef_status status;
    const char *message;
  } wrong[] = {
      {"model:age=85", EF_INVALID,
       "the age is 85 years; the observer model takes 20 to 80"},
      {"model:field=11", EF_INVALID,
       "the field is 11 degrees; the observer model takes 1 to 10"},
      {"model:aeg=45", EF_UNKNOWN_NAME,
       "no setting of an observer is called 'aeg'; near names: age"},
      {"model:shift=3", EF_UNKNOWN_NAME,
       "no setting of an observer is called 'shift'; near names: shift-l, "
       "shift-m, shift-s"},
      {"model:age", EF_INVALID,
       "observer setting 'age' has no value; write age=NUMBER"},
      {"model:age=4o", EF_INVALID,
       "observer setting 'age' is '4o', which is no number"},
      {"model:age=45,", EF_UNKNOWN_NAME, "no setting of an observer is called"},
      {"model:", EF_UNKNOWN_NAME, "no setting of an observer is called"},
      {"model:age=45,age=46", EF_INVALID,
       "observer setting 'age' is given twice"},
      {"protanomalous", EF_INVALID,
       "observer 'protanomalous' needs the shift of its pigment in nm, as in "
       "protanomalous:shift=12"},
      {"deuteranomalous:shift=0", EF_INVALID,
       "a shift of 0 nm of the M pigment towards L; it must be above 0 and at "
       "most 32 nm, where the two meet"},
      {"protanomalous:shift=33", EF_INVALID,
       "a shift of 33 nm of the L pigment towards M; it must be above 0 and at "
       "most 32 nm, where the two meet"},
      {"cie-1931:field=4", EF_INVALID,
       "observer 'cie-1931' is a table and takes no settings; 'model' does, as "
       "in model:age=45,field=4"},
      {"protonope", EF_UNKNOWN_NAME,
       "no observer is called 'protonope'; near names: protanope"},
      {"deuteronope:age=30", EF_UNKNOWN_NAME,
       "no observer is called 'deuteronope'; near names: deuteranope"},
      {"achromat", EF_UNKNOWN_NAME,
       "no observer is called 'achromat'; known: cie-1931, cie-1964, "
       "cie-2015-2, cie-2015-10, model, protanope, deuteranope, tritanope, "
       "..."},
  };
  for (size_t i = 0; i < sizeof wrong / sizeof *wrong; ++i) {
    ef_error error = {.status = EF_OK};
    assert_null(ef_observer_new(wrong[i].name, &error));
    assert_error(&error, wrong[i].status, wrong[i].message);
  }
}

static void listed_names_are_taken(void **state) {
  (void)state;
  const char *const *names;
  const size_t n = ef_observer_model_names(&names);
  assert_int_equal(n, 6);
  for (size_t i = 0; i < n; ++i) {
    char name[64];
    const bool is_anomalous = i >= 4;
    snprintf(name, sizeof name, "%s%s", names[i],
             is_anomalous ? ":shift=5" : "");
    ef_observer *const observer = make(name);
    assert_string_equal(ef_observer_name(observer), name);
    const bool is_dichromat = i >= 1 && !is_anomalous;
    assert_int_equal(ef_observer_dimensions(observer), is_dichromat ? 2 : 3);
    ef_observer_free(observer);
  }
  ef_observer *const table = make("cie-1931");
  assert_int_equal(ef_observer_dimensions(table), 3);
  ef_observer_free(table);
}

/* ---- Observers --------------------------------------------------------- */

static void observer_is_what_the_model_says(void **state) {
  (void)state;
  ef_observer *const observer = make("model:age=45,field=4,lens=12");
  const ef_cone_model model = {
      .age_years = 45, .field_deg = 4, .lens_percent = 12};
  const ef_grid grid = ef_grid_standard();
  double value[3 * 471], matrix[9], k_m;
  ef_cone_model_fundamentals(&model, EF_ENERGY, &grid, value, NULL);
  assert_same_bits(ef_observer_channels(observer, EF_CONES).value, value,
                   3 * 471);
  ef_cone_model_tristimulus(&model, &grid, value, NULL);
  assert_same_bits(ef_observer_channels(observer, EF_TRISTIMULUS).value, value,
                   3 * 471);
  ef_cone_xyz_matrix(4, matrix, &k_m, NULL);
  assert_true(ef_observer_k_m(observer) == k_m && k_m > 683.358 &&
              k_m < 683.599);
  assert_true(ef_observer_field_deg(observer) == 4);
  assert_false(ef_observer_cones_borrowed(observer));
  const ef_mb_scale scale = ef_observer_mb_scale(observer);
  assert_true(scale.k_l == matrix[3] && scale.k_m == matrix[4]);
  assert_string_equal(ef_observer_name(observer),
                      "model:age=45,field=4,lens=12");
  assert_string_equal(ef_observer_about(observer),
                      "observer of 45 years, 4 degree field (CIE 170-1:2006, "
                      "CIE 170-2:2015), with departures from the mean eye as "
                      "stated in its name");
  ef_observer *const again = ef_observer_from_model(&model, NULL);
  assert_string_equal(ef_observer_name(again), "model:age=45,field=4,lens=12");
  ef_cone_model told;
  assert_true(ef_observer_model(again, &told));
  assert_memory_equal(&told, &model, sizeof told);
  ef_observer_free(again);
  ef_observer_free(observer);
}

static void tables_have_no_model(void **state) {
  (void)state;
  ef_observer *const table = make("cie-2015-2");
  ef_cone_model told = {.age_years = 77};
  assert_false(ef_observer_model(table, &told));
  assert_true(told.age_years == 77);
  ef_observer_free(table);
}

/* k_s of the mean observer is that of CIE 170-2 to what the templates allow. */
static void macleod_boynton_factor(void **state) {
  (void)state;
  ef_observer *const two = make("model");
  ef_observer *const ten = make("model:field=10");
  assert_near_relative(ef_observer_mb_scale(two).k_s, 0.0371597, 1e-3);
  assert_near_relative(ef_observer_mb_scale(ten).k_s, 0.0554786, 1e-3);
  ef_observer_free(two);
  ef_observer_free(ten);
}

/* ---- Deficiencies ------------------------------------------------------ */

static void sum_channels(const ef_observer *observer, ef_channel_role role,
                         double sum[3]) {
  const ef_channels channels = ef_observer_channels(observer, role);
  for (size_t c = 0; c < 3; ++c) {
    sum[c] = 0;
    for (size_t i = 0; i < channels.grid.count; ++i) {
      sum[c] += channels.value[c * channels.grid.count + i];
    }
  }
}

static void dichromats_have_two_kinds_of_cones(void **state) {
  (void)state;
  ef_observer *const normal = make("model:age=50,field=6,density-m=5");
  ef_observer *const protan = make("protanope:age=50,field=6,density-m=5");
  ef_observer *const deutan = make("deuteranope:age=50,field=6,density-m=5");
  ef_observer *const tritan = make("tritanope:age=50,field=6,density-m=5");
  const size_t n = ef_grid_standard().count;
  const double *const lms = ef_observer_channels(normal, EF_CONES).value;
  const double *const p = ef_observer_channels(protan, EF_CONES).value;
  const double *const d = ef_observer_channels(deutan, EF_CONES).value;
  const double *const t = ef_observer_channels(tritan, EF_CONES).value;
  assert_same_bits(p, lms + n, n);
  assert_same_bits(p + n, lms + n, 2 * n);
  assert_same_bits(d, lms, n);
  assert_same_bits(d + n, lms, n);
  assert_same_bits(d + 2 * n, lms + 2 * n, n);
  assert_same_bits(t, lms, 2 * n);
  for (size_t i = 2 * n; i < 3 * n; ++i) assert_true(t[i] == 0);
  /* The equal-energy spectrum is the same colour for all four. */
  double expected[3], own[3];
  sum_channels(normal, EF_TRISTIMULUS, expected);
  ef_observer *const all[3] = {protan, deutan, tritan};
  for (size_t k = 0; k < 3; ++k) {
    sum_channels(all[k], EF_TRISTIMULUS, own);
    for (size_t c = 0; c < 3; ++c) {
      assert_near_relative(own[c], expected[c], 1e-12);
    }
  }
  assert_true(ef_observer_mb_scale(tritan).k_s == 0);
  ef_observer_free(normal);
  ef_observer_free(protan);
  ef_observer_free(deutan);
  ef_observer_free(tritan);
}

/* Lights that differ in the missing dimension only are one colour: their
 * tristimulus functions lie in a plane. */
static void dichromatic_functions_have_rank_two(void **state) {
  (void)state;
  const char *const names[] = {"protanope:field=3", "deuteranope:age=70",
                               "tritanope"};
  gen g = gen_new(12);
  for (size_t k = 0; k < 3; ++k) {
    ef_observer *const observer = make(names[k]);
    const ef_channels xyz = ef_observer_channels(observer, EF_TRISTIMULUS);
    const size_t n = xyz.grid.count;
    for (int round = 0; round < 200; ++round) {
      double m[9], size = 1;
      for (size_t j = 0; j < 3; ++j) {
        const size_t i = 40 + gen_below(&g, 300);
        double length = 0;
        for (size_t c = 0; c < 3; ++c) {
          m[3 * j + c] = xyz.value[c * n + i];
          length += fabs(m[3 * j + c]);
        }
        size *= length;
      }
      const double determinant =
          m[0] * (m[4] * m[8] - m[5] * m[7]) -
          m[1] * (m[3] * m[8] - m[5] * m[6]) +
          m[2] * (m[3] * m[7] - m[4] * m[6]);
      assert_near(determinant, 0, 1e-14 * size);
    }
    ef_observer_free(observer);
  }
}

/* Where the spectrum looks white. Protanopes 494, deuteranopes 499 nm and
 * tritanopes about 570 nm are the textbook values (from memory, after Pokorny,
 * Smith, Verriest & Pinckers 1979); they move by some nm with the white and
 * the macular pigment, so 6 nm are allowed. */
static void neutral_points_of_dichromats(void **state) {
  (void)state;
  const struct {
    const char *name;
    size_t one, other;
    double published_nm;
  } points[] = {{"protanope", M, S, 494}, {"deuteranope", L, S, 499},
                {"tritanope", L, M, 570}};
  for (size_t k = 0; k < 3; ++k) {
    ef_observer *const observer = make(points[k].name);
    const ef_channels cones = ef_observer_channels(observer, EF_CONES);
    const double *const a = cones.value + points[k].one * cones.grid.count;
    const double *const b = cones.value + points[k].other * cones.grid.count;
    double sum[3];
    sum_channels(observer, EF_CONES, sum);
    const double white = sum[points[k].one] / sum[points[k].other];
    size_t i = 450 - 360;
    while (a[i] / b[i] < white) ++i;
    printf("# %s: the spectrum looks like equal energy at %g nm\n",
           points[k].name, 360 + (double)i);
    assert_near(360 + (double)i, points[k].published_nm, 6);
    ef_observer_free(observer);
  }
}

/* At the limit the two long-wave flanks have met at half height. */
static void pigments_meet_at_the_largest_shift(void **state) {
  (void)state;
  ef__templates templates;
  assert_int_equal(ef__templates_read(&templates, NULL), EF_OK);
  double half_nm[2];
  for (size_t c = 0; c < 2; ++c) {
    half_nm[c] = 550;
    while (ef__curve_at(&templates.log10_absorbance[c], half_nm[c]) >
           log10(0.5)) {
      half_nm[c] += 0.01;
    }
  }
  printf("# half height of absorbance: L %.1f nm, M %.1f nm\n", half_nm[0],
         half_nm[1]);
  assert_near(half_nm[0] - half_nm[1], 32.3, 0.1);
}

/* ---- The view of a dichromat ------------------------------------------- */

static void spectral_lms(const ef_observer *observer, size_t nm,
                         double lms[3]) {
  const ef_channels cones = ef_observer_channels(observer, EF_CONES);
  for (size_t c = 0; c < 3; ++c) {
    lms[c] = cones.value[c * cones.grid.count + nm - 360];
  }
}

static void dichromat_view_keeps_what_is_seen(void **state) {
  (void)state;
  ef_observer *const observer = make("cie-2015-2");
  double neutral[3];
  sum_channels(observer, EF_CONES, neutral);
  const ef_deficiency kinds[3] = {EF_PROTANOPE, EF_DEUTERANOPE, EF_TRITANOPE};
  const size_t anchors[3][2] = {{475, 575}, {475, 575}, {485, 660}};
  gen g = gen_new(3);
  for (size_t k = 0; k < 3; ++k) {
    ef_dichromat_view view;
    double out[3], lms[3];
    assert_int_equal(
        ef_dichromat_view_make(kinds[k], observer, neutral, &view, NULL),
        EF_OK);
    ef_dichromat_view_apply(&view, neutral, out);
    for (size_t c = 0; c < 3; ++c) {
      assert_near_relative(out[c], neutral[c], 1e-13);
    }
    for (size_t side = 0; side < 2; ++side) {
      spectral_lms(observer, anchors[k][side], lms);
      ef_dichromat_view_apply(&view, lms, out);
      /* The missing excitation is recovered from the two others. */
      for (size_t c = 0; c < 3; ++c) assert_near(out[c], lms[c], 1e-12);
    }
    for (int round = 0; round < 100; ++round) {
      double once[3], twice[3];
      gen_fill(&g, 3, 0, 1, lms);
      ef_dichromat_view_apply(&view, lms, once);
      for (size_t c = 0; c < 3; ++c) {
        if (c != k) assert_true(once[c] == lms[c]);
      }
      memcpy(twice, once, sizeof twice);
      ef_dichromat_view_apply(&view, twice, twice); /* in place */
      assert_near_relative(twice[k], once[k], 1e-12);
      lms[k] = gen_unit(&g); /* what cannot be seen does not matter */
      ef_dichromat_view_apply(&view, lms, twice);
      assert_true(twice[k] == once[k]);
    }
  }
  ef_observer_free(observer);
}

static void dichromat_view_is_for_trichromats(void **state) {
  (void)state;
  ef_observer *const normal = make("cie-2015-2");
  ef_observer *const protan = make("protanope");
  const double neutral[3] = {1, 1, 1}, dark[3] = {1, 0, 1};
  ef_dichromat_view view;
  ef_error error;
  assert_int_equal(
      ef_dichromat_view_make(EF_TRICHROMAT, normal, neutral, &view, &error),
      EF_INVALID);
  assert_string_equal(error.message,
                      "a dichromat's view is drawn for the eyes of a "
                      "trichromat: two observers are needed, one of each");
  assert_int_equal(
      ef_dichromat_view_make(EF_PROTANOPE, protan, neutral, &view, &error),
      EF_INVALID);
  assert_int_equal(
      ef_dichromat_view_make(EF_PROTANOPE, normal, dark, &view, &error),
      EF_INVALID);
  assert_string_equal(error.message, "the neutral colour excites cone 2 by 0; "
                                     "all three must be above 0");
  ef_cone_model model = ef_cone_model_default();
  model.deficiency = EF_PROTANOPE;
  assert_int_equal(
      ef_cone_model_make_anomalous(&model, EF_DEUTERANOMALOUS, 5, &error),
      EF_INVALID);
  assert_string_equal(error.message,
                      "a protanope has no second pigment to shift one towards");
  ef_observer_free(normal);
  ef_observer_free(protan);
}

/* ---- Memory ------------------------------------------------------------ */

static bool make_observer(void *context) {
  ef_observer *const observer = ef_observer_new(context, NULL);
  ef_observer_free(observer);
  return observer != NULL;
}

static void observers_survive_a_lack_of_memory(void **state) {
  (void)state;
  char trichromat[] = "model:field=5", dichromat[] = "protanope";
  assert_true(fail_alloc_each(make_observer, trichromat) >= 4);
  assert_true(fail_alloc_each(make_observer, dichromat) >= 3);
}

static bool make_functions(void *context) {
  const ef_grid grid = {.count = 5, .start_nm = 400, .step_nm = 50};
  ef_error error;
  double value[15];
  const ef_status status =
      ef_cone_model_tristimulus(context, &grid, value, &error);
  if (status != EF_OK) assert_int_equal(status, EF_NO_MEMORY);
  return status == EF_OK;
}

static void functions_survive_a_lack_of_memory(void **state) {
  (void)state;
  ef_cone_model model = {
      .age_years = 32, .field_deg = 5, .deficiency = EF_TRITANOPE};
  assert_true(fail_alloc_each(make_functions, &model) >= 4);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(curve_returns_a_cubic),
      cmocka_unit_test(curve_goes_on_straight),
      cmocka_unit_test(fundamentals_have_unit_peaks),
      cmocka_unit_test(units_differ_by_wavelength),
      cmocka_unit_test(grids_agree),
      cmocka_unit_test(shift_is_along_wavelength),
      cmocka_unit_test(departures_act_where_they_should),
      cmocka_unit_test(ranges_are_held),
      cmocka_unit_test(names_make_models),
      cmocka_unit_test(models_make_names),
      cmocka_unit_test(wrong_names_are_answered),
      cmocka_unit_test(listed_names_are_taken),
      cmocka_unit_test(observer_is_what_the_model_says),
      cmocka_unit_test(tables_have_no_model),
      cmocka_unit_test(macleod_boynton_factor),
      cmocka_unit_test(dichromats_have_two_kinds_of_cones),
      cmocka_unit_test(dichromatic_functions_have_rank_two),
      cmocka_unit_test(neutral_points_of_dichromats),
      cmocka_unit_test(pigments_meet_at_the_largest_shift),
      cmocka_unit_test(dichromat_view_keeps_what_is_seen),
      cmocka_unit_test(dichromat_view_is_for_trichromats),
      cmocka_unit_test(observers_survive_a_lack_of_memory),
      cmocka_unit_test(functions_survive_a_lack_of_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
