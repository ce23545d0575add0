/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pictures are read back with libpng, apart from the code that wrote them, and
 * decoded by the formulas of the standards they are tagged with. */
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include <cmocka.h>
#include <lcms2.h>
#include <png.h>

#include <evenfield/device.h>
#include <evenfield/difference.h>
#include <evenfield/picture.h>

#include "base/base_private.h"
#include "picture/picture_private.h"

/* ---- Reading back ------------------------------------------------------ */

typedef struct picture {
  size_t width, height;
  int bits;
  bool has_profile, has_cicp;
  unsigned char cicp[4];
  png_uint_32 profile_length;
  cmsHPROFILE opened;   /* by lcms2; NULL: none */
  unsigned char *bytes; /* rows of RGB */
} picture;

/* The four bytes of the cICP chunk, which this libpng does not know. */
static void find_cicp(const char *path, picture *p) {
  FILE *file = fopen(path, "rb");
  assert_non_null(file);
  unsigned char head[8];
  assert_int_equal(fread(head, 1, 8, file), 8);
  while (fread(head, 1, 8, file) == 8) {
    const long length =
        (long)head[0] << 24 | head[1] << 16 | head[2] << 8 | head[3];
    if (memcmp(head + 4, "cICP", 4) == 0) {
      assert_int_equal(length, 4);
      assert_int_equal(fread(p->cicp, 1, 4, file), 4);
      p->has_cicp = true;
      break;
    }
    assert_int_equal(fseek(file, length + 4, SEEK_CUR), 0);
  }
  fclose(file);
}

static picture read_picture(const char *path) {
  picture p = {0};
  find_cicp(path, &p);
  FILE *file = fopen(path, "rb");
  assert_non_null(file);
  png_structp png =
      png_create_read_struct(PNG_LIBPNG_VER_STRING, NULL, NULL, NULL);
  png_infop info = png_create_info_struct(png);
  if (setjmp(png_jmpbuf(png)) != 0)
    fail_msg("%s is no PNG", path);
  png_init_io(png, file);
  png_read_info(png, info);
  p.width = png_get_image_width(png, info);
  p.height = png_get_image_height(png, info);
  p.bits = png_get_bit_depth(png, info);
  assert_int_equal(png_get_color_type(png, info), PNG_COLOR_TYPE_RGB);
  png_charp name;
  png_bytep profile;
  int compression;
  p.has_profile = png_get_iCCP(png, info, &name, &compression, &profile,
                               &p.profile_length) != 0;
  if (p.has_profile)
    p.opened = cmsOpenProfileFromMem(profile, p.profile_length);
  const size_t row = png_get_rowbytes(png, info);
  p.bytes = malloc(row * p.height);
  assert_non_null(p.bytes);
  for (size_t y = 0; y < p.height; ++y) {
    png_read_row(png, p.bytes + y * row, NULL);
  }
  png_destroy_read_struct(&png, &info, NULL);
  fclose(file);
  return p;
}

static void forget(picture *p) {
  if (p->opened != NULL)
    cmsCloseProfile(p->opened);
  free(p->bytes);
}

static void sample(const picture *p, size_t x, size_t y, double rgb[3]) {
  for (size_t c = 0; c < 3; ++c) {
    const size_t i = (y * p->width + x) * 3 + c;
    rgb[c] = p->bits == 8
                 ? p->bytes[i] / 255.0
                 : (p->bytes[2 * i] * 256 + p->bytes[2 * i + 1]) / 65535.0;
  }
}

/* IEC 61966-2-1:1999, 5.2, then the matrix that SMPTE RP 177 gives for the
 * primaries and white of ITU-R BT.2020-2: six digits from memory, which agree
 * with the four published ones (ITU-R BT.2407). Y of white is 100. */
static ef_xyz decode(const picture *p, size_t x, size_t y) {
  double v[3];
  sample(p, x, y, v);
  for (size_t c = 0; c < 3; ++c) {
    v[c] = v[c] <= 0.04045 ? v[c] / 12.92 : pow((v[c] + 0.055) / 1.055, 2.4);
  }
  return (ef_xyz){100.0 * (0.636958 * v[0] + 0.144617 * v[1] + 0.168881 * v[2]),
                  100.0 * (0.262700 * v[0] + 0.677998 * v[1] + 0.059302 * v[2]),
                  100.0 *
                      (0.000000 * v[0] + 0.028073 * v[1] + 1.060985 * v[2])};
}

static ef_xyz d65(void) {
  return ef_xyy_to_xyz((ef_xyy){0.3127, 0.3290, 100.0});
}

static double gap(ef_xyz wanted, ef_xyz found) {
  return ef_delta_e_ciede2000(ef_xyz_to_lab(wanted, d65()),
                              ef_xyz_to_lab(found, d65()), 1.0, 1.0, 1.0);
}

/* ---- Fixture ----------------------------------------------------------- */

/* A folder of its own for each test. */
static int set_up(void **state) {
  char *folder = strdup("/tmp/evenfield-picture-XXXXXX");
  *state = folder;
  return folder == NULL || mkdtemp(folder) == NULL;
}

static int tear_down(void **state) {
  static const char *const names[] = {"a.png", "sheet.png"};
  char path[200];
  for (size_t i = 0; i < sizeof names / sizeof names[0]; ++i) {
    snprintf(path, sizeof path, "%s/%s", (char *)*state, names[i]);
    remove(path);
  }
  const int left = rmdir(*state);
  free(*state);
  return left;
}

static const char *in(void **state, const char *name) {
  static char path[200];
  snprintf(path, sizeof path, "%s/%s", (char *)*state, name);
  return path;
}

static ef_xyz xyz_of_lab(double L, double a, double b) {
  return ef_lab_to_xyz((ef_lab){L, a, b}, d65());
}

/* ---- Single pictures --------------------------------------------------- */

/* 0.02 is a fortieth of a just noticeable difference; 16-bit codes and the
 * matrix of six digits above leave some 0.001. */
static void test_halves_hold_their_colours(void **state) {
  const double lab[][3] = {{62.37, 47.11, 58.23}, {27.41, 8.13, -29.77},
                           {81.19, -20.53, 0.67}, {50.0, 0.0, 0.0},
                           {2.31, 0.41, -0.53},   {97.83, -1.21, 3.47}};
  const size_t n = sizeof lab / sizeof lab[0];
  double worst = 0.0;
  for (size_t i = 0; i < n; ++i) {
    const double *a = lab[i], *b = lab[(i + 1) % n];
    const ef_swatch swatch = {"pair", xyz_of_lab(a[0], a[1], a[2]),
                              xyz_of_lab(b[0], b[1], b[2]), true, 0.0};
    ef_swatch_settings settings = ef_swatch_settings_default();
    settings.bits = 16;
    settings.overwrite = true;
    ef_swatch_report report;
    ef_error error;
    assert_int_equal(ef_swatch_write(in(state, "a.png"), &swatch, &settings,
                                     &report, &error),
                     EF_OK);
    assert_int_equal(report.n_clipped, 0);
    assert_false(report.labelled);
    picture p = read_picture(in(state, "a.png"));
    assert_int_equal(p.bits, 16);
    assert_int_equal(p.width, 512);
    assert_int_equal(p.height, 256);
    worst = fmax(worst, gap(swatch.target, decode(&p, 128, 128)));
    worst = fmax(worst, gap(swatch.match, decode(&p, 384, 128)));
    /* The halves touch: the last column of one, the first of the other. */
    worst = fmax(worst, gap(swatch.target, decode(&p, 255, 0)));
    worst = fmax(worst, gap(swatch.match, decode(&p, 256, 255)));
    forget(&p);
  }
  print_message("# largest gap of a 16-bit pixel: %.5f Delta E*00\n", worst);
  assert_true(worst < 0.02);
}

/* An 8-bit sample is the nearest one: half a step from the 16-bit one. */
static void test_eight_bits(void **state) {
  const ef_swatch swatch = {"pair", xyz_of_lab(62.37, 47.11, 58.23),
                            xyz_of_lab(54.79, -12.3, -31.7), true, 0.0};
  ef_swatch_settings settings = ef_swatch_settings_default();
  settings.width = 101;
  settings.overwrite = true;
  picture p[2];
  for (int i = 0; i < 2; ++i) {
    settings.bits = i == 0 ? 8 : 16;
    ef_swatch_report report;
    ef_error error;
    assert_int_equal(ef_swatch_write(in(state, "a.png"), &swatch, &settings,
                                     &report, &error),
                     EF_OK);
    p[i] = read_picture(in(state, "a.png"));
    assert_int_equal(p[i].bits, settings.bits);
    assert_int_equal(p[i].width, 101);
    assert_int_equal(p[i].height, 50);
  }
  for (size_t x = 0; x < 101; ++x) {
    double coarse[3], fine[3];
    sample(&p[0], x, 25, coarse);
    sample(&p[1], x, 25, fine);
    for (size_t c = 0; c < 3; ++c) {
      assert_true(fabs(coarse[c] - fine[c]) <= 0.5 / 255.0 + 1e-12);
    }
  }
  forget(&p[0]);
  forget(&p[1]);
}

static void test_tags(void **state) {
  const ef_swatch swatch = {"pair", xyz_of_lab(50, 0, 0), xyz_of_lab(51, 0, 0),
                            true, 0.0};
  const ef_swatch_settings settings = ef_swatch_settings_default();
  ef_swatch_report report;
  ef_error error;
  assert_int_equal(
      ef_swatch_write(in(state, "a.png"), &swatch, &settings, &report, &error),
      EF_OK);
  picture p = read_picture(in(state, "a.png"));
  /* ITU-T H.273: primaries 9, transfer 13, matrix 0 (RGB), full range. */
  const unsigned char wanted[4] = {9, 13, 0, 1};
  assert_true(p.has_cicp);
  assert_memory_equal(p.cicp, wanted, 4);
  assert_true(p.has_profile);
  assert_true(p.profile_length > 128);
  forget(&p);
}

/* lcms2 by the picture's own profile: to CIELAB of D50, against the target on
 * D50 by Bradford's transformation (that of ICC.1:2022, annex E). Fixed-point
 * numbers of the profile (1.5e-5) and 16-bit codes leave some 0.01. */
static void test_the_profile_says_the_same(void **state) {
  static const double lab[][3] = {{62.37, 47.11, 58.23}, {27.41, 8.13, -29.77},
                                  {81.19, -20.53, 0.67}, {97.83, -1.21, 3.47}};
  const ef_xyz d50 = {96.42, 100, 82.49}; /* ICC.1:2022, 7.2.16 */
  double to_d50[9], worst = 0;
  assert_int_equal(
      ef_adaptation_matrix(EF_ADAPT_BRADFORD, d65(), d50, to_d50, NULL), EF_OK);
  for (size_t i = 0; i < sizeof lab / sizeof *lab; ++i) {
    const ef_xyz colour = xyz_of_lab(lab[i][0], lab[i][1], lab[i][2]);
    const ef_swatch swatch = {"pair", colour, colour, true, 0.0};
    ef_swatch_settings settings = ef_swatch_settings_default();
    settings.bits = 16;
    settings.overwrite = true;
    ef_swatch_report report;
    assert_int_equal(ef_swatch_write(in(state, "a.png"), &swatch, &settings,
                                     &report, NULL),
                     EF_OK);
    picture p = read_picture(in(state, "a.png"));
    assert_non_null(p.opened);
    cmsHPROFILE to = cmsCreateLab4Profile(NULL);
    cmsHTRANSFORM transform = cmsCreateTransform(
        p.opened, TYPE_RGB_DBL, to, TYPE_Lab_DBL,
        INTENT_RELATIVE_COLORIMETRIC, cmsFLAGS_NOOPTIMIZE);
    assert_non_null(transform);
    double rgb[3];
    cmsCIELab found;
    sample(&p, 128, 128, rgb);
    cmsDoTransform(transform, rgb, &found, 1);
    const ef_lab wanted =
        ef_xyz_to_lab(ef_xyz_transform(to_d50, colour), d50);
    worst = fmax(worst, ef_delta_e_ciede2000(
                            wanted, (ef_lab){found.L, found.a, found.b}, 1.0,
                            1.0, 1.0));
    cmsDeleteTransform(transform);
    cmsCloseProfile(to);
    forget(&p);
  }
  print_message("# largest gap by lcms2 and iCCP: %.5f Delta E*00\n", worst);
  assert_true(worst < 0.02);
}

/* The white that everything is seen against becomes the picture's white. */
static void test_white_is_adapted(void **state) {
  const ef_xyz incandescent = ef_xyy_to_xyz((ef_xyy){0.4476, 0.4074, 100.0});
  const ef_xyz grey = {0.2 * incandescent.X, 0.2 * incandescent.Y,
                       0.2 * incandescent.Z};
  const ef_swatch swatch = {"pair", incandescent, grey, true, 0.0};
  ef_swatch_settings settings = ef_swatch_settings_default();
  settings.white = incandescent;
  settings.bits = 16;
  ef_swatch_report report;
  ef_error error;
  assert_int_equal(
      ef_swatch_write(in(state, "a.png"), &swatch, &settings, &report, &error),
      EF_OK);
  assert_int_equal(report.n_clipped, 0);
  picture p = read_picture(in(state, "a.png"));
  double white[3], neutral[3];
  sample(&p, 100, 100, white);
  sample(&p, 400, 100, neutral);
  for (size_t c = 0; c < 3; ++c) {
    assert_true(white[c] == 1.0);
    assert_true(fabs(neutral[c] - neutral[0]) <= 1.0 / 65535.0);
  }
  assert_true(fabs(decode(&p, 400, 100).Y - 20.0) < 0.01);
  forget(&p);
}

static void test_clipped_halves_are_counted(void **state) {
  const ef_swatch swatch = {
      "pair", {120.0, 130.0, 140.0}, {20.0, 60.0, 2.0}, true, 0.0};
  const ef_swatch_settings settings = ef_swatch_settings_default();
  ef_swatch_report report;
  ef_error error;
  assert_int_equal(
      ef_swatch_write(in(state, "a.png"), &swatch, &settings, &report, &error),
      EF_OK);
  assert_int_equal(report.n_clipped, 2);
}

/* ---- The mark ---------------------------------------------------------- */

/* Turns between light and dark along the diagonal into the lower right corner,
 * in luminance alone. */
static size_t count_turns(const picture *p) {
  size_t n = 0;
  int last = 0;
  for (size_t k = 0; k < p->height / 2; ++k) {
    const size_t x = p->width - 1 - p->height / 2 + k;
    const double Y = decode(p, x, p->height - 1 - p->height / 2 + k).Y;
    const int level = Y > 90.0 ? 1 : Y < 1.0 ? -1 : 0;
    if (level != 0 && level == -last)
      ++n;
    if (level != 0)
      last = level;
  }
  return n;
}

static void test_mark_is_seen_without_colour(void **state) {
  ef_swatch swatch = {"pair", xyz_of_lab(62.37, 47.11, 58.23),
                      xyz_of_lab(60.0, 40.0, 50.0), false, 2.9};
  ef_swatch_settings settings = ef_swatch_settings_default();
  settings.overwrite = true;
  settings.bits = 16;
  ef_swatch_report report;
  ef_error error;
  assert_int_equal(
      ef_swatch_write(in(state, "a.png"), &swatch, &settings, &report, &error),
      EF_OK);
  picture p = read_picture(in(state, "a.png"));
  assert_int_equal(count_turns(&p), 5);
  /* The middle of the half stays free for the eye. */
  assert_true(gap(swatch.match, decode(&p, 384, 128)) < 0.02);
  forget(&p);
  swatch.shown = true;
  assert_int_equal(
      ef_swatch_write(in(state, "a.png"), &swatch, &settings, &report, &error),
      EF_OK);
  p = read_picture(in(state, "a.png"));
  assert_int_equal(count_turns(&p), 0);
  forget(&p);
}

/* ---- Sheets ------------------------------------------------------------ */

/* Pixels of black ink in the rectangle. */
static size_t count_ink(const picture *p, size_t x0, size_t y0, size_t x1,
                        size_t y1) {
  size_t n = 0;
  for (size_t y = y0; y < y1; ++y) {
    for (size_t x = x0; x < x1; ++x)
      n += decode(p, x, y).Y < 5.0;
  }
  return n;
}

static void test_sheet(void **state) {
  const ef_swatch swatches[3] = {
      {"first", xyz_of_lab(60, 20, 20), xyz_of_lab(60, 20, 21), true, 0.61},
      {"gr\xC3\xBCn \xFF broken, with a name that is far too long for its "
       "place",
       xyz_of_lab(50, -30, 20), xyz_of_lab(50, -25, 20), false, 3.71},
      {"", xyz_of_lab(40, 0, 0), xyz_of_lab(40, 0, 0), true, (double)NAN}};
  ef_swatch_settings settings = ef_swatch_settings_default();
  settings.width = 256;
  settings.bits = 16;
  settings.difference_symbol = "Delta E*00";
  ef_swatch_report report;
  ef_error error;
  assert_int_equal(ef_swatch_write_sheet(in(state, "sheet.png"), 3, swatches,
                                         &settings, &report, &error),
                   EF_OK);
  picture p = read_picture(in(state, "sheet.png"));
  /* Pairs and gaps of a sixteenth; the ground is neutral with Y = 30. */
  const size_t gap_px = 16;
  assert_true(fabs(decode(&p, 3, 3).Y - 30.0) < 0.02);
  assert_true(gap(swatches[0].target, decode(&p, gap_px + 64, gap_px + 64)) <
              0.02);
  assert_true(gap(swatches[0].match, decode(&p, gap_px + 192, gap_px + 64)) <
              0.02);
  assert_true(gap(swatches[1].target,
                  decode(&p, 2 * gap_px + 256 + 64, gap_px + 64)) < 0.02);
  if (report.labelled) {
    assert_true(count_ink(&p, gap_px, gap_px + 128, gap_px + 256,
                          gap_px + 128 + 40) > 100);
    assert_true(count_ink(&p, 2 * gap_px + 256, gap_px + 128, 2 * gap_px + 512,
                          gap_px + 128 + 40) > 200);
  } else {
    print_message("# no text could be drawn on this machine\n");
  }
  forget(&p);
}

/* ---- Labels ------------------------------------------------------------ */

static void test_pen_fits_text(void **state) {
  (void)state;
  ef__pen *pen = ef__pen_new(14.0);
  if (pen == NULL) {
    print_message("# no text can be drawn on this machine\n");
    skip();
  }
  const ef__pixel paper = {{65535, 65535, 65535}}, ink = {{0, 0, 0}};
  ef__raster raster;
  ef_error error;
  assert_int_equal(ef__raster_init(&raster, 120, 40, paper, &error), EF_OK);
  const ef__box box = {10, 5, 60, ef__pen_line_height(pen)};
  assert_true(ef__pen_draw(pen, &raster, box,
                           "a line that is much longer than its box", ink));
  size_t n_inside = 0, n_outside = 0;
  for (size_t y = 0; y < 40; ++y) {
    for (size_t x = 0; x < 120; ++x) {
      const bool inked = raster.sample[(y * 120 + x) * 3] < 60000;
      const bool inside = x >= 10 && x < 70 && y >= 5 && y < 5 + box.height;
      if (inked && inside)
        ++n_inside;
      if (inked && !inside)
        ++n_outside;
    }
  }
  assert_true(n_inside > 50);
  assert_int_equal(n_outside, 0);
  free(raster.sample);
  ef__pen_free(pen);
}

/* Half coverage leaves half the light of white under black ink. */
static void test_blend_is_linear_in_light(void **state) {
  (void)state;
  const ef__pixel paper = {{65535, 65535, 65535}}, ink = {{0, 0, 0}};
  ef__raster raster;
  ef_error error;
  assert_int_equal(ef__raster_init(&raster, 3, 1, paper, &error), EF_OK);
  const unsigned char mask[3] = {0, 51, 255};
  ef__raster_blend(&raster, (ef__box){0, 0, 3, 1}, mask, 3, ink);
  assert_int_equal(raster.sample[0], 65535);
  /* 0.8 of the light: 1.055 * 0.8^(1/2.4) - 0.055 = 0.906332. */
  assert_true(fabs(raster.sample[3] / 65535.0 - 0.906332) < 1e-5);
  assert_int_equal(raster.sample[6], 0);
  free(raster.sample);
}

/* ---- Refusals ---------------------------------------------------------- */

static void expect(ef_status status, ef_status wanted, const ef_error *error,
                   const char *message) {
  assert_int_equal(status, wanted);
  assert_int_equal(error->status, wanted);
  assert_string_equal(error->message, message);
}

static void test_refusals(void **state) {
  const ef_swatch good = {"pair", xyz_of_lab(50, 0, 0), xyz_of_lab(51, 0, 0),
                          true, 0.0};
  ef_swatch bad = good;
  bad.match.Y = (double)INFINITY;
  const ef_swatch_settings settings = ef_swatch_settings_default();
  ef_swatch_report report;
  ef_error error = {0};
  const char *path = in(state, "a.png");
  ef_swatch_settings s = settings;
  s.bits = 10;
  expect(ef_swatch_write(path, &good, &s, &report, &error), EF_INVALID, &error,
         "a picture has 8 or 16 bits per channel, not 10");
  s = settings;
  s.width = 63;
  expect(ef_swatch_write(path, &good, &s, &report, &error), EF_INVALID, &error,
         "a pair is 64 to 4096 pixels wide, not 63");
  expect(ef_swatch_write(path, &bad, &settings, &report, &error), EF_INVALID,
         &error, "the pair pair has a tristimulus value that is not finite");
  s = settings;
  s.white = (ef_xyz){0.0, 0.0, 0.0};
  assert_int_equal(ef_swatch_write(path, &good, &s, &report, &error),
                   EF_INVALID);
  expect(ef_swatch_write_sheet(path, 0, NULL, &settings, &report, &error),
         EF_INVALID, &error, "a sheet needs at least one pair");
  assert_int_not_equal(access(path, F_OK), 0);
  assert_int_equal(ef_swatch_write(path, &good, &settings, &report, &error),
                   EF_OK);
  assert_int_equal(ef_swatch_write(path, &good, &settings, &report, &error),
                   EF_EXISTS);
}

static void test_large_sheet_is_refused(void **state) {
  const size_t n = 9000;
  ef_swatch *swatches = calloc(n, sizeof *swatches);
  assert_non_null(swatches);
  const ef_swatch_settings settings = ef_swatch_settings_default();
  ef_swatch_report report;
  ef_error error = {0};
  assert_int_equal(ef_swatch_write_sheet(in(state, "sheet.png"), n, swatches,
                                         &settings, &report, &error),
                   EF_INVALID);
  assert_non_null(strstr(error.message, "draw fewer pairs or smaller ones"));
  assert_int_not_equal(access(in(state, "sheet.png"), F_OK), 0);
  free(swatches);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test_setup_teardown(test_halves_hold_their_colours, set_up,
                                      tear_down),
      cmocka_unit_test_setup_teardown(test_eight_bits, set_up, tear_down),
      cmocka_unit_test_setup_teardown(test_tags, set_up, tear_down),
      cmocka_unit_test_setup_teardown(test_the_profile_says_the_same, set_up,
                                      tear_down),
      cmocka_unit_test_setup_teardown(test_white_is_adapted, set_up, tear_down),
      cmocka_unit_test_setup_teardown(test_clipped_halves_are_counted, set_up,
                                      tear_down),
      cmocka_unit_test_setup_teardown(test_mark_is_seen_without_colour, set_up,
                                      tear_down),
      cmocka_unit_test_setup_teardown(test_sheet, set_up, tear_down),
      cmocka_unit_test(test_pen_fits_text),
      cmocka_unit_test(test_blend_is_linear_in_light),
      cmocka_unit_test_setup_teardown(test_refusals, set_up, tear_down),
      cmocka_unit_test_setup_teardown(test_large_sheet_is_refused, set_up,
                                      tear_down),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
