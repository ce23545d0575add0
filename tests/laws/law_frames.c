/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What holds for every frame: on average the background, the codes of the
 * isolation, the same bytes twice, and in a written picture what was reported.
 */
#include <stdlib.h>

#include <png.h>

#include <evenfield/exchange.h>

#include "gen.h"
#include "invented_stimulator.h"
#include "near.h"
#include "scratch.h"

enum { MOST = EF_MAX_DRIVES };

static ef_isolation isolate(const invented *i, const char *change,
                            const char *silent, ef_modulation modulation,
                            double share) {
  ef_isolation out;
  ef_error error;
  ef_isolate_settings settings = ef_isolate_settings_default();
  const ef_direction direction = invented_direction(change, silent);
  settings.modulation = modulation;
  ef_status status =
      ef_isolate(i->stimulator, &direction, &settings, &out, &error);
  if (status == EF_OK) {
    settings.contrast = share * out.largest;
    status = ef_isolate(i->stimulator, &direction, &settings, &out, &error);
  }
  if (status != EF_OK)
    fail_msg("%s", error.message);
  return out;
}

static double amount_of(const invented *i, size_t primary, int bits,
                        uint32_t code) {
  const double last = (1 << bits) - 1;
  return ef_device_amount(i->device, primary, code / last, NULL);
}

/* The code nearest to the background's amount, by trying. */
static uint32_t rounded(const invented *i, size_t primary, int bits,
                        double amount) {
  uint32_t best = 0;
  for (uint32_t code = 0; code < 1u << bits; code++)
    if (fabs(amount_of(i, primary, bits, code) - amount) <
        fabs(amount_of(i, primary, bits, best) - amount))
      best = code;
  return best;
}

/* Whole cycles over the width: the mean light is that of the background within
 * one code of each primary. */
static void grating_is_on_average_the_background(void **state) {
  (void)state;
  static const struct {
    size_t n;
    int bits;
    ef_dither dither;
    double cycles, distance_mm;
  } plan[] = {
      {3, 8, EF_DITHER_NONE, 4, 1000},
      {3, 10, EF_DITHER_NONE, 7, 1000},
      /* The screen is flat: cycles near its ends have more pixels, which from
       * nearby is more than a code of 16 bits. */
      {3, 16, EF_DITHER_NONE, 3, 20000},
      {5, 8, EF_DITHER_NONE, 5, 1000},
      {3, 8, EF_DITHER_ORDERED, 4, 1000},
      {4, 10, EF_DITHER_ORDERED, 6, 1000},
  };
  for (size_t k = 0; k < sizeof plan / sizeof plan[0]; k++) {
    invented i = invented_new(plan[k].n, "cie-2015-2");
    const ef_isolation way =
        isolate(&i, "S", plan[k].n > 3 ? "mel" : "", EF_SYMMETRIC, 0.9);
    ef_frame_settings s = invented_frame(240, 100);
    s.pattern = EF_PATTERN_GRATING;
    s.size_deg = 0;
    s.bits = plan[k].bits;
    s.distance_mm = plan[k].distance_mm;
    s.dither = plan[k].dither;
    s.phase_deg = 30;
    s.cycles_per_deg =
        plan[k].cycles / 2 /
        ef_pixels_to_degrees((double)s.width_px / 2, s.distance_mm, 2);
    ef_frames *frames = invented_frames(&i, &way, &s);
    const size_t n = plan[k].n;
    uint16_t *code = calloc(s.width_px * n, sizeof *code);
    double mean[MOST] = {0};
    for (size_t y = 0; y < s.height_px; y++) {
      ef_frames_row(frames, 0, y, code);
      for (size_t x = 0; x < s.width_px; x++)
        for (size_t j = 0; j < n; j++)
          mean[j] += amount_of(&i, j, s.bits, code[x * n + j]) /
                     (double)(s.width_px * s.height_px);
    }
    double worst = 0;
    for (size_t j = 0; j < n; j++) {
      const uint32_t at = rounded(&i, j, s.bits, way.background[j]);
      const double step =
          amount_of(&i, j, s.bits, at + 1) - amount_of(&i, j, s.bits, at);
      worst = fmax(worst, fabs(mean[j] - way.background[j]) / step);
    }
    printf("# %zu primaries, %d bits, %s: off by at most %.2f codes\n", n,
           s.bits, s.dither ? "dithered" : "plain", worst);
    assert_true(worst < 1);
    free(code);
    ef_frames_free(frames);
    invented_free(&i);
  }
}

/* Full level has the codes of the isolation, no level those of the background,
 * in space and time. */
static void places_have_the_codes_of_the_isolation(void **state) {
  (void)state;
  for (size_t n = 3; n <= 5; n++) {
    invented i = invented_new(n, "cie-2015-2");
    const ef_isolation way = isolate(&i, "S", "", EF_SYMMETRIC, 0.7);
    ef_codes_settings codes = ef_codes_settings_default();
    ef_coded coded;
    ef_frame_settings s = invented_frame(240, 100);
    s.bits = codes.bits = n == 4 ? 10 : 8;
    s.edge_deg = 0;
    s.waveform.kind = EF_WAVEFORM_SQUARE;
    s.waveform.frequency_hz = 30;
    s.waveform.duration_s = 0.2;
    assert_int_equal(
        ef_isolation_codes(i.stimulator, &way, &codes, &coded, NULL), EF_OK);
    ef_frames *frames = invented_frames(&i, &way, &s);
    uint16_t *code = calloc(s.width_px * n, sizeof *code);
    assert_int_equal(ef_frames_count(frames), 12);
    for (size_t frame = 0; frame < 12; frame++) {
      ef_frames_row(frames, frame, 50, code);
      for (size_t j = 0; j < n; j++) {
        assert_int_equal(code[j], coded.background[j]);
        /* 30 Hz at 60 frames a second: up, down. */
        assert_int_equal(code[120 * n + j],
                         frame % 2 == 0 ? coded.high[j] : coded.low[j]);
      }
    }
    free(code);
    ef_frames_free(frames);
    invented_free(&i);
  }
}

/* Every row twice, in another order, from two objects. */
static void frames_are_reproducible(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_isolation way = isolate(&i, "L,-M", "", EF_SYMMETRIC, 0.8);
  ef_frame_settings s = invented_frame(240, 100);
  s.pattern = EF_PATTERN_GABOR;
  s.size_deg = 0;
  s.orientation_deg = 33;
  s.drift_hz = 2;
  s.dither = EF_DITHER_ORDERED;
  s.waveform.kind = EF_WAVEFORM_SINUSOID;
  s.waveform.frequency_hz = 4;
  s.waveform.duration_s = 0.25;
  s.waveform.ramp_s = 0.1;
  ef_frames *one = invented_frames(&i, &way, &s);
  ef_frames *two = invented_frames(&i, &way, &s);
  s.seed = 2;
  ef_frames *other = invented_frames(&i, &way, &s);
  uint16_t a[240 * 3], b[240 * 3];
  size_t n_other = 0;
  for (size_t k = 0; k < 15 * 100; k++) {
    const size_t back = 15 * 100 - 1 - k;
    ef_frames_row(two, back / 100, back % 100, b);
    ef_frames_row(one, back / 100, back % 100, a);
    assert_memory_equal(a, b, sizeof a);
    ef_frames_row(other, back / 100, back % 100, b);
    n_other += memcmp(a, b, sizeof a) != 0;
  }
  assert_true(n_other > 1000); /* the seed matters */
  ef_frames_free(one);
  ef_frames_free(two);
  ef_frames_free(other);
  invented_free(&i);
}

/* One-sided: never below the background, and for a grating half of it on
 * average. */
static void pulses_stay_on_their_side(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_isolation way = isolate(&i, "luminance", "", EF_PULSE, 0.8);
  ef_frame_settings s = invented_frame(240, 100);
  double level[240], mean = 0;
  s.pattern = EF_PATTERN_GRATING;
  s.size_deg = 0;
  s.cycles_per_deg = 1;
  s.waveform.kind = EF_WAVEFORM_SINUSOID;
  s.waveform.frequency_hz = 6;
  s.waveform.duration_s = 0.5;
  ef_frames *frames = invented_frames(&i, &way, &s);
  for (size_t frame = 0; frame < 30; frame++) {
    ef_frames_levels(frames, frame, 3, level);
    for (size_t x = 0; x < 240; x++) {
      assert_true(level[x] >= 0 && level[x] <= 1);
      mean += level[x] / 240 / 30;
    }
  }
  assert_near(mean, 0.5, 1e-3);
  ef_frames_free(frames);
  invented_free(&i);
}

/* ---- Dithering ---------------------------------------------------------- */

static void dithering_measures_what_frames_show(void **state) {
  (void)state;
  gen g = gen_new(51);
  invented i = invented_new(3, "cie-2015-2");
  double chosen = 0, plain = 0;
  for (int k = 0; k < 6; k++) {
    const ef_isolation way = isolate(&i, k % 2 ? "S" : "M", "", EF_SYMMETRIC,
                                     gen_between(&g, 0.1, 1));
    ef_dither_effect effect;
    assert_int_equal(
        ef_isolation_dither(i.stimulator, &way, 8, 7, &effect, NULL), EF_OK);
    ef_frame_settings s = invented_frame(240, 100);
    s.width_px = s.height_px = 8;
    s.pattern = EF_PATTERN_UNIFORM;
    s.dither = EF_DITHER_ORDERED;
    s.seed = 7;
    s.waveform.duration_s = 16 / 60.0;
    ef_frames *frames = invented_frames(&i, &way, &s);
    assert_int_equal(ef_frames_count(frames), 16);
    double mean[EF_N_RECEPTORS] = {0}, square[EF_N_RECEPTORS] = {0};
    double before[EF_N_RECEPTORS];
    for (size_t row = 0; row < 16 * 8; row++) {
      uint16_t code[8 * 3];
      ef_frames_row(frames, row / 8, row % 8, code);
      for (size_t x = 0; x < 8; x++) {
        double amount[3], excitation[EF_N_RECEPTORS];
        for (size_t j = 0; j < 3; j++)
          amount[j] = amount_of(&i, j, 8, code[3 * x + j]);
        ef_stimulator_excitations(i.stimulator, amount, excitation);
        for (size_t r = 0; r < EF_N_RECEPTORS; r++) {
          mean[r] += excitation[r] / 1024;
          square[r] += excitation[r] * excitation[r] / 1024;
        }
      }
    }
    ef_stimulator_excitations(i.stimulator, way.background, before);
    for (size_t r = 0; r < EF_N_RECEPTORS; r++) {
      /* The dithered background is within a 64th of a code of the wanted one,
       * some 1e-4 of it. */
      assert_near(effect.contrast[r], mean[r] / before[r] - 1, 5e-4);
      assert_near_relative(effect.noise[r],
                           sqrt(square[r] - mean[r] * mean[r]) / before[r],
                           2e-3);
      assert_near(effect.contrast[r], way.contrast[r], 1e-3);
    }
    chosen += effect.residual / 6;
    plain += effect.rounded_residual / 6;
    ef_frames_free(frames);
  }
  printf("# mean residual %.2g dithered, %.2g rounded\n", chosen, plain);
  assert_true(chosen < 0.1 * plain);
  invented_free(&i);
}

/* Each of the 64 thresholds once in a tile, whatever the frame. */
static void thresholds_are_spread_evenly(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  ef_isolation way = isolate(&i, "S", "", EF_SYMMETRIC, 0.5);
  const double low = amount_of(&i, 0, 8, 140), high = amount_of(&i, 0, 8, 141);
  for (int k = 1; k < 64; k += 7) {
    way.background[0] = low + (high - low) * (k + 0.5) / 64;
    way.modulation[0] = 0;
    ef_frame_settings s = invented_frame(240, 100);
    s.width_px = s.height_px = 8;
    s.pattern = EF_PATTERN_UNIFORM;
    s.dither = EF_DITHER_ORDERED;
    s.waveform.duration_s = 5 / 60.0;
    ef_frames *frames = invented_frames(&i, &way, &s);
    for (size_t frame = 0; frame < 5; frame++) {
      int n_up = 0;
      for (size_t y = 0; y < 8; y++) {
        uint16_t code[8 * 3];
        ef_frames_row(frames, frame, y, code);
        for (size_t x = 0; x < 8; x++) {
          assert_in_range(code[3 * x], 140, 141);
          n_up += code[3 * x] == 141;
        }
      }
      assert_in_range(n_up, k, k + 1);
    }
    ef_frames_free(frames);
  }
  invented_free(&i);
}

/* ---- Written and read back ---------------------------------------------- */

typedef struct painter {
  const ef_frames *frames;
  uint16_t *code;
  size_t width, n;
  int bits;
} painter;

static void paint(void *cookie, size_t y, uint16_t *sample) {
  painter *p = cookie;
  ef_frames_row(p->frames, 0, y, p->code);
  for (size_t x = 0; x < p->width * 3; x++)
    sample[x] = ef_code_to_sample(p->bits, p->code[x]);
}

/* Rows of a picture of three channels, in the depth of the file. */
static uint16_t *read_picture(const char *path, size_t width, size_t height,
                              int bits) {
  FILE *file = fopen(path, "rb");
  assert_non_null(file);
  png_structp png =
      png_create_read_struct(PNG_LIBPNG_VER_STRING, NULL, NULL, NULL);
  png_infop info = png_create_info_struct(png);
  if (setjmp(png_jmpbuf(png)) != 0)
    fail_msg("libpng refuses the picture");
  png_init_io(png, file);
  png_read_png(png, info, PNG_TRANSFORM_IDENTITY, NULL);
  assert_int_equal(png_get_image_width(png, info), width);
  assert_int_equal(png_get_image_height(png, info), height);
  assert_int_equal(png_get_bit_depth(png, info), bits == 8 ? 8 : 16);
  /* Nothing that would have the codes changed on the way to the screen. */
  assert_int_equal(png_get_valid(png, info,
                                 PNG_INFO_gAMA | PNG_INFO_sRGB | PNG_INFO_iCCP |
                                     PNG_INFO_cHRM),
                   0);
  png_bytepp rows = png_get_rows(png, info);
  uint16_t *out = calloc(width * height * 3, sizeof *out);
  for (size_t k = 0; k < width * height * 3; k++) {
    const png_byte *row = rows[k / (width * 3)];
    const size_t x = k % (width * 3);
    const int sample = bits == 8 ? row[x] : row[2 * x] << 8 | row[2 * x + 1];
    out[k] = (uint16_t)sample;
  }
  png_destroy_read_struct(&png, &info, NULL);
  fclose(file);
  return out;
}

static void check_written(int bits) {
  char path[SCRATCH_PATH];
  invented i = invented_new(3, "cie-2015-10");
  const ef_isolation way = isolate(&i, "S", "", EF_SYMMETRIC, 0.6);
  ef_codes_settings codes = ef_codes_settings_default();
  ef_coded coded;
  codes.bits = bits;
  assert_int_equal(ef_isolation_codes(i.stimulator, &way, &codes, &coded, NULL),
                   EF_OK);
  ef_frame_settings s = invented_frame(240, 100);
  s.bits = bits;
  ef_frames *frames = invented_frames(&i, &way, &s);
  painter p = {frames, calloc(s.width_px * 3, sizeof(uint16_t)), s.width_px, 3,
               bits};
  const ef_png_rows rows = {.fill = paint, .cookie = &p};
  ef_error error;
  scratch_path("frame.png", path);
  if (ef_png_write_rows(path, true, s.width_px, s.height_px, bits == 8 ? 8 : 16,
                        &rows, NULL, &error) != EF_OK)
    fail_msg("%s", error.message);
  uint16_t *sample = read_picture(path, s.width_px, s.height_px, bits);
  /* The corner is background, the middle the full modulation. */
  const uint16_t *const pixel[2] = {
      sample, sample + 3 * (50 * s.width_px + s.width_px / 2)};
  const ef_grid *grid = ef_device_grid(i.device);
  double *light = calloc(2 * grid->count, sizeof *light);
  double channel[2 * EF_N_RECEPTORS];
  for (size_t k = 0; k < 2; k++) {
    double drive[3];
    for (size_t j = 0; j < 3; j++) {
      const uint32_t code =
          bits == 10 ? pixel[k][j] >> 6 : (uint32_t)pixel[k][j];
      assert_int_equal(code, k == 0 ? coded.background[j] : coded.high[j]);
      drive[j] = code / (double)((1 << bits) - 1);
    }
    ef_device_spectrum(i.device, drive, light + k * grid->count, NULL, NULL);
  }
  ef_viewing viewing = ef_viewing_default(NULL);
  viewing.absolute = true;
  ef_weights *weights =
      ef_observer_weights(i.observer, EF_RECEPTORS, grid, &viewing, NULL, NULL);
  ef_weights_apply(weights, 2, light, 1, channel, NULL);
  for (size_t r = 0; r < EF_N_RECEPTORS; r++)
    assert_near(channel[EF_N_RECEPTORS + r] / channel[r] - 1,
                coded.contrast_high[r], 1e-12);
  assert_near(fmax(fabs(channel[5] / channel[0] - 1),
                   fabs(channel[6] / channel[1] - 1)),
              fmax(fabs(coded.contrast_high[0]), fabs(coded.contrast_high[1])),
              1e-12);
  ef_weights_free(weights);
  free(light);
  free(sample);
  free(p.code);
  ef_frames_free(frames);
  invented_free(&i);
}

static void pictures_show_what_was_reported(void **state) {
  (void)state;
  check_written(8);
  check_written(10);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(grating_is_on_average_the_background),
      cmocka_unit_test(places_have_the_codes_of_the_isolation),
      cmocka_unit_test(frames_are_reproducible),
      cmocka_unit_test(pulses_stay_on_their_side),
      cmocka_unit_test(dithering_measures_what_frames_show),
      cmocka_unit_test(thresholds_are_spread_evenly),
      cmocka_unit_test(pictures_show_what_was_reported),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, scratch_make, scratch_remove);
}
