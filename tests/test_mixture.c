/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Colourants, their mixtures and their fits: forms, names, and what is
 * refused. */
#include <stdlib.h>

#include <evenfield/exchange.h>

#include "fail_alloc.h"
#include "invented_paint.h"
#include "near.h"

enum { N = PAINT_SAMPLES };

/* ---- Layers and surfaces ------------------------------------------------ */

static void layers_by_hand(void **state) {
  (void)state;
  /* (1 - 0.5)^2 / (2 * 0.5) = 0.25, and back. */
  assert_near(ef_km_ratio(0.5), 0.25, 0);
  assert_near(ef_km_reflectance(0.25, 1, INFINITE, 0, NULL), 0.5, 1e-16);
  assert_near(ef_km_reflectance(0.5, 2, INFINITE, 0, NULL), 0.5, 1e-16);
  assert_true(isinf(ef_km_ratio(0)));
  assert_near(ef_km_ratio(1), 0, 0);
  assert_true(isnan(ef_km_ratio(1.01)));
  assert_true(isnan(ef_km_ratio(-0.01)));
  /* Nothing but scattering over black: 3 / (1 + 3). */
  assert_near(ef_km_reflectance(0, 1.5, 2, 0, NULL), 0.75, 1e-16);
  /* Nothing at all: the backing, or darkness without end. */
  assert_near(ef_km_reflectance(0, 0, 2, 0.37, NULL), 0.37, 1e-16);
  double slope[2];
  assert_near(ef_km_reflectance(0, 0, INFINITE, 0.37, slope), 0, 0);
  assert_near(slope[0], 0, 0);
  /* Thick and dark beyond what exp can hold. */
  assert_near(ef_km_reflectance(500, 0.1, 100, 0.9, slope),
              ef_km_reflectance(500, 0.1, INFINITE, 0, NULL), 1e-16);
  assert_true(isfinite(slope[0]) && isfinite(slope[1]));
}

static void surfaces_at_fault(void **state) {
  (void)state;
  ef_surface surface;
  ef_error error;
  assert_int_equal(ef_surface_from_index(0.9, true, &surface, NULL, &error),
                   EF_INVALID);
  assert_string_equal(error.message, "refractive index 0.9; expected 1 to 3");
  assert_int_equal(ef_surface_from_index(1, true, &surface, NULL, NULL), EF_OK);
  assert_near(surface.k1, 0, 0);
  assert_near(surface.k2, 0, 1e-15);
}

/* ---- Sets of colourants ------------------------------------------------- */

static void sets_are_copies(void **state) {
  (void)state;
  double k[PAINTS * N], sc[PAINTS * N], wavelength_nm[N];
  paint_constants(k, sc);
  for (size_t s = 0; s < N; s++)
    wavelength_nm[s] = 400 + 20 * (double)s + (s == 3);
  const ef_grid uneven = {N, 0, 0, wavelength_nm};
  ef_colourants *set = ef_colourants_new(PAINTS, NULL, &uneven, k, sc, NULL);
  const double kept = k[2 * N + 5];
  k[2 * N + 5] = 9;
  wavelength_nm[3] = 9;
  assert_int_equal(ef_colourants_count(set), PAINTS);
  assert_string_equal(ef_colourants_name(set, 3), "4");
  assert_null(ef_colourants_name(set, 4));
  assert_near(ef_grid_wavelength(ef_colourants_grid(set), 3), 461, 0);
  assert_near(ef_colourants_absorption(set, 2)[5], kept, 0);
  assert_near(ef_colourants_scattering(set, 1)[0], sc[N], 0);
  const size_t index[2] = {3, 2};
  ef_error error;
  ef_colourants *two = ef_colourants_pick(set, 2, index, &error);
  assert_int_equal(ef_colourants_count(two), 2);
  assert_string_equal(ef_colourants_name(two, 0), "4");
  assert_near(ef_colourants_absorption(two, 1)[5], kept, 0);
  const size_t beyond[1] = {4};
  assert_null(ef_colourants_pick(set, 1, beyond, &error));
  assert_string_equal(error.message, "colourant 5 of 4");
  assert_null(ef_colourants_pick(set, 0, beyond, &error));
  ef_colourants_free(two);
  ef_colourants_free(set);
  ef_colourants_free(NULL);
}

static void sets_are_found_by_name(void **state) {
  (void)state;
  ef_colourants *set = paint_colourants(true);
  size_t index;
  ef_error error;
  assert_int_equal(ef_colourants_find(set, "Yellow", &index, NULL), EF_OK);
  assert_int_equal(index, 2);
  assert_int_equal(ef_colourants_find(set, "yelow", &index, &error),
                   EF_UNKNOWN_NAME);
  assert_string_equal(error.message, "no colourant is called 'yelow'; near "
                                     "names: yellow");
  ef_colourants_free(set);
}

static void sets_at_fault(void **state) {
  (void)state;
  double k[PAINTS * N], sc[PAINTS * N];
  const ef_grid grid = paint_grid();
  ef_error error;
  paint_constants(k, sc);
  k[2 * N + 5] = -0.001;
  assert_null(ef_colourants_new(PAINTS, paint_names, &grid, k, sc, &error));
  assert_int_equal(error.status, EF_INVALID);
  assert_string_equal(error.message,
                      "the absorption of 'yellow' at 500 nm is -0.001; "
                      "expected a finite number, zero or more");
  assert_null(ef_colourants_new(PAINTS, paint_names, &grid, k, NULL, &error));
  assert_string_equal(error.message,
                      "K/S of 'yellow' at 500 nm is -0.001; expected a finite "
                      "number, zero or more");
  k[2 * N + 5] = 0.1;
  sc[0] = INFINITE;
  assert_null(ef_colourants_new(PAINTS, NULL, &grid, k, sc, &error));
  assert_string_equal(error.message,
                      "the scattering of '1' at 400 nm is inf; expected a "
                      "finite number, zero or more");
  assert_null(ef_colourants_new(17, NULL, &grid, k, sc, &error));
  assert_string_equal(error.message, "17 colourants; a set has 1 to 16");
  assert_null(ef_colourants_new(1, NULL, NULL, k, sc, &error));
  assert_string_equal(error.message,
                      "colourants need a grid and their absorption");
}

/* Spectra of these names, all flat; the k-th has the value k + 1. */
static ef_colourants *from_names(size_t n, const char *const *names,
                                 ef_error *error) {
  double value[3 * 40];
  const ef_grid grid = {3, 400, 100, NULL};
  for (size_t i = 0; i < 3 * n; i++)
    value[i] = (double)(1 + i / 3);
  ef_spectra *spectra = ef_spectra_new(n, names, &grid, EF_LIGHT, value, error);
  assert_non_null(spectra);
  ef_colourants *set = ef_colourants_from_spectra(spectra, error);
  ef_spectra_free(spectra);
  return set;
}

static void sets_from_spectra(void **state) {
  (void)state;
  static const char *const pairs[] = {"rust_red_S", "white_k", "white_s",
                                      "Rust_Red_k"};
  static const char *const ratios[] = {"a_ks", "b_KS"};
  ef_error error;
  ef_colourants *set = from_names(4, pairs, &error);
  assert_int_equal(ef_colourants_count(set), 2);
  assert_string_equal(ef_colourants_name(set, 0), "rust_red");
  assert_near(ef_colourants_absorption(set, 0)[1], 4, 0);
  assert_near(ef_colourants_scattering(set, 0)[1], 1, 0);
  assert_near(ef_colourants_absorption(set, 1)[1], 2, 0);
  ef_colourants_free(set);
  set = from_names(2, ratios, &error);
  assert_int_equal(ef_colourants_count(set), 2);
  assert_null(ef_colourants_scattering(set, 0));
  assert_near(ef_colourants_absorption(set, 1)[2], 2, 0);
  ef_colourants_free(set);
}

static void refuse_names(size_t n, const char *const *names,
                         const char *message) {
  ef_error error = {0};
  assert_null(from_names(n, names, &error));
  assert_int_equal(error.status, EF_MALFORMED);
  assert_string_equal(error.message, message);
}

static void spectra_at_fault(void **state) {
  (void)state;
  static const char *const plain[] = {"white_k", "white_s", "red"};
  refuse_names(3, plain,
               "spectrum 'red' is neither NAME_k, NAME_s nor NAME_ks: "
               "colourants are given by pairs of absorption and scattering, or "
               "by their ratio");
  static const char *const half[] = {"white_k", "white_s", "red_k"};
  refuse_names(3, half, "'red' has no spectrum red_s beside red_k");
  static const char *const other_half[] = {"white_s"};
  refuse_names(1, other_half, "'white' has no spectrum white_k beside white_s");
  static const char *const twice[] = {"white_k", "White_K"};
  refuse_names(2, twice, "spectrum 'White_K' is there twice (case is ignored)");
  static const char *const both[] = {"white_ks", "red_k", "red_s"};
  refuse_names(3, both,
               "'red' is given by K and S, 'white' otherwise; give "
               "all colourants in one way");
  static const char *const mixed[] = {"white_ks", "white_k"};
  refuse_names(2, mixed, "'white' is given by K/S and by K; keep one");
  static const char *const no_head[] = {"_k"};
  refuse_names(1, no_head,
               "spectrum '_k' is neither NAME_k, NAME_s nor NAME_ks: "
               "colourants are given by pairs of absorption and scattering, or "
               "by their ratio");
  char name[17][8];
  const char *names[17];
  for (int i = 0; i < 17; i++) {
    snprintf(name[i], sizeof name[i], "c%d_ks", i);
    names[i] = name[i];
  }
  refuse_names(17, names, "more than 16 colourants; leave some out");
}

/* ---- Mixtures ----------------------------------------------------------- */

static void mixtures_have_names(void **state) {
  (void)state;
  ef_colourants *set = paint_colourants(true);
  ef_mixture_settings settings = ef_mixture_settings_default();
  settings.base = PAINT_WHITE;
  settings.total_loading = 0.3;
  ef_device *device = ef_mixture_new("livery", set, &settings, NULL);
  ef_colourants_free(set);
  assert_string_equal(ef_device_kind(device), "mixture");
  assert_true(ef_device_reflects(device));
  assert_int_equal(ef_device_n_drives(device), 3);
  assert_string_equal(ef_device_drive_name(device, 0), "red");
  assert_string_equal(ef_device_limit_name(device, 1, false), "yellow at zero");
  assert_string_equal(ef_device_limit_name(device, 1, true), "total loading");
  assert_int_equal(ef_mixture_count(device), 4);
  assert_string_equal(ef_mixture_name(device, 0), "white");
  assert_string_equal(ef_mixture_name(device, 3), "blue");
  assert_null(ef_mixture_name(device, 4));
  assert_int_equal(ef_mixture_base(device), PAINT_WHITE);
  assert_near(ef_mixture_total_loading(device), 0.3, 0);
  const double drive[3] = {0.5, 0.5, 0.5};
  double c[4], back[3];
  assert_int_equal(ef_mixture_concentrations(device, drive, c, NULL), EF_OK);
  assert_near(c[1], 0.15, 1e-16);
  assert_near(c[2], 0.075, 1e-16);
  assert_near(c[3], 0.0375, 1e-16);
  assert_near(c[0], 0.7375, 1e-15);
  assert_int_equal(ef_mixture_drives(device, c, back, NULL), EF_OK);
  assert_near(back[2], 0.5, 1e-14);
  ef_device_free(device);
}

static void concentrations_at_fault(void **state) {
  (void)state;
  ef_colourants *set = paint_colourants(true);
  ef_mixture_settings settings = ef_mixture_settings_default();
  settings.base = PAINT_WHITE;
  settings.total_loading = 0.3;
  ef_device *device = ef_mixture_new("livery", set, &settings, NULL);
  ef_colourants_free(set);
  double drive[3] = {0.5, NOT_A_NUMBER, 0}, c[4], r[N];
  ef_error error;
  assert_int_equal(ef_mixture_concentrations(device, drive, c, &error),
                   EF_INVALID);
  assert_string_equal(error.message, "the drive of yellow is not finite");
  const double negative[4] = {1, 0.1, -0.1, 0};
  assert_int_equal(ef_mixture_drives(device, negative, drive, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "the concentration of yellow is -0.1; expected zero or "
                      "more");
  assert_int_equal(ef_mixture_spectrum(device, negative, r, NULL, &error),
                   EF_INVALID);
  const double much[4] = {1, 0.1, 0.15, 0.06};
  assert_int_equal(ef_mixture_drives(device, much, drive, &error), EF_INVALID);
  assert_string_equal(error.message,
                      "the colourants sum to more than the total loading of "
                      "0.3");
  const double all[4] = {0, 0.3, 0, 0};
  assert_int_equal(ef_mixture_drives(device, all, drive, &error), EF_OK);
  assert_near(drive[0], 1, 0);
  assert_near(drive[1], 0, 0);
  ef_device_free(device);
}

static void other_devices_are_no_mixtures(void **state) {
  (void)state;
  double c[4] = {0}, drive[3] = {0};
  ef_error error;
  ef_device *device = ef_display_from_encoding("srgb", NULL, NULL);
  assert_int_equal(ef_mixture_count(device), 0);
  assert_null(ef_mixture_name(device, 0));
  assert_true(ef_mixture_base(device) == SIZE_MAX);
  assert_true(isnan(ef_mixture_total_loading(device)));
  assert_true(isnan(ef_halftone_n(device)));
  assert_int_equal(ef_mixture_concentrations(device, drive, c, &error),
                   EF_INVALID);
  assert_string_equal(error.message, "'srgb' (display) is no mixture");
  assert_int_equal(ef_mixture_drives(device, c, drive, &error), EF_INVALID);
  assert_int_equal(ef_mixture_spectrum(device, c, drive, NULL, &error),
                   EF_INVALID);
  ef_device_free(device);
}

static void refuse_mixture(const ef_colourants *set,
                           ef_mixture_settings settings, const char *message) {
  ef_error error = {0};
  assert_null(ef_mixture_new("livery", set, &settings, &error));
  assert_int_equal(error.status, EF_INVALID);
  assert_string_equal(error.message, message);
}

static void settings_at_fault(void **state) {
  (void)state;
  double substrate[N];
  ef_colourants *set = paint_colourants(true);
  ef_colourants *single = paint_colourants(false);
  ef_mixture_settings good = ef_mixture_settings_default();
  good.base = PAINT_WHITE;
  ef_mixture_settings s = good;
  s.base = 4;
  refuse_mixture(set, s, "the base is colourant 5 of 4");
  s.base = SIZE_MAX;
  refuse_mixture(set, s,
                 "opaque mixtures need a base, which the others are added to");
  refuse_mixture(single, s,
                 "mixtures in single-constant theory need a base, which the "
                 "others are added to");
  s = good;
  s.total_loading = 1.2;
  refuse_mixture(set, s,
                 "total loading 1.2; expected a number above zero and "
                 "at most 1, as the base is the rest");
  s.total_loading = 0;
  refuse_mixture(single, s, "total loading 0; expected a number above zero");
  s = good;
  s.thickness = -1;
  refuse_mixture(set, s, "film thickness -1; expected a number above zero");
  s.thickness = 0.5;
  refuse_mixture(set, s, "a film needs the reflectance of what it lies on");
  s = good;
  s.substrate = substrate;
  paint_substrate(true, substrate);
  refuse_mixture(set, s,
                 "an opaque layer hides what it lies on; give the "
                 "thickness of the film");
  s.thickness = 0.5;
  substrate[2] = 83;
  refuse_mixture(set, s,
                 "the substrate reflects 83 at 440 nm; expected 0 to "
                 "1");
  s = good;
  s.surface.k2 = 1;
  refuse_mixture(set, s,
                 "surface constants k1 = 0, k2 = 1; expected 0 or more and "
                 "below 1");
  const size_t alone[1] = {0};
  ef_colourants *one = ef_colourants_pick(set, 1, alone, NULL);
  refuse_mixture(one, good,
                 "0 colourants beside the base; a mixture has 1 to "
                 "8");
  double k[2 * N] = {0}, sc[2 * N];
  for (size_t j = 0; j < 2 * N; j++)
    sc[j] = j == 7 ? 0 : 0.2;
  const ef_grid grid = paint_grid();
  ef_colourants *clear = ef_colourants_new(2, paint_names, &grid, k, sc, NULL);
  refuse_mixture(clear, good,
                 "the base 'white' does not scatter at 540 nm, so an opaque "
                 "layer of it has no reflectance");
  ef_colourants_free(clear);
  ef_colourants_free(one);
  ef_colourants_free(single);
  ef_colourants_free(set);
}

/* ---- Fits --------------------------------------------------------------- */

enum { ROWS = 3 };

typedef struct samples {
  double concentration[ROWS * 2];
  double thickness[ROWS];
  double backing[ROWS * 2];
  double reflectance[ROWS * 2];
  size_t line[ROWS];
} samples;

static samples good_samples(void) {
  const samples s = {.concentration = {1, 0, 0.5, 0.5, 0.8, 0.2},
                     .thickness = {INFINITE, INFINITE, INFINITE},
                     .backing = {0.1, 0.1, 0.9, 0.9, 0.9, 0.9},
                     .reflectance = {0.9, 0.8, 0.3, 0.5, 0.4, 0.6},
                     .line = {7, 8, 9}};
  return s;
}

static ef_drawdowns view(const samples *s) {
  const ef_drawdowns d = {.n_drawdowns = ROWS,
                          .n_colourants = 2,
                          .name = paint_names,
                          .concentration = s->concentration,
                          .thickness = s->thickness,
                          .backing = s->backing,
                          .reflectance = s->reflectance,
                          .grid = {2, 500, 100, NULL},
                          .line = s->line};
  return d;
}

static void refuse_fit(const ef_drawdowns *d,
                       ef_colourant_fit_settings settings, ef_status status,
                       const char *message, size_t line) {
  ef_error error = {0};
  assert_null(ef_colourants_fit(d, &settings, NULL, &error));
  assert_int_equal(error.status, status);
  assert_string_equal(error.message, message);
  assert_int_equal(error.line, line);
}

static void drawdowns_at_fault(void **state) {
  (void)state;
  samples s = good_samples();
  ef_drawdowns d = view(&s);
  const ef_colourant_fit_settings plain = ef_colourant_fit_settings_default();
  ef_colourant_fit_settings settings = plain;
  ef_colourants *fitted = ef_colourants_fit(&d, NULL, NULL, NULL);
  assert_non_null(fitted);
  ef_colourants_free(fitted);
  d.n_drawdowns = 0;
  refuse_fit(&d, plain, EF_INVALID, "a table without drawdowns", 0);
  d = view(&s);
  d.n_colourants = 17;
  refuse_fit(&d, plain, EF_INVALID, "17 colourants; a set has 1 to 16", 0);
  d = view(&s);
  settings.base = 2;
  refuse_fit(&d, settings, EF_INVALID, "the base is colourant 3 of 2", 0);
  settings = plain;
  settings.single_constant = true;
  refuse_fit(&d, settings, EF_INVALID,
             "single-constant theory needs a base, which the others are added "
             "to",
             0);
  settings = plain;
  settings.least_reflectance = 0;
  refuse_fit(&d, settings, EF_INVALID,
             "least reflectance 0; expected above 0 and at most 1", 0);
  s.concentration[3] = -0.5;
  refuse_fit(&d, plain, EF_INVALID,
             "drawdown 2: concentration -0.5, expected zero or more", 8);
  s.concentration[3] = 0;
  s.concentration[2] = 0;
  refuse_fit(&d, plain, EF_INVALID, "drawdown 2 holds no colourant", 8);
  s = good_samples();
  s.reflectance[5] = 60;
  refuse_fit(&d, plain, EF_INVALID,
             "drawdown 3: reflectance 60 at 600 nm, expected 0 to 1", 9);
  s = good_samples();
  s.thickness[1] = 0;
  refuse_fit(&d, plain, EF_INVALID,
             "drawdown 2: thickness 0, expected above zero", 8);
  s.thickness[1] = 0.7;
  s.backing[2] = -0.2;
  refuse_fit(&d, plain, EF_INVALID,
             "drawdown 2: backing -0.2 at 500 nm, expected 0 to 1", 8);
  d.backing = NULL;
  refuse_fit(&d, plain, EF_INVALID,
             "drawdown 2: thickness 0.7, but the reflectance of what it lies "
             "on is not given",
             8);
  settings.least_reflectance = 0.01;
  settings.single_constant = true;
  settings.base = 0;
  refuse_fit(&d, settings, EF_INVALID,
             "drawdown 2: thickness 0.7, but single-constant theory is fitted "
             "to opaque ones",
             8);
}

static void too_few_drawdowns(void **state) {
  (void)state;
  samples s = good_samples();
  ef_drawdowns d = view(&s);
  ef_colourant_fit_settings settings = ef_colourant_fit_settings_default();
  d.n_drawdowns = 2;
  settings.base = PAINT_WHITE;
  refuse_fit(&d, settings, EF_NO_ANSWER,
             "colourant 'red' stands in 1 drawdown; 2 of different "
             "compositions are needed to tell its absorption from its "
             "scattering",
             0);
  d.n_drawdowns = 1;
  settings.single_constant = true;
  refuse_fit(&d, settings, EF_NO_ANSWER,
             "colourant 'red' stands in 0 drawdowns; 1 is needed", 0);
}

/* Values that no mixture can have are met as nearly as unknowns that may not
 * be negative allow. */
static void impossible_drawdowns_are_fitted(void **state) {
  (void)state;
  samples s = good_samples();
  s.reflectance[0] = 0.2; /* of the white alone, darker than its tints */
  s.reflectance[1] = 0;
  const ef_drawdowns d = view(&s);
  double rms[ROWS];
  ef_colourants *fitted = ef_colourants_fit(&d, NULL, rms, NULL);
  assert_non_null(fitted);
  for (size_t i = 0; i < 2; i++)
    for (size_t k = 0; k < 2; k++) {
      assert_true(ef_colourants_absorption(fitted, i)[k] >= 0);
      assert_true(ef_colourants_scattering(fitted, i)[k] >= 0);
    }
  assert_true(rms[0] >= 0 && isfinite(rms[0]));
  ef_colourants_free(fitted);
}

/* ---- The demo ----------------------------------------------------------- */

/* The pastes of the scenario make sensible paint: the white is light and
 * neutral, the blue alone dark and blue. */
static void livery_colourants(void **state) {
  (void)state;
  ef_reader_settings reading = ef_reader_settings_default();
  reading.kind = EF_KIND_LIGHT; /* absorption has no upper limit */
  ef_error error;
  ef_spectra *spectra =
      ef_spectra_read("demo:livery-colourants", &reading, &error);
  if (spectra == NULL)
    fail_msg("%s", error.message);
  ef_colourants *set = ef_colourants_from_spectra(spectra, &error);
  if (set == NULL)
    fail_msg("%s", error.message);
  assert_int_equal(ef_colourants_count(set), 4);
  assert_string_equal(ef_colourants_name(set, 3), "blue");
  ef_mixture_settings settings = ef_mixture_settings_default();
  assert_int_equal(ef_colourants_find(set, "white", &settings.base, NULL),
                   EF_OK);
  ef_device *device = ef_mixture_new("livery paint", set, &settings, &error);
  assert_non_null(device);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  ef_setup *setup = ef_setup_new(device, observer, d65, NULL, &error);
  const double none[3] = {0}, blue[3] = {0, 0, 1};
  const ef_xyz light = ef_setup_xyz(setup, none, NULL);
  const ef_xyz dark = ef_setup_xyz(setup, blue, NULL);
  const ef_lab light_lab = ef_xyz_to_lab(light, ef_setup_white(setup));
  const ef_lab dark_lab = ef_xyz_to_lab(dark, ef_setup_white(setup));
  printf("# white: L* %.1f a* %.1f b* %.1f; blue: L* %.1f a* %.1f b* %.1f\n",
         light_lab.L_star, light_lab.a_star, light_lab.b_star, dark_lab.L_star,
         dark_lab.a_star, dark_lab.b_star);
  assert_true(light_lab.L_star > 95 && fabs(light_lab.b_star) < 5);
  assert_true(dark_lab.L_star < 45 && dark_lab.b_star < -30);
  ef_setup_free(setup);
  ef_illuminant_free(d65);
  ef_observer_free(observer);
  ef_device_free(device);
  ef_colourants_free(set);
  ef_spectra_free(spectra);
}

/* ---- Memory ------------------------------------------------------------- */

static bool attempt(void *context) {
  (void)context;
  const samples s = good_samples();
  const ef_drawdowns d = view(&s);
  ef_mixture_settings settings = ef_mixture_settings_default();
  settings.base = 0;
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  ef_colourants *set = ef_colourants_fit(&d, NULL, NULL, NULL);
  const size_t both[2] = {0, 1};
  ef_colourants *two =
      set != NULL ? ef_colourants_pick(set, 2, both, NULL) : NULL;
  ef_device *device =
      two != NULL ? ef_mixture_new("livery", two, &settings, NULL) : NULL;
  ef_setup *setup = NULL;
  if (device != NULL && observer != NULL && d65 != NULL)
    setup = ef_setup_new(device, observer, d65, NULL, NULL);
  const bool whole = setup != NULL;
  ef_setup_free(setup);
  ef_device_free(device);
  ef_colourants_free(two);
  ef_colourants_free(set);
  ef_illuminant_free(d65);
  ef_observer_free(observer);
  return whole;
}

static void no_memory(void **state) {
  (void)state;
  assert_true(fail_alloc_each(attempt, NULL) > 15);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(layers_by_hand),
      cmocka_unit_test(surfaces_at_fault),
      cmocka_unit_test(sets_are_copies),
      cmocka_unit_test(sets_are_found_by_name),
      cmocka_unit_test(sets_at_fault),
      cmocka_unit_test(sets_from_spectra),
      cmocka_unit_test(spectra_at_fault),
      cmocka_unit_test(mixtures_have_names),
      cmocka_unit_test(concentrations_at_fault),
      cmocka_unit_test(other_devices_are_no_mixtures),
      cmocka_unit_test(settings_at_fault),
      cmocka_unit_test(drawdowns_at_fault),
      cmocka_unit_test(too_few_drawdowns),
      cmocka_unit_test(impossible_drawdowns_are_fitted),
      cmocka_unit_test(livery_colourants),
      cmocka_unit_test(no_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
