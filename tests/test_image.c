/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pictures read back: our own writer's samples and tags, the order of tags, and
 * what comes of pictures that are converted. */
#include <stdlib.h>
#include <unistd.h>

#include <evenfield/image.h>
#include <evenfield/picture.h>

#include "gen.h"
#include "near.h"
#include "scratch.h"

enum { WIDTH = 29, HEIGHT = 17, N = WIDTH * HEIGHT * 3 };

static uint16_t sample[N];

static void fill_samples(int bits) {
  gen g = gen_new(812);
  for (size_t i = 0; i < N; ++i) {
    const uint16_t value = (uint16_t)(65535.0 * gen_unit(&g));
    sample[i] = bits == 16 ? value : (uint16_t)((value >> 8) * 257);
  }
}

static const char *written(const char *name, int bits,
                           const ef_png_tags *tags) {
  static char path[SCRATCH_PATH];
  ef_error error = {0};
  scratch_path(name, path);
  if (ef_png_write(path, true, WIDTH, HEIGHT, bits, sample, tags, &error) !=
      EF_OK)
    fail_msg("%s", error.message);
  return path;
}

static void expect_rows(ef_png *png) {
  uint16_t row[3 * WIDTH];
  bool has_row;
  for (size_t y = 0; y < HEIGHT; ++y) {
    assert_int_equal(ef_png_next_row(png, row, &has_row, NULL), EF_OK);
    assert_true(has_row);
    assert_memory_equal(row, sample + y * 3 * WIDTH, sizeof row);
  }
  assert_int_equal(ef_png_next_row(png, row, &has_row, NULL), EF_OK);
  assert_false(has_row);
}

/* Every sample and every tag that ef_png_write writes. */
static void what_was_written_is_read(void **state) {
  (void)state;
  unsigned char *profile = NULL;
  size_t length = 0;
  const ef_encoding *encoding = ef_encoding_find("bt2020", NULL);
  assert_int_equal(ef_profile_make_matrix("wide", encoding, &profile, &length,
                                          NULL),
                   EF_OK);
  const ef_png_tags tags = {9, 13, "wide", profile, length};
  for (int bits = 8; bits <= 16; bits += 8) {
    fill_samples(bits);
    const char *path = written("a.png", bits, &tags);
    ef_png *png = ef_png_open(path, NULL, NULL);
    assert_non_null(png);
    const ef_png_head *head = ef_png_get_head(png);
    assert_int_equal(head->width, WIDTH);
    assert_int_equal(head->height, HEIGHT);
    assert_int_equal(head->bits, bits);
    assert_string_equal(head->layout, "RGB");
    assert_true(head->has_cicp && head->has_iccp && head->is_full_range);
    assert_false(head->has_srgb || head->has_gamma || head->has_alpha);
    assert_int_equal(head->primaries, 9);
    assert_int_equal(head->transfer, 13);
    assert_string_equal(head->profile_name, "wide");
    assert_int_equal(head->profile_length, length);
    assert_memory_equal(head->profile, profile, length);
    assert_int_equal(ef_png_get_source(head), EF_PNG_CICP);
    expect_rows(png);
    ef_png_free(png);
    unlink(path);
  }
  free(profile);
}

/* PNG third edition, 4.3. */
static void tags_have_their_order(void **state) {
  (void)state;
  ef_png_head head = {0};
  assert_int_equal(ef_png_get_source(&head), EF_PNG_UNTAGGED);
  head.has_chromaticities = true;
  assert_int_equal(ef_png_get_source(&head), EF_PNG_GAMA);
  head.has_gamma = true;
  assert_int_equal(ef_png_get_source(&head), EF_PNG_GAMA);
  head.has_srgb = true;
  assert_int_equal(ef_png_get_source(&head), EF_PNG_SRGB);
  head.has_iccp = true;
  assert_int_equal(ef_png_get_source(&head), EF_PNG_ICCP);
  head.has_cicp = true;
  assert_int_equal(ef_png_get_source(&head), EF_PNG_CICP);
}

/* Counts come to the pixels, each colour is found again, and with fewer colours
 * than there are the leading bits are taken. */
static void distinct_colours(void **state) {
  (void)state;
  fill_samples(16);
  for (size_t i = 0; i < 300; ++i)
    sample[i] = 4660;
  const ef_png_tags tags = {.primaries = 1, .transfer = 13};
  const char *path = written("d.png", 16, &tags);
  for (size_t most = 20; most <= 1020; most += 1000) {
    ef_picture *picture = ef_picture_open(path, NULL, NULL);
    assert_non_null(picture);
    ef_distinct *d = ef_distinct_of(picture, most, NULL);
    assert_non_null(d);
    assert_int_equal(ef_distinct_pixels(d), WIDTH * HEIGHT);
    assert_true(ef_distinct_count(d) <= most);
    assert_int_equal(ef_distinct_bits(d) == 16, most == 1020);
    size_t n_all = 0;
    for (size_t i = 0; i < ef_distinct_count(d); ++i) {
      double value[3];
      size_t n, x, y;
      ef_distinct_at(d, i, value, &n, &x, &y);
      n_all += n;
      const uint16_t *at = sample + 3 * (y * WIDTH + x);
      assert_int_equal(ef_distinct_find(d, at), i);
      const double coarse = most == 1020 ? 1e-12
                                         : 1.0 / (1 << ef_distinct_bits(d));
      for (int c = 0; c < 3; ++c)
        assert_true(fabs(value[c] - at[c] / 65535.0) <= coarse);
    }
    assert_int_equal(n_all, WIDTH * HEIGHT);
    ef_distinct_free(d);
    ef_picture_free(picture);
  }
  unlink(path);
}

static ef_profile *made_profile_of(const char *name, unsigned char **bytes,
                                   size_t *length) {
  const ef_encoding *encoding = ef_encoding_find(name, NULL);
  assert_int_equal(
      ef_profile_make_matrix(name, encoding, bytes, length, NULL), EF_OK);
  ef_profile *profile = ef_profile_new(name, *bytes, *length, NULL);
  assert_non_null(profile);
  return profile;
}

/* To a wider encoding and back every sample of 16 bits is the same to the
 * rounding of both ways. */
static void there_and_back(void **state) {
  (void)state;
  char wide[SCRATCH_PATH], back[SCRATCH_PATH];
  unsigned char *bytes[2];
  size_t length[2];
  ef_profile *to = made_profile_of("bt2020", &bytes[0], &length[0]);
  ef_profile *srgb = made_profile_of("srgb", &bytes[1], &length[1]);
  const ef_png_tags tags = {.primaries = 1, .transfer = 13};
  fill_samples(16);
  char from[SCRATCH_PATH];
  snprintf(from, sizeof from, "%s", written("s.png", 16, &tags));
  scratch_path("wide.png", wide);
  scratch_path("back.png", back);
  ef_picture_conversion how = {.intent = EF_INTENT_RELATIVE,
                               .profile_name = "p",
                               .profile = bytes[0],
                               .profile_length = length[0]};
  ef_picture *picture = ef_picture_open(from, NULL, NULL);
  assert_int_equal(ef_picture_convert(picture, to, wide, &how, NULL), EF_OK);
  ef_picture_free(picture);
  picture = ef_picture_open(wide, NULL, NULL); /* by the profile in it */
  assert_non_null(picture);
  assert_int_equal(ef_picture_get_colours(picture)->source, EF_PNG_ICCP);
  how.profile = NULL;
  assert_int_equal(ef_picture_convert(picture, srgb, back, &how, NULL), EF_OK);
  ef_picture_free(picture);
  ef_png *png = ef_png_open(back, NULL, NULL);
  int worst = 0;
  for (size_t y = 0; y < HEIGHT; ++y) {
    uint16_t row[3 * WIDTH];
    bool has_row;
    assert_int_equal(ef_png_next_row(png, row, &has_row, NULL), EF_OK);
    for (size_t i = 0; i < 3 * WIDTH; ++i) {
      const int off = abs((int)row[i] - (int)sample[3 * y * WIDTH + i]);
      worst = off > worst ? off : worst;
    }
  }
  printf("# there and back: largest deviation %d of 65535\n", worst);
  /* Rounding to 16 bits in the middle, stretched by the inverse of the matrix
   * (rows sum to at most 2.4 in size) and of a dark curve's slope (12.92 of
   * 2.4): some tens of codes at the darkest. */
  assert_true(worst <= 40);
  ef_png_free(png);
  ef_profile_free(to);
  ef_profile_free(srgb);
  free(bytes[0]);
  free(bytes[1]);
  unlink(from);
  unlink(wide);
  unlink(back);
}

/* A picture that fails half way leaves nothing behind. */
static void nothing_half_written(void **state) {
  (void)state;
  char from[SCRATCH_PATH], to_path[SCRATCH_PATH];
  unsigned char *bytes;
  size_t length;
  ef_profile *to = made_profile_of("p3-d65", &bytes, &length);
  const ef_png_tags tags = {.primaries = 1, .transfer = 13};
  fill_samples(8);
  snprintf(from, sizeof from, "%s", written("c.png", 8, &tags));
  size_t size;
  char *whole = scratch_read("c.png", &size);
  scratch_write("c.png", whole, size - 200);
  scratch_path("o.png", to_path);
  const ef_picture_conversion how = {.intent = EF_INTENT_RELATIVE};
  ef_error error = {0};
  ef_picture *picture = ef_picture_open(from, NULL, &error);
  assert_non_null(picture);
  assert_int_equal(ef_picture_convert(picture, to, to_path, &how, &error),
                   EF_MALFORMED);
  assert_non_null(strstr(error.message, "cut off"));
  ef_picture_free(picture);
  assert_int_not_equal(access(to_path, F_OK), 0);
  assert_int_equal(scratch_count(), 1);
  free(whole);
  ef_profile_free(to);
  free(bytes);
  unlink(from);
}

/* The classes of a map have the densities that their texts name. */
static void maps_are_told_apart(void **state) {
  (void)state;
  const size_t one_in[EF_MAP_CLASSES] = {0, 8, 4, 2};
  for (int k = 0; k < EF_MAP_CLASSES; ++k) {
    size_t n_dark = 0;
    for (size_t y = 0; y < 64; ++y)
      for (size_t x = 0; x < 64; ++x)
        n_dark += ef_map_sample(k, 50.0, x, y) == 0;
    assert_int_equal(n_dark, k == 0 ? 0 : 4096 / one_in[k]);
    assert_true(ef_map_class_text(k)[0] != '\0');
  }
  assert_int_equal(ef_map_class(0.99), 0);
  assert_int_equal(ef_map_class(1.01), 1);
  assert_int_equal(ef_map_class(5.9), 2);
  assert_int_equal(ef_map_class(6.1), 3);
  assert_int_equal(ef_map_class(NOT_A_NUMBER), 0);
}

/* ---- Two pictures -------------------------------------------------------- */

static int by_size(const void *a, const void *b) {
  const double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* Colour of a pixel of an encoding by its own definition: curve, matrix, and
 * linear Bradford to D50 (IEC 61966-2-1, ICC.1 annex E). */
static ef_xyz plain_xyz(const ef_encoding *encoding, const uint16_t *code) {
  double level[3], m[9], adapt[9];
  ef_tone_curve *curve = ef_tone_curve_new(encoding->tone, NULL);
  for (int c = 0; c < 3; ++c)
    level[c] = 100.0 * ef_tone_curve_amount(curve, code[c] / 65535.0, NULL);
  ef_tone_curve_free(curve);
  assert_int_equal(ef_encoding_matrix(encoding, m, NULL), EF_OK);
  const ef_xyz white = ef_xyy_to_xyz(
      (ef_xyy){encoding->white.x, encoding->white.y, 100.0});
  assert_int_equal(ef_adaptation_matrix(EF_ADAPT_BRADFORD, white,
                                        (ef_xyz){96.42, 100.0, 82.49}, adapt,
                                        NULL),
                   EF_OK);
  return ef_xyz_transform(
      adapt,
      (ef_xyz){m[0] * level[0] + m[1] * level[1] + m[2] * level[2],
               m[3] * level[0] + m[4] * level[1] + m[5] * level[2],
               m[6] * level[0] + m[7] * level[1] + m[8] * level[2]});
}

static double plain_difference(const ef_metric *metric, ef_xyz a, ef_xyz b) {
  const ef_conditions conditions =
      ef_conditions_default((ef_xyz){96.42, 100.0, 82.49});
  double p[3], q[3];
  ef_metric_coordinates(metric, a, &conditions, p);
  ef_metric_coordinates(metric, b, &conditions, q);
  return ef_metric_difference(metric, p, q);
}

/* A picture in one encoding, and nearly the same codes in another. */
static void write_two(uint16_t other[N], int bits, const char *second) {
  static const int codes[2][2] = {{1, 13}, {9, 13}};
  const ef_png_tags tags[2] = {{codes[0][0], codes[0][1], NULL, NULL, 0},
                               {codes[1][0], codes[1][1], NULL, NULL, 0}};
  gen g = gen_new(19);
  fill_samples(bits);
  written("a.png", bits, &tags[0]);
  memcpy(other, sample, sizeof sample);
  for (size_t i = 0; i < N; i += 1 + gen_below(&g, 9))
    sample[i] = (uint16_t)((gen_bits(&g) & 255) * 257);
  written("b.png", bits, &tags[strcmp(second, "bt2020") == 0]);
}

static void check_comparison(const char *name, int bits, const char *second) {
  uint16_t a[N];
  double expected[N / 3], jnd = 1.5, sum = 0.0;
  char path[SCRATCH_PATH];
  ef_encoding wide = *ef_encoding_find(second, NULL);
  wide.tone = "iec61966-2-1"; /* what cICP says: transfer 13 */
  ef_metric *metric = ef_metric_new(name, NULL);
  write_two(a, bits, second);
  for (size_t i = 0; i < N / 3; ++i) {
    expected[i] = plain_difference(
        metric, plain_xyz(ef_encoding_find("srgb", NULL), a + 3 * i),
        plain_xyz(&wide, sample + 3 * i));
    sum += expected[i];
  }
  scratch_path("a.png", path);
  ef_picture *first = ef_picture_open(path, NULL, NULL);
  scratch_path("b.png", path);
  ef_picture *other = ef_picture_open(path, NULL, NULL);
  ef_comparison_settings how = ef_comparison_settings_default(metric, jnd);
  how.tolerance = 6.0;
  ef_comparison *c = ef_comparison_new(first, other, &how, NULL);
  assert_non_null(c);
  size_t above[2] = {0, 0}, largest = 0, n_cells = 0, n;
  const double *row;
  double seen[N / 3];
  for (size_t y = 0; y < HEIGHT; ++y) {
    assert_int_equal(ef_comparison_next_row(c, &row, NULL), EF_OK);
    for (size_t x = 0; x < WIDTH; ++x) {
      const size_t i = y * WIDTH + x;
      seen[i] = row[x];
      /* Profiles keep colours in steps of 1.5e-5 of the white, and lcms2 takes
       * them through floats. */
      assert_near(seen[i], expected[i], 0.02);
      above[0] += seen[i] > jnd;
      above[1] += seen[i] > 6.0;
      largest = seen[i] > seen[largest] ? i : largest;
    }
  }
  assert_int_equal(ef_comparison_next_row(c, &row, NULL), EF_OK);
  assert_null(row);
  const ef_comparison_totals t = ef_comparison_get_totals(c);
  assert_int_equal(t.n_pixels, WIDTH * HEIGHT);
  assert_int_equal(t.n_undefined, 0);
  assert_int_equal(t.n_above_jnd, above[0]);
  assert_int_equal(t.n_above_tolerance, above[1]);
  assert_near(t.mean, sum / (WIDTH * HEIGHT), 0.02);
  assert_near(t.largest, seen[largest], 0.0);
  assert_int_equal(t.largest_y * WIDTH + t.largest_x, largest);
  size_t cursor = 0;
  double value, before = -1.0;
  while (ef_comparison_next_cell(c, &cursor, &value, &n)) {
    assert_true(value > before);
    before = value;
    n_cells += n;
  }
  assert_int_equal(n_cells, WIDTH * HEIGHT);
  qsort(seen, N / 3, sizeof *seen, by_size);
  for (int k = 1; k <= 20; ++k) {
    const size_t at = (size_t)ceil(k / 20.0 * (N / 3)) - 1;
    assert_near_relative(ef_comparison_quantile(c, k / 20.0), seen[at], 5e-4);
  }
  ef_comparison_free(c);
  ef_picture_free(first);
  ef_picture_free(other);
  ef_metric_free(metric);
}

static void pictures_are_compared(void **state) {
  (void)state;
  check_comparison("ciede2000", 8, "srgb");
  check_comparison("ciede2000", 16, "bt2020");
  check_comparison("cam16-ucs", 16, "bt2020");
  check_comparison("cmc:l=2,c=1", 8, "bt2020");
}

static void pictures_of_two_sizes_are_refused(void **state) {
  (void)state;
  const ef_png_tags tags = {.primaries = 1, .transfer = 13};
  ef_error error = {0};
  char path[SCRATCH_PATH];
  fill_samples(8);
  ef_picture *first = ef_picture_open(written("a.png", 8, &tags), NULL, NULL);
  scratch_path("b.png", path);
  assert_int_equal(ef_png_write(path, true, HEIGHT, WIDTH, 8, sample, &tags,
                                NULL),
                   EF_OK);
  ef_picture *other = ef_picture_open(path, NULL, NULL);
  ef_metric *metric = ef_metric_new("cielab", NULL);
  const ef_comparison_settings how = ef_comparison_settings_default(metric, 1);
  assert_null(ef_comparison_new(first, other, &how, &error));
  assert_error(&error, EF_MALFORMED, "is 17 x 29 pixels, and ");
  ef_picture_free(first);
  ef_picture_free(other);
  ef_metric_free(metric);
}

/* ---- The map of their differences ---------------------------------------- */

static double map_value(size_t x, size_t y) {
  return 0.1 * (double)(y * 40 + x);
}

static ef_status give_map(void *cookie, size_t y, const double **value,
                          ef_error *error) {
  static double row[40];
  size_t *const n = cookie;
  assert_int_equal(y, *n); /* in order, each once */
  ++*n;
  for (size_t x = 0; x < 40; ++x)
    row[x] = map_value(x, y);
  *value = row;
  if (y < 5)
    return EF_OK;
  error->status = EF_MALFORMED;
  return EF_MALFORMED;
}

static double lightness_at(const uint16_t *code) {
  return ef_xyz_to_lab(plain_xyz(ef_encoding_find("srgb", NULL), code),
                       (ef_xyz){96.42, 100.0, 82.49})
      .L_star;
}

/* Darker from class to class by what an eye without colour sees easily; each
 * pixel drawn as a square where it belongs; a key below. */
static void a_map_gets_darker(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  size_t n_rows = 0;
  ef_difference_map map = {.width = 40, .height = 5, .jnd = 0.8,
                           .symbol = "Delta E*00", .give = give_map,
                           .cookie = &n_rows};
  ef_difference_map_report report;
  scratch_path("map.png", path);
  assert_int_equal(ef_difference_map_write(path, false, &map, &report, NULL),
                   EF_OK);
  assert_int_equal(n_rows, 5);
  assert_int_equal(report.factor, 4);
  ef_png *png = ef_png_open(path, NULL, NULL);
  const size_t width = ef_png_get_head(png)->width;
  const size_t height = ef_png_get_head(png)->height;
  assert_true(width == 640 && height > 80);
  uint16_t *row = malloc(3 * width * sizeof *row);
  double lightness[EF_DIFFERENCE_CLASSES] = {0};
  bool has_row;
  for (size_t y = 0; y < height; ++y) {
    assert_int_equal(ef_png_next_row(png, row, &has_row, NULL), EF_OK);
    for (size_t x = 0; y >= 11 && y < 31 && x < 160; ++x) {
      const int k =
          ef_difference_class(map_value(x / 4, (y - 11) / 4) / 0.8);
      const double L_star = lightness_at(row + 3 * (11 + x));
      if (lightness[k] > 0.0)
        assert_near(L_star, lightness[k], 0.0);
      lightness[k] = L_star;
    }
  }
  for (int k = 1; k < EF_DIFFERENCE_CLASSES; ++k)
    assert_true(lightness[k - 1] - lightness[k] > 10.0);
  assert_true(lightness[EF_DIFFERENCE_CLASSES - 1] > 0.0);
  ef_png_free(png);
  free(row);
  unlink(path);
  ef_error error = {0};
  n_rows = 0;
  map.height = 6; /* whose last row fails */
  const size_t before = scratch_count();
  assert_int_equal(ef_difference_map_write(path, false, &map, &report, &error),
                   EF_MALFORMED);
  assert_int_equal(scratch_count(), before);
}

static void classes_of_differences(void **state) {
  (void)state;
  assert_int_equal(ef_difference_class(0.0), 0);
  assert_int_equal(ef_difference_class(NOT_A_NUMBER), 0);
  for (int k = 0; k + 1 < EF_DIFFERENCE_CLASSES; ++k) {
    const double end = ef_difference_class_end(k);
    assert_int_equal(ef_difference_class(end), k);
    assert_int_equal(ef_difference_class(1.0001 * end), k + 1);
  }
  assert_true(isinf(ef_difference_class_end(EF_DIFFERENCE_CLASSES - 1)));
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(what_was_written_is_read),
      cmocka_unit_test(tags_have_their_order),
      cmocka_unit_test(distinct_colours),
      cmocka_unit_test(there_and_back),
      cmocka_unit_test(nothing_half_written),
      cmocka_unit_test(maps_are_told_apart),
      cmocka_unit_test(pictures_are_compared),
      cmocka_unit_test(pictures_of_two_sizes_are_refused),
      cmocka_unit_test(a_map_gets_darker),
      cmocka_unit_test(classes_of_differences),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, scratch_make, scratch_remove);
}
