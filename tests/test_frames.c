/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Waveforms, geometry and frames: values by hand, what is refused and with
 * which words. */
#include <stdlib.h>

#include "fail_alloc.h"
#include "heard.h"
#include "invented_stimulator.h"
#include "near.h"

static ef_isolation s_cone(const invented *i, ef_modulation modulation) {
  ef_isolation out;
  ef_error error;
  ef_isolate_settings settings = ef_isolate_settings_default();
  const ef_direction direction = invented_direction("S", "");
  settings.modulation = modulation;
  if (ef_isolate(i->stimulator, &direction, &settings, &out, &error) != EF_OK)
    fail_msg("%s", error.message);
  return out;
}

/* ---- Waveforms ---------------------------------------------------------- */

static void waveforms_by_hand(void **state) {
  (void)state;
  ef_waveform w = ef_waveform_default();
  assert_near(ef_waveform_at(&w, 3.7), 1, 0);
  assert_near(ef_waveform_ramp(&w, 3.7), 1, 0);
  assert_int_equal(ef_waveform_frames(&w, 60), 1);
  w.kind = EF_WAVEFORM_SINUSOID;
  w.frequency_hz = 2.5;
  w.duration_s = 2;
  assert_near(ef_waveform_at(&w, 0), 0, 0);
  assert_near(ef_waveform_at(&w, 0.1), 1, 1e-15);
  assert_near(ef_waveform_at(&w, 0.05), sqrt(0.5), 1e-15);
  assert_near(ef_waveform_at(&w, 0.3), -1, 1e-15);
  w.phase_deg = 90;
  assert_near(ef_waveform_at(&w, 0), 1, 1e-15);
  assert_int_equal(ef_waveform_frames(&w, 59.94), 120);
  w.ramp_s = 0.5;
  assert_near(ef_waveform_ramp(&w, 0), 0, 0);
  assert_near(ef_waveform_ramp(&w, 0.25), 0.5, 1e-15);
  assert_near(ef_waveform_ramp(&w, 0.5), 1, 0);
  assert_near(ef_waveform_ramp(&w, 1.75), 0.5, 1e-15);
  assert_near(ef_waveform_ramp(&w, 2), 0, 0);
  assert_near(ef_waveform_ramp(&w, -0.1), 0, 0);
  w.kind = EF_WAVEFORM_SQUARE;
  w.phase_deg = 0;
  w.duty = 0.25;
  assert_near(ef_waveform_at(&w, 0.09), 1, 0);
  assert_near(ef_waveform_at(&w, 0.11), -1, 0);
  assert_near(ef_waveform_at(&w, 0.41), 1, 0);
}

static void names_are_found(void **state) {
  (void)state;
  ef_waveform_kind kind;
  ef_pattern pattern;
  ef_error error;
  for (int k = 0; k < 3; k++) {
    assert_int_equal(
        ef_waveform_find(ef_waveform_name((ef_waveform_kind)k), &kind, NULL),
        EF_OK);
    assert_int_equal(kind, k);
  }
  for (int k = 0; k < 5; k++) {
    assert_int_equal(
        ef_pattern_find(ef_pattern_name((ef_pattern)k), &pattern, NULL), EF_OK);
    assert_int_equal(pattern, k);
  }
  assert_int_equal(ef_waveform_find("sinus", &kind, &error), EF_UNKNOWN_NAME);
  assert_string_equal(error.message,
                      "no waveform is called 'sinus'; near names: sinusoid");
  assert_int_equal(ef_pattern_find("gabors", &pattern, &error),
                   EF_UNKNOWN_NAME);
  assert_string_equal(error.message,
                      "no pattern is called 'gabors'; near names: gabor");
}

/* ---- Geometry ----------------------------------------------------------- */

/* tan 1 degree = 0.0174550649; at 57.3 cm a centimetre is near enough 1
 * degree. */
static void degrees_and_pixels(void **state) {
  (void)state;
  assert_near(ef_degrees_to_pixels(1, 1000, 4), 69.8202597, 1e-7);
  assert_near(ef_pixels_to_degrees(573 * 0.01745, 573, 1), 1, 3e-4);
  assert_near(ef_degrees_to_pixels(45, 500, 3.5), 1750, 1e-9);
  for (double angle = -80; angle <= 80; angle += 7.3) {
    const double pixels = ef_degrees_to_pixels(angle, 640, 3.9);
    assert_near(ef_pixels_to_degrees(pixels, 640, 3.9), angle, 1e-12);
  }
}

/* Solid angles: of a rectangle seen straight ahead 4 asin(w h / sqrt((w^2 +
 * 4 d^2)(h^2 + 4 d^2))), of a disc 2 pi (1 - cos r). */
static void areas_of_disc_and_frame(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_isolation way = s_cone(&i, EF_SYMMETRIC);
  ef_frame_settings s = invented_frame(200, 120);
  s.size_deg = 2.5;
  s.width_px = 800;
  s.height_px = 480;
  s.pixels_per_mm = 8;
  ef_frames *frames = invented_frames(&i, &way, &s);
  const ef_frame_area area = ef_frames_area(frames);
  const double w = 100, h = 60, d = 1000, pi = 3.14159265358979323846;
  assert_near_relative(
      area.frame_solid_angle_sr,
      4 * asin(w * h / sqrt((w * w + 4 * d * d) * (h * h + 4 * d * d))),
      1e-7); /* the sum over pixels for the integral */
  assert_near_relative(area.solid_angle_sr, 2 * pi * (1 - cos(1.25 * pi / 180)),
                       2e-3);
  const double radius = ef_degrees_to_pixels(1.25, 1000, 8);
  assert_near_relative(area.share_of_frame, pi * radius * radius / 800 / 480,
                       2e-3);
  ef_frames_free(frames);
  s.pattern = EF_PATTERN_UNIFORM;
  frames = invented_frames(&i, &way, &s);
  assert_near(ef_frames_area(frames).share_of_frame, 1.0, 1e-9);
  ef_frames_free(frames);
  invented_free(&i);
}

/* The level at a place in degrees, left to right through the middle row. */
static double level_near(const ef_frames *frames, double angle_deg) {
  const ef_frame_settings *s = ef_frames_settings(frames);
  double *level = calloc(s->width_px, sizeof *level);
  const double x =
      (double)s->width_px / 2 - 0.5 +
      ef_degrees_to_pixels(angle_deg, s->distance_mm, s->pixels_per_mm);
  ef_frames_levels(frames, 0, s->height_px / 2, level);
  const double out = level[lround(x)];
  free(level);
  return out;
}

static void patterns_by_hand(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_isolation way = s_cone(&i, EF_SYMMETRIC);
  ef_frame_settings s = invented_frame(200, 120);
  s.width_px = 2001; /* a pixel in the middle */
  s.height_px = 3;
  s.pixels_per_mm = 20;
  s.size_deg = 2;
  s.edge_deg = 0.5;
  ef_frames *frames = invented_frames(&i, &way, &s);
  const double pixel = 0.003; /* degrees */
  assert_near(level_near(frames, 0), 1, 0);
  assert_near(level_near(frames, 0.74), 1, 0);
  assert_near(level_near(frames, 1), 0.5, 4 * pixel);
  assert_near(level_near(frames, -1), 0.5, 4 * pixel);
  /* a quarter of the edge further: (1 - sin 45 degrees) / 2 */
  assert_near(level_near(frames, 1.125), (1 - sqrt(0.5)) / 2, 4 * pixel);
  assert_near(level_near(frames, 1.26), 0, 0);
  ef_frames_free(frames);
  s.pattern = EF_PATTERN_ANNULUS;
  s.edge_deg = 0;
  s.hole_deg = 1;
  frames = invented_frames(&i, &way, &s);
  assert_near(level_near(frames, 0), 0, 0);
  assert_near(level_near(frames, 0.49), 0, 0);
  assert_near(level_near(frames, 0.51), 1, 0);
  assert_near(level_near(frames, 1.01), 0, 0);
  ef_frames_free(frames);
  s.pattern = EF_PATTERN_GRATING;
  s.size_deg = 0;
  s.cycles_per_deg = 0.5;
  frames = invented_frames(&i, &way, &s);
  assert_near(level_near(frames, 0), 1, 1e-12);
  assert_near(level_near(frames, 1), -1, 1e-4);
  assert_near(level_near(frames, 0.5), 0, 2 * pixel);
  assert_near(level_near(frames, 2), 1, 1e-4);
  ef_frames_free(frames);
  s.pattern = EF_PATTERN_GABOR;
  s.sigma_deg = 0.8;
  s.phase_deg = 90;
  frames = invented_frames(&i, &way, &s);
  assert_near(level_near(frames, 0), 0, 1e-12);
  /* cos(90 + 90 degrees) = -1 half a degree on, under the Gaussian */
  assert_near(level_near(frames, 0.5), -exp(-0.5 * 0.625 * 0.625), 1e-3);
  ef_frames_free(frames);
  s.pattern = EF_PATTERN_DISC;
  s.size_deg = 1;
  s.centre_x_deg = 1.5;
  frames = invented_frames(&i, &way, &s);
  assert_near(level_near(frames, 1.5), 1, 0);
  assert_near(level_near(frames, 0.99), 0, 0);
  assert_near(level_near(frames, 1.01), 1, 0);
  assert_near(level_near(frames, 1.99), 1, 0);
  assert_near(level_near(frames, 2.01), 0, 0);
  ef_frames_free(frames);
  invented_free(&i);
}

/* A grating turned by 90 degrees changes upwards. */
static void orientation_is_counterclockwise(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_isolation way = s_cone(&i, EF_SYMMETRIC);
  ef_frame_settings s = invented_frame(200, 120);
  double level[201];
  s.pattern = EF_PATTERN_GRATING;
  s.size_deg = 0;
  s.width_px = s.height_px = 201;
  s.cycles_per_deg = 0.4;
  s.phase_deg = -90; /* a sine */
  s.orientation_deg = 90;
  ef_frames *frames = invented_frames(&i, &way, &s);
  ef_frames_levels(frames, 0, 90, level); /* above the middle */
  assert_true(level[0] > 0.1);
  assert_near(level[0], level[200], 1e-12);
  ef_frames_free(frames);
  s.orientation_deg = 45;
  frames = invented_frames(&i, &way, &s);
  ef_frames_levels(frames, 0, 90, level);
  assert_near(level[90], 0, 1e-12); /* 10 up, 10 to the left */
  assert_true(level[110] > 0.1);    /* 10 up, 10 to the right */
  ef_frames_free(frames);
  invented_free(&i);
}

/* Every pixel of discs far from the middle of a near screen, by the angle at
 * the eye; nothing is left out where the disc is looked for. */
static void discs_far_from_the_middle(void **state) {
  (void)state;
  static const double cases[][4] = {/* centre, size, edge */
                                    {0, 0, 3, 0.5},
                                    {25, -18, 6, 1},
                                    {-38, 20, 10, 4},
                                    {60, 0, 50, 2}};
  const double deg = 3.14159265358979323846 / 180;
  invented i = invented_new(3, "cie-2015-2");
  const ef_isolation way = s_cone(&i, EF_SYMMETRIC);
  for (size_t k = 0; k < sizeof cases / sizeof cases[0]; k++) {
    ef_frame_settings s = ef_frame_settings_default();
    s.width_px = 150;
    s.height_px = 110;
    s.distance_mm = 50;
    s.pixels_per_mm = 1;
    s.centre_x_deg = cases[k][0];
    s.centre_y_deg = cases[k][1];
    s.size_deg = cases[k][2];
    s.edge_deg = cases[k][3];
    ef_frames *frames = ef_frames_new(i.stimulator, &way, &s, NULL, NULL);
    assert_non_null(frames);
    const double c[3] = {50 * tan(s.centre_x_deg * deg),
                         50 * tan(s.centre_y_deg * deg), 50};
    const double length = sqrt(c[0] * c[0] + c[1] * c[1] + c[2] * c[2]);
    double level[150];
    size_t n_inside = 0;
    for (size_t y = 0; y < s.height_px; y++) {
      ef_frames_levels(frames, 0, y, level);
      for (size_t x = 0; x < s.width_px; x++) {
        const double a[3] = {(double)x - 74.5, 54.5 - (double)y, 50};
        const double cosine = (a[0] * c[0] + a[1] * c[1] + a[2] * c[2]) /
                              length /
                              sqrt(a[0] * a[0] + a[1] * a[1] + a[2] * a[2]);
        const double beyond =
            acos(fmin(1, cosine)) / deg - s.size_deg / 2 + s.edge_deg / 2;
        const double part = fmax(0, fmin(1, beyond / s.edge_deg));
        const double window = (1 + cos(part * 180 * deg)) / 2;
        assert_near(level[x], window, 1e-5);
        n_inside += window > 0;
      }
    }
    assert_true(n_inside >= 4);
    ef_frames_free(frames);
  }
  invented_free(&i);
}

static void drift_moves_in_its_direction(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_isolation way = s_cone(&i, EF_SYMMETRIC);
  ef_frame_settings s = invented_frame(200, 120);
  double level[201];
  s.pattern = EF_PATTERN_GRATING;
  s.size_deg = 0;
  s.width_px = 201;
  s.cycles_per_deg = 0.4;
  s.drift_hz = 3;
  s.waveform.duration_s = 0.5;
  ef_frames *frames = invented_frames(&i, &way, &s);
  assert_int_equal(ef_frames_count(frames), 30);
  /* Frame 2 is at 2.5 / 60 s: an eighth of a cycle on, 0.3125 degrees. */
  ef_frames_levels(frames, 2, 60, level);
  const double x = 100 + ef_degrees_to_pixels(0.3125, 1000, 2);
  assert_near(level[lround(x)], 1, 1e-3);
  assert_near(level[100], sqrt(0.5), 1e-12);
  ef_frames_free(frames);
  invented_free(&i);
}

static void samples_of_codes(void **state) {
  (void)state;
  assert_int_equal(ef_code_to_sample(8, 255), 65535);
  assert_int_equal(ef_code_to_sample(8, 1), 257);
  assert_int_equal(ef_code_to_sample(10, 1023), 65535);
  assert_int_equal(ef_code_to_sample(10, 512), 0x8020);
  assert_int_equal(ef_code_to_sample(16, 40000), 40000);
  for (uint32_t code = 0; code < 1024; code++)
    assert_int_equal(ef_code_to_sample(10, code) >> 6, code);
}

/* ---- What is refused ---------------------------------------------------- */

static void refuse(const invented *i, const ef_isolation *way,
                   const ef_frame_settings *s, const char *message) {
  ef_error error = {.status = EF_OK};
  assert_null(ef_frames_new(i->stimulator, way, s, NULL, &error));
  assert_int_equal(error.status, EF_INVALID);
  assert_string_equal(error.message, message);
}

static void bad_screens_are_refused(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  ef_isolation way = s_cone(&i, EF_SYMMETRIC);
  ef_frame_settings s = invented_frame(200, 120);
  s.width_px = 0;
  refuse(&i, &way, &s,
         "frames of 0 x 120 pixels; expected 1 to 32768 on each side");
  s = invented_frame(200, 120);
  s.distance_mm = 0;
  refuse(&i, &way, &s, "a viewing distance of 0 mm; expected more than 0");
  s = invented_frame(200, 120);
  s.pixels_per_mm = -4;
  refuse(&i, &way, &s, "-4 pixels per mm; expected more than 0");
  s = invented_frame(200, 120);
  s.bits = 12;
  refuse(&i, &way, &s, "frames of 12 bits; expected 8, 10 or 16");
  s = invented_frame(200, 120);
  s.width_px = 30000;
  s.height_px = 30000;
  s.waveform.duration_s = 10;
  refuse(&i, &way, &s,
         "600 frames of 30000 x 30000 pixels are 1.62e+12 bytes; at most 4e+09 "
         "are allowed");
  way.n_primaries = 5;
  s = invented_frame(200, 120);
  refuse(&i, &way, &s, "a modulation of 5 primaries is shown on 3");
  invented_free(&i);
}

static void bad_patterns_are_refused(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_isolation way = s_cone(&i, EF_SYMMETRIC);
  ef_frame_settings s = invented_frame(200, 120);
  s.size_deg = 0;
  refuse(&i, &way, &s,
         "a disc of 0 degrees; expected more than 0 and less than 180");
  s = invented_frame(200, 120);
  s.edge_deg = 3;
  refuse(&i, &way, &s,
         "edges of 3 degrees on a disc of 2; expected 0 up to its size");
  s = invented_frame(200, 120);
  s.pattern = EF_PATTERN_ANNULUS;
  s.hole_deg = 2;
  refuse(&i, &way, &s,
         "a hole of 2 degrees in an annulus of 2 with edges of 0.2; expected "
         "more than 0, and a ring between the edges");
  s = invented_frame(200, 120);
  s.centre_y_deg = 95;
  refuse(&i, &way, &s,
         "a centre at 0, 95 degrees; expected less than 90 to each side");
  s = invented_frame(200, 120);
  s.pattern = EF_PATTERN_GRATING;
  s.cycles_per_deg = 0;
  refuse(&i, &way, &s,
         "a grating of 0 cycles per degree; expected more than 0");
  s.cycles_per_deg = 18; /* 34.9 pixels per degree */
  refuse(&i, &way, &s,
         "18 cycles per degree cannot be shown with two pixels a cycle; "
         "expected at most 17.45");
  s.cycles_per_deg = 2;
  s.drift_hz = 31;
  refuse(&i, &way, &s,
         "a drift of 31 Hz cannot be shown with 60 frames a second; expected "
         "at most 30 Hz");
  s.drift_hz = 0;
  s.phase_deg = INFINITE;
  refuse(&i, &way, &s,
         "phase inf and orientation 0 degrees; expected finite numbers");
  s = invented_frame(200, 120);
  s.pattern = EF_PATTERN_GABOR;
  s.sigma_deg = 0;
  refuse(&i, &way, &s, "a Gaussian of 0 degrees; expected more than 0");
  invented_free(&i);
}

static void bad_waveforms_are_refused(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_isolation way = s_cone(&i, EF_SYMMETRIC);
  ef_frame_settings s = invented_frame(200, 120);
  s.frame_rate_hz = 0;
  refuse(&i, &way, &s,
         "a frame rate of 0 Hz; expected more than 0 and at most 100000");
  s = invented_frame(200, 120);
  s.waveform.duration_s = -1;
  refuse(&i, &way, &s, "a duration of -1 s; expected 0 to 1000000");
  s.waveform.duration_s = 1;
  s.waveform.ramp_s = 0.6;
  refuse(&i, &way, &s,
         "ramps of 0.6 s at the ends of 1 s; expected 0 to half of the "
         "duration");
  s.waveform.ramp_s = 0;
  s.waveform.phase_deg = (double)NAN;
  refuse(&i, &way, &s, "a phase of nan degrees; expected a finite number");
  s.waveform.phase_deg = 0;
  s.waveform.kind = EF_WAVEFORM_SINUSOID;
  s.waveform.frequency_hz = 0;
  refuse(&i, &way, &s, "a frequency of 0 Hz; expected more than 0");
  s.waveform.frequency_hz = 31;
  refuse(&i, &way, &s,
         "31 Hz cannot be shown with 60 frames a second; expected at most 30 "
         "Hz");
  s.waveform.kind = EF_WAVEFORM_SQUARE;
  s.waveform.frequency_hz = 5;
  s.waveform.duty = 1;
  refuse(&i, &way, &s,
         "a square wave that is up for 1 of its cycle; expected more than 0 "
         "and less than 1");
  s.waveform.duty = 0.5;
  s.waveform.duration_s = 0;
  refuse(&i, &way, &s, "a square of 5 Hz needs a duration above 0");
  invented_free(&i);
}

static void what_was_assumed_is_noted(void **state) {
  (void)state;
  heard said = {0};
  const ef_notes notes = heard_notes(&said);
  invented i = invented_new(3, "cie-2015-2");
  const ef_isolation way = s_cone(&i, EF_SYMMETRIC);
  ef_frame_settings s = invented_frame(200, 120);
  s.size_deg = 4;
  s.bits = 16;
  s.waveform.kind = EF_WAVEFORM_SINUSOID;
  s.waveform.frequency_hz = 7;
  s.waveform.duration_s = 1;
  ef_frames *frames = ef_frames_new(i.stimulator, &way, &s, &notes, NULL);
  assert_non_null(frames);
  assert_string_equal(
      said.text,
      "a cycle of 7 Hz takes 8.57143 frames at 60 Hz: no two cycles are "
      "sampled alike\n"
      "the disc of 4 degrees does not fit into the frame of 5.725 x 3.437 "
      "degrees and is cut\n"
      "with 16 bits each primary's code is rounded for itself; up to 10 bits "
      "codes are chosen together\n");
  assert_near(ef_frames_bytes(frames), 60.0 * 200 * 120 * 6, 0);
  ef_frames_free(frames);
  ef_frames_free(NULL);
  invented_free(&i);
  /* Four primaries take two pictures of three. */
  i = invented_new(4, "cie-2015-2");
  const ef_isolation four = s_cone(&i, EF_PULSE);
  s = invented_frame(200, 120);
  frames = invented_frames(&i, &four, &s);
  assert_near(ef_frames_bytes(frames), 200.0 * 120 * 6, 0);
  ef_frames_free(frames);
  ef_dither_effect effect;
  ef_error error;
  assert_int_equal(
      ef_isolation_dither(i.stimulator, &four, 9, 1, &effect, &error),
      EF_INVALID);
  assert_string_equal(error.message, "frames of 9 bits; expected 8, 10 or 16");
  invented_free(&i);
}

typedef struct attempt {
  invented i;
  ef_isolation way;
  ef_frame_settings settings;
} attempt;

static bool try_frames(void *context) {
  attempt *a = context;
  ef_error error = {.status = EF_OK};
  ef_frames *frames =
      ef_frames_new(a->i.stimulator, &a->way, &a->settings, NULL, &error);
  if (frames == NULL)
    assert_int_equal(error.status, EF_NO_MEMORY);
  ef_frames_free(frames);
  return frames != NULL;
}

static void memory_that_fails_is_told(void **state) {
  (void)state;
  attempt a = {.i = invented_new(3, "cie-2015-2"),
               .settings = invented_frame(200, 120)};
  a.way = s_cone(&a.i, EF_SYMMETRIC);
  assert_true(fail_alloc_each(try_frames, &a) >= 3);
  invented_free(&a.i);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(waveforms_by_hand),
      cmocka_unit_test(names_are_found),
      cmocka_unit_test(degrees_and_pixels),
      cmocka_unit_test(areas_of_disc_and_frame),
      cmocka_unit_test(patterns_by_hand),
      cmocka_unit_test(orientation_is_counterclockwise),
      cmocka_unit_test(discs_far_from_the_middle),
      cmocka_unit_test(drift_moves_in_its_direction),
      cmocka_unit_test(samples_of_codes),
      cmocka_unit_test(bad_screens_are_refused),
      cmocka_unit_test(bad_patterns_are_refused),
      cmocka_unit_test(bad_waveforms_are_refused),
      cmocka_unit_test(what_was_assumed_is_noted),
      cmocka_unit_test(memory_that_fails_is_told),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
