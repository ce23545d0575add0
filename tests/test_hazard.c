/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What reaches the eye, and cautions: published figures, small cases by hand,
 * what is refused. Figures of WCAG and ITU-R BT.1702 are those of
 * practice: 3 flashes in a second, 0.10, 0.80, 0.006 sr, 20 and 160 cd/m2,
 * 25 %, red 0.8 and 0.2 u'v'. */
#include <stdlib.h>

#include "invented_display.h"
#include "invented_stimulator.h"
#include "near.h"

/* ---- Pupil and trolands ------------------------------------------------- */

static double diameter(ef_pupil_formula formula, double luminance_cd_m2,
                       double field_deg2, double age, bool both) {
  const ef_pupil pupil = {formula, 4.5, age, field_deg2, both};
  double out = 0;
  ef_error error;
  if (ef_pupil_diameter(&pupil, luminance_cd_m2, &out, &error) != EF_OK)
    fail_msg("%s", error.message);
  return out;
}

/* From memory: Moon & Spencer run from 7.9 to 1.9 mm through 4.9 at 1 cd/m2;
 * Stanley & Davies from 7.75 to 2 mm, half-way where (F / 846)^0.41 is 2;
 * Watson & Yellott equal them at 28.58 years for both eyes, and one eye is a
 * tenth of the light. */
static void pupils_of_the_formulas(void **state) {
  (void)state;
  assert_near(diameter(EF_PUPIL_MOON_SPENCER, 1, 1, 0, true), 4.9, 1e-15);
  assert_near(diameter(EF_PUPIL_MOON_SPENCER, 1e12, 1, 0, true), 1.9, 1e-3);
  assert_near(diameter(EF_PUPIL_MOON_SPENCER, 1e-12, 1, 0, true), 7.9, 1e-3);
  const double half = 846 * pow(2, 1 / 0.41);
  assert_near(diameter(EF_PUPIL_STANLEY_DAVIES, half, 1, 0, true), 4.875,
              1e-12);
  assert_near(diameter(EF_PUPIL_STANLEY_DAVIES, half / 40, 40, 0, true), 4.875,
              1e-12);
  assert_near(diameter(EF_PUPIL_STANLEY_DAVIES, 1e-20, 1, 0, true), 7.75, 1e-6);
  assert_near(diameter(EF_PUPIL_WATSON_YELLOTT, 30, 12, 28.58, true),
              diameter(EF_PUPIL_STANLEY_DAVIES, 30, 12, 0, true), 1e-14);
  assert_near(diameter(EF_PUPIL_WATSON_YELLOTT, 30, 12, 28.58, false),
              diameter(EF_PUPIL_STANLEY_DAVIES, 3, 12, 0, true), 1e-12);
  assert_true(diameter(EF_PUPIL_WATSON_YELLOTT, 30, 12, 70, true) <
              diameter(EF_PUPIL_WATSON_YELLOTT, 30, 12, 25, true));
  assert_near(diameter(EF_PUPIL_GIVEN, 30, 12, 70, true), 4.5, 0);
  ef_pupil_formula formula;
  assert_int_equal(ef_pupil_find("watson-yellott", &formula, NULL), EF_OK);
  assert_int_equal(formula, EF_PUPIL_WATSON_YELLOTT);
  assert_non_null(strstr(ef_pupil_source(formula), "J. Vision 12(10) (2012)"));
  ef_error error;
  double out;
  ef_pupil pupil = ef_pupil_default();
  pupil.age_years = 12;
  assert_int_equal(ef_pupil_diameter(&pupil, 10, &out, &error), EF_INVALID);
  assert_string_equal(error.message,
                      "an age of 12 years; the pupil formula takes 20 to 83");
  pupil.formula = EF_PUPIL_GIVEN;
  pupil.diameter_mm = 12;
  assert_int_equal(ef_pupil_diameter(&pupil, 10, &out, &error), EF_INVALID);
  assert_string_equal(error.message, "a pupil of 12 mm; expected 1 to 10");
  assert_int_equal(ef_pupil_diameter(&pupil, 0, &out, &error), EF_INVALID);
  assert_string_equal(error.message, "a luminance of 0 cd/m2 for the pupil; "
                                     "expected more than 0");
}

/* A troland is 1 cd/m2 through 1 mm2. */
static void trolands_and_alpha_opic_irradiance(void **state) {
  (void)state;
  invented i = invented_new(4, "cie-1931");
  const double amount[4] = {0.3, 0.6, 0.2, 0.9};
  ef_pupil pupil = ef_pupil_default();
  pupil.formula = EF_PUPIL_GIVEN;
  pupil.diameter_mm = 3;
  ef_retinal out;
  ef_error error;
  if (ef_retinal_measure(i.stimulator, amount, &pupil, 60, NULL, &out,
                         &error) != EF_OK)
    fail_msg("%s", error.message);
  assert_near(out.pupil_area_mm2, 7.0685834705770345, 1e-14);
  assert_near_relative(out.photopic_td,
                       7.0685834705770345 * out.luminance_cd_m2, 1e-14);
  assert_near_relative(out.luminance_cd_m2,
                       ef_stimulator_luminance_cd_m2(i.stimulator, amount),
                       1e-14);
  assert_near_relative(out.radiance.photopic, out.luminance_cd_m2, 1e-12);
  /* pi sin^2 30 degrees = pi / 4 */
  for (size_t r = 0; r < EF_N_RECEPTORS; r++) {
    assert_near_relative(out.irradiance_w_m2[r],
                         0.78539816339744831 * out.radiance.quantity[r], 1e-13);
    assert_near_relative(out.equivalent_d65_lx[r],
                         1000 * out.irradiance_w_m2[r] /
                             ef_alpha_opic_d65_mw_lm((ef_receptor)r),
                         1e-13);
  }
  assert_int_equal(
      ef_retinal_measure(i.stimulator, amount, &pupil, 200, NULL, &out, &error),
      EF_INVALID);
  assert_string_equal(error.message, "a field of 200 degrees; expected more "
                                     "than 0 and at most 180");
  invented_free(&i);
  ef_device *device = invented_display(false);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_stimulator *s = ef_stimulator_new(device, observer, NULL, NULL, NULL);
  assert_int_equal(
      ef_retinal_measure(s, amount, &pupil, 10, NULL, &out, &error),
      EF_NO_ANSWER);
  assert_string_equal(error.message,
                      "the spectra of 'kiosk' have no absolute unit, so what "
                      "reaches the eye is not known; measure W sr-1 m-2 nm-1");
  ef_stimulator_free(s);
  ef_observer_free(observer);
  ef_device_free(device);
}

/* ---- Flashes ------------------------------------------------------------ */

enum { RATE = 60, FRAMES = 120 };

/* A square wave between two greys, 60 frames a second for 2 s. */
static ef_flash flicker(double hz, double low, double high, double white_cd_m2,
                        double sr, double share) {
  double xyz[3 * FRAMES];
  for (size_t k = 0; k < FRAMES; k++) {
    const double cycles = ((double)k + 0.5) * hz / RATE;
    const double y = cycles - floor(cycles) < 0.5 ? high : low;
    xyz[3 * k] = 0.9505 * y;
    xyz[3 * k + 1] = y;
    xyz[3 * k + 2] = 1.089 * y;
  }
  const ef_flash_input input = {FRAMES, RATE,  xyz, white_cd_m2,
                                sr,     share, 0,   false};
  ef_flash out;
  assert_int_equal(ef_flash_count(&input, &out, NULL), EF_OK);
  return out;
}

static void flashes_are_counted(void **state) {
  (void)state;
  ef_flash f = flicker(3, 0.2, 0.6, 100, 0.1, 1);
  assert_int_equal(f.n_general, 3);
  assert_int_equal(f.n_television, 3);
  assert_int_equal(f.n_red, 0);
  assert_false(f.exceeds_general || f.exceeds_television || f.exceeds_red);
  f = flicker(10, 0.2, 0.6, 100, 0.1, 1);
  assert_int_equal(f.n_general, 10);
  assert_true(f.exceeds_general && f.exceeds_television);
  f = flicker(10, 0.2, 0.6, 100, 0.005, 0.2); /* small */
  assert_false(f.exceeds_general || f.exceeds_television);
  f = flicker(10, 0.2, 0.6, 100, 0.005, 0.3);
  assert_false(f.exceeds_general);
  assert_true(f.exceeds_television);
  assert_int_equal(flicker(10, 0.50, 0.59, 100, 1, 1).n_general, 0);
  assert_int_equal(flicker(10, 0.50, 0.61, 100, 1, 1).n_general, 10);
  assert_int_equal(flicker(10, 0.81, 0.95, 100, 1, 1).n_general, 0);
  assert_int_equal(flicker(10, 0.50, 0.69, 100, 1, 1).n_television, 0);
  assert_int_equal(flicker(10, 0.50, 0.71, 100, 1, 1).n_television, 10);
  /* From 160 cd/m2 on 1/17 of the sum: 8/9 of the lighter one. */
  assert_int_equal(flicker(10, 0.50, 0.5624, 400, 1, 1).n_television, 0);
  assert_int_equal(flicker(10, 0.50, 0.5626, 400, 1, 1).n_television, 10);
  assert_int_equal(flicker(10, 0.50, 0.71, 400, 1, 1).n_television, 10);
  /* The two rules are one at 160: 180. */
  assert_int_equal(flicker(10, 0.1599, 0.1798, 1000, 1, 1).n_television, 0);
  assert_int_equal(flicker(10, 0.1599, 0.18, 1000, 1, 1).n_television, 10);
  assert_int_equal(flicker(10, 0.1601, 0.1800, 1000, 1, 1).n_television, 0);
  assert_int_equal(flicker(10, 0.1601, 0.1802, 1000, 1, 1).n_television, 10);
  f = flicker(10, 0.2, 0.6, (double)NAN, 1, 1);
  assert_false(f.has_luminance);
  assert_int_equal(f.n_television, 0);
}

/* Wide, but spread out or fine: WCAG looks at any field of 10 degrees, and
 * leaves out balanced patterns under 0.1 degree. */
static void area_and_fineness_count(void **state) {
  (void)state;
  double xyz[3 * FRAMES];
  for (size_t k = 0; k < FRAMES; k++)
    for (int c = 0; c < 3; c++)
      xyz[3 * k + (size_t)c] = (k / 3) % 2 ? 0.6 : 0.2;
  ef_flash_input input = {FRAMES, RATE, xyz, 100, 0.1, 1, 0, false};
  ef_flash out;
  assert_int_equal(ef_flash_count(&input, &out, NULL), EF_OK);
  assert_true(out.exceeds_general && out.exceeds_television);
  assert_near(out.in_ten_deg_sr, 0.1, 0);
  input.in_ten_deg_sr = 0.005;
  assert_int_equal(ef_flash_count(&input, &out, NULL), EF_OK);
  assert_false(out.exceeds_general);
  assert_true(out.exceeds_television);
  input.in_ten_deg_sr = 0.02;
  input.is_fine = true;
  assert_int_equal(ef_flash_count(&input, &out, NULL), EF_OK);
  assert_false(out.exceeds_general);
  assert_true(out.exceeds_television);
  assert_false(out.is_long);
  input.frame_rate_hz = RATE / 10.0;
  assert_int_equal(ef_flash_count(&input, &out, NULL), EF_OK);
  assert_true(out.is_long);
}

/* The red of IEC 61966-2-1 against its green, of one luminance. */
static void saturated_red_is_counted(void **state) {
  (void)state;
  static const double red[3] = {0.4124, 0.2126, 0.0193};
  static const double grey[3] = {0.2021, 0.2126, 0.2315};
  double xyz[3 * FRAMES];
  for (int with_red = 0; with_red < 2; with_red++) {
    for (size_t k = 0; k < FRAMES; k++)
      memcpy(xyz + 3 * k, (k / 6) % 2 && with_red ? red : grey, sizeof red);
    const ef_flash_input input = {FRAMES, RATE, xyz, 100, 0.02, 1, 0, false};
    ef_flash out;
    assert_int_equal(ef_flash_count(&input, &out, NULL), EF_OK);
    assert_int_equal(out.n_general, 0); /* no luminance changes */
    assert_int_equal(out.n_red, with_red ? 5 : 0);
    assert_int_equal(out.exceeds_red, with_red);
  }
  ef_flash out;
  ef_error error;
  const ef_flash_input none = {0, RATE, xyz, 100, 0.02, 1, 0, false};
  assert_int_equal(ef_flash_count(&none, &out, &error), EF_INVALID);
  assert_string_equal(error.message, "0 frames at 60 Hz; expected at least 1, "
                                     "and a rate above 0");
  xyz[4] = INFINITE;
  const ef_flash_input bad = {FRAMES, RATE, xyz, 100, 0.02, 1, 0, false};
  assert_int_equal(ef_flash_count(&bad, &out, &error), EF_INVALID);
  assert_string_equal(error.message, "frame 2 has no finite colour");
}

static void frames_flash_as_their_waveform(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  ef_isolation way;
  ef_isolate_settings settings = ef_isolate_settings_default();
  const ef_direction direction = invented_direction("luminance", "");
  assert_int_equal(ef_isolate(i.stimulator, &direction, &settings, &way, NULL),
                   EF_OK);
  ef_frame_settings s = ef_frame_settings_default();
  s.width_px = 320;
  s.height_px = 180;
  s.pattern = EF_PATTERN_UNIFORM;
  s.waveform.kind = EF_WAVEFORM_SINUSOID;
  s.waveform.frequency_hz = 5;
  s.waveform.duration_s = 2;
  ef_frames *frames = ef_frames_new(i.stimulator, &way, &s, NULL, NULL);
  ef_flash out;
  assert_int_equal(ef_frames_flash(frames, &out, NULL), EF_OK);
  assert_int_equal(out.n_general, 5);
  assert_true(out.exceeds_general);
  assert_near(out.share_of_frame, 1.0, 1e-9);
  ef_frames_free(frames);
  invented_free(&i);
}

/* A disc within the circle counts whole, a wider one as the circle, an annulus
 * by what of it a circle can hold; never less than is there. */
static void most_in_ten_degrees(void **state) {
  (void)state;
  const double circle_sr =
      2 * 3.14159265358979323846 * (1 - cos(5 * 3.14159265358979323846 / 180));
  static const struct {
    ef_pattern pattern;
    double size_deg, hole_deg, low, high; /* of the circle */
  } cases[] = {{EF_PATTERN_DISC, 4, 0, 0.159, 0.161},
               {EF_PATTERN_DISC, 9.8, 0, 0.955, 0.965},
               {EF_PATTERN_DISC, 14, 0, 1, 1},
               {EF_PATTERN_UNIFORM, 0, 0, 1, 1},
               /* a ring of 1 degree: at most a 10 degree chord of it */
               {EF_PATTERN_ANNULUS, 20, 18, 0.12, 0.17}};
  invented i = invented_new(3, "cie-2015-2");
  const ef_direction direction = invented_direction("luminance", "");
  const ef_isolate_settings settings = ef_isolate_settings_default();
  ef_isolation way;
  assert_int_equal(ef_isolate(i.stimulator, &direction, &settings, &way, NULL),
                   EF_OK);
  for (size_t k = 0; k < sizeof cases / sizeof cases[0]; k++) {
    ef_frame_settings s = ef_frame_settings_default();
    s.width_px = 384;
    s.height_px = 320;
    s.pixels_per_mm = 1;
    s.distance_mm = 700;
    s.pattern = cases[k].pattern;
    s.size_deg = cases[k].size_deg;
    s.hole_deg = cases[k].hole_deg;
    s.edge_deg = 0.1;
    ef_frames *frames = ef_frames_new(i.stimulator, &way, &s, NULL, NULL);
    assert_non_null(frames);
    const double share = ef_frames_area(frames).in_ten_deg_sr / circle_sr;
    printf("# %s of %g degrees: %.4f of a circle of 10 degrees\n",
           ef_pattern_name(s.pattern), s.size_deg, share);
    assert_true(share >= cases[k].low && share <= cases[k].high * (1 + 1e-12));
    ef_frames_free(frames);
  }
  invented_free(&i);
}

static ef_stripes stripes_of(const invented *i, const ef_isolation *way,
                             ef_pattern pattern, double cycles_per_deg,
                             double size_deg, bool flickers) {
  ef_frame_settings s = ef_frame_settings_default();
  s.width_px = 240;
  s.height_px = 160;
  s.pixels_per_mm = 1;
  s.pattern = pattern;
  s.size_deg = size_deg;
  s.edge_deg = 0;
  s.cycles_per_deg = cycles_per_deg;
  if (flickers) {
    s.waveform.kind = EF_WAVEFORM_SQUARE;
    s.waveform.duration_s = 1;
  }
  ef_frames *frames = ef_frames_new(i->stimulator, way, &s, NULL, NULL);
  ef_stripes out;
  assert_int_equal(ef_frames_stripes(frames, &out, NULL), EF_OK);
  ef_frames_free(frames);
  return out;
}

/* A frame of 19.46 x 13.05 degrees. */
static void stripes_are_looked_at(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_direction direction = invented_direction("luminance", "");
  const ef_isolate_settings settings = ef_isolate_settings_default();
  ef_isolation way;
  assert_int_equal(ef_isolate(i.stimulator, &direction, &settings, &way, NULL),
                   EF_OK);
  double high[EF_MAX_DRIVES];
  for (size_t k = 0; k < 3; k++)
    high[k] = way.background[k] + way.modulation[k];
  const double light = ef_stimulator_luminance_cd_m2(i.stimulator, high);
  assert_true(light > 100);
  ef_stripes s = stripes_of(&i, &way, EF_PATTERN_GRATING, 1, 0, false);
  assert_near(s.pairs, 2 * atan(120.0 / 700) * 180 / 3.14159265358979323846,
              1e-9);
  assert_near_relative(s.light_cd_m2, light, 1e-12);
  assert_true(s.is_discernible && !s.flickers);
  assert_true(s.exceeds);
  assert_near(s.share_of_frame, 1, 0);
  /* Few, or on a small part of the frame. */
  s = stripes_of(&i, &way, EF_PATTERN_GRATING, 0.2, 0, false);
  assert_true(s.pairs < 5 && !s.exceeds);
  s = stripes_of(&i, &way, EF_PATTERN_GRATING, 2, 10, false);
  assert_near(s.pairs, 20, 1e-12);
  assert_true(s.share_of_frame > 0.25 && s.share_of_frame < 0.40);
  assert_false(s.exceeds);
  s = stripes_of(&i, &way, EF_PATTERN_GRATING, 2, 10, true);
  assert_true(s.flickers);
  assert_true(s.exceeds);
  s = stripes_of(&i, &way, EF_PATTERN_GABOR, 2, 4, false);
  assert_near(s.pairs, 2 * 0.5 * 2.3548200450309493, 1e-12);
  s = stripes_of(&i, &way, EF_PATTERN_DISC, 2, 4, false);
  assert_near(s.pairs, 0, 0);
  /* Stripes of one luminance are not discernible by it. */
  const ef_direction tritan = invented_direction("isoluminant tritan", "");
  assert_int_equal(ef_isolate(i.stimulator, &tritan, &settings, &way, NULL),
                   EF_OK);
  s = stripes_of(&i, &way, EF_PATTERN_GRATING, 1, 0, false);
  assert_false(s.is_discernible || s.exceeds);
  invented_free(&i);
}

/* ---- Blue light --------------------------------------------------------- */

/* Independently published: the spectrum of LED-B1 taken as W m-2 sr-1 nm-1 and
 * seen for 5 s gives 1317.5 J m-2 sr-1, permitted for 3795.2 s. */
static void blue_light_of_led_b1(void **state) {
  (void)state;
  const ef_grid grid = {81, 380, 5, NULL};
  double power[81];
  ef_illuminant *led = ef_illuminant_new("LED-B1", NULL);
  ef_illuminant_sample(led, &grid, power, NULL);
  ef_blue_light out;
  ef_error error;
  if (ef_blue_light_measure(&grid, power, 0.1, 5, &out, &error) != EF_OK)
    fail_msg("%s", error.message);
  printf("# LED-B1: %.2f J m-2 sr-1 (1317.5), %.1f s (3795.2)\n",
         5 * out.radiance_w_m2_sr, out.limit_s);
  assert_near_relative(5 * out.radiance_w_m2_sr, 1317.5, 1e-4);
  assert_near_relative(out.limit_s, 3795.2, 1e-4);
  assert_false(out.is_small || out.exceeds);
  assert_int_equal(ef_blue_light_measure(&grid, power, 0.1, 4000, &out, NULL),
                   EF_OK);
  assert_true(out.exceeds);
  /* Dimmed below 100 W m-2 sr-1 there is no limit. */
  for (size_t k = 0; k < 81; k++)
    power[k] *= 0.3;
  assert_int_equal(ef_blue_light_measure(&grid, power, 0.1, 1e6, &out, NULL),
                   EF_OK);
  assert_true(isinf(out.limit_s) && !out.exceeds);
  assert_int_equal(ef_blue_light_measure(&grid, power, 0.01, 1, &out, NULL),
                   EF_OK);
  assert_true(out.is_small);
  assert_near_relative(out.irradiance_w_m2,
                       out.radiance_w_m2_sr * 7.8539816339744831e-5, 1e-12);
  assert_int_equal(ef_blue_light_measure(&grid, power, 0, 1, &out, &error),
                   EF_INVALID);
  assert_string_equal(error.message, "a source of 0 rad seen for 1 s; expected "
                                     "more than 0, and 0 or more");
  ef_illuminant_free(led);
}

/* By the published weights: the plain sum over their 5 nm rows. Blue-light
 * hazard efficacy of luminous radiation, radiance over luminance. */
static void blue_light_of_a_and_d65(void **state) {
  (void)state;
  enum { ROWS = 81, FROM_NM = 300, STEP_NM = 5 };
  static const char *const names[] = {"A", "D65"};
  const ef_grid grid = {ROWS, FROM_NM, STEP_NM, NULL};
  const ef_table *weights = ef_table_find("retinal-hazard", NULL);
  const ef_table *cmf = ef_table_find("cie-1931", NULL);
  assert_true(weights != NULL && cmf != NULL);
  const double *b =
      weights->value + ef_table_column(weights, "B") * weights->n_rows;
  double efficacy[2];
  for (int k = 0; k < 2; k++) {
    double power[ROWS], sum = 0, luminance = 0;
    ef_illuminant *light = ef_illuminant_new(names[k], NULL);
    assert_int_equal(ef_illuminant_sample(light, &grid, power, NULL), EF_OK);
    ef_observer *observer = ef_observer_new("cie-1931", NULL);
    const ef_channels y = ef_observer_channels(observer, EF_TRISTIMULUS);
    for (int i = 0; i < ROWS; i++) {
      const int nm = FROM_NM + STEP_NM * i;
      sum += STEP_NM * b[i] * power[i];
      if (nm >= 360)
        luminance += 683.0 * STEP_NM * power[i] *
                     y.value[y.grid.count + (size_t)nm - 360];
    }
    ef_blue_light out;
    assert_int_equal(ef_blue_light_measure(&grid, power, 0.1, 1, &out, NULL),
                     EF_OK);
    /* The weights are linear between their rows: at 1 nm the steep flank makes
     * a little more of a spectrum that is curved there. */
    assert_near_relative(out.radiance_w_m2_sr, sum, 2e-3);
    efficacy[k] = out.radiance_w_m2_sr / luminance;
    printf("# %s: %.4f mW/lm (plain sum %.4f)\n", names[k], 1e3 * efficacy[k],
           1e3 * sum / luminance);
    ef_observer_free(observer);
    ef_illuminant_free(light);
  }
  assert_true(efficacy[1] > 2 * efficacy[0]);
}

static void cautions_end_with_the_deferral(void **state) {
  (void)state;
  char text[EF_MOST_CAUTIONS][EF_CAUTION_TEXT];
  assert_int_equal(ef_cautions(NULL, NULL, NULL, text), 1);
  assert_string_equal(text[0], ef_caution_deferral());
  assert_non_null(strstr(text[0], "no clearance"));
  ef_flash f = flicker(10, 0.2, 0.6, 100, 0.1, 1);
  const ef_blue_light blue = {.radiance_w_m2_sr = 250, .limit_s = 4000};
  assert_int_equal(ef_cautions(&f, NULL, &blue, text), 3);
  assert_string_equal(
      text[0], "flashes: 10 in a second over 0.1 sr of a field of 10 degrees "
               "and 100 % of the frame; WCAG 2.3.1 allows 3 over more than "
               "0.006 sr, ITU-R BT.1702 over more than 25 %: exceeded");
  assert_string_equal(text[1], "blue light: weighted radiance 250 W m-2 sr-1, "
                               "exposure limit of IEC 62471 after 4000 s");
  assert_string_equal(text[2], ef_caution_deferral());
  const ef_blue_light dim = {.radiance_w_m2_sr = 2, .limit_s = INFINITE};
  const ef_stripes stripes = {.pairs = 12,
                              .has_luminance = true,
                              .light_cd_m2 = 90,
                              .dark_cd_m2 = 10,
                              .is_discernible = true,
                              .share_of_frame = 0.5,
                              .exceeds = true};
  assert_int_equal(ef_cautions(NULL, &stripes, &dim, text), 3);
  assert_string_equal(
      text[0], "stripes: 12 light-dark pairs of 90 and 10 cd/m2 over 50 % of "
               "the frame; guidance for television allows more than 5 pairs of "
               "50 cd/m2 or more over 40 %: exceeded");
  assert_string_equal(text[1],
                      "blue light: weighted radiance 2 W m-2 sr-1, below the "
                      "exposure limit of IEC 62471 for any time");
  f = flicker(2, 0.2, 0.6, 100, 0.1, 1);
  assert_int_equal(ef_cautions(&f, NULL, NULL, text), 1);
  f.is_long = true;
  assert_int_equal(ef_cautions(&f, NULL, NULL, text), 2);
  assert_string_equal(
      text[0], "flashes: up to 2 in a second, within the limits of WCAG 2.3.1 "
               "and ITU-R BT.1702; flashing for more than 5 s may be a risk "
               "even where each second is within the limits");
  /* The longest of all fit. */
  f = flicker(10, 0.2, 0.6, 100, 0.123456, 0.987654321);
  f.is_long = f.is_fine = true;
  f.n_red = 30;
  f.exceeds_red = true;
  assert_int_equal(ef_cautions(&f, &stripes, &blue, text), 5);
  for (int k = 0; k < 5; k++)
    assert_true(strlen(text[k]) < EF_CAUTION_TEXT - 20);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(pupils_of_the_formulas),
      cmocka_unit_test(trolands_and_alpha_opic_irradiance),
      cmocka_unit_test(flashes_are_counted),
      cmocka_unit_test(area_and_fineness_count),
      cmocka_unit_test(most_in_ten_degrees),
      cmocka_unit_test(stripes_are_looked_at),
      cmocka_unit_test(saturated_red_is_counted),
      cmocka_unit_test(frames_flash_as_their_waveform),
      cmocka_unit_test(blue_light_of_led_b1),
      cmocka_unit_test(blue_light_of_a_and_d65),
      cmocka_unit_test(cautions_end_with_the_deferral),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
