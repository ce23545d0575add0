/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pictures read back: our own writer's samples and tags, the order of tags, and
 * what comes of pictures that are converted. */
#include <stdlib.h>
#include <unistd.h>

#include <evenfield/image.h>

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

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(what_was_written_is_read),
      cmocka_unit_test(tags_have_their_order),
      cmocka_unit_test(distinct_colours),
      cmocka_unit_test(there_and_back),
      cmocka_unit_test(nothing_half_written),
      cmocka_unit_test(maps_are_told_apart),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, scratch_make, scratch_remove);
}
