/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pictures read back: pixels by libpng, chunks byte by byte. */
#include <stdlib.h>
#include <unistd.h>

#include <lcms2.h>
#include <png.h>

#include <evenfield/exchange.h>

#include "gen.h"
#include "near.h"
#include "scratch.h"

/* ---- Reading back ------------------------------------------------------ */

/* Pixels as 16-bit samples in the depth of the file; free with free(). */
typedef struct read_picture {
  png_uint_32 width, height;
  int bits, colour_type;
  uint16_t *sample;
  char profile_name[80];
  unsigned char *profile;
  png_uint_32 profile_length;
} read_picture;

static void keep_profile(png_structp png, png_infop info, read_picture *p) {
  png_charp name;
  png_bytep profile;
  png_uint_32 length;
  int method;
  if (png_get_iCCP(png, info, &name, &method, &profile, &length) == 0) return;
  snprintf(p->profile_name, sizeof p->profile_name, "%s", name);
  p->profile = malloc(length);
  assert_non_null(p->profile);
  memcpy(p->profile, profile, length);
  p->profile_length = length;
}

static read_picture read_back(const char *name) {
  char path[SCRATCH_PATH];
  read_picture p = {0};
  scratch_path(name, path);
  FILE *const file = fopen(path, "rb");
  assert_non_null(file);
  png_structp png =
      png_create_read_struct(PNG_LIBPNG_VER_STRING, NULL, NULL, NULL);
  png_infop info = png_create_info_struct(png);
  assert_non_null(info);
  if (setjmp(png_jmpbuf(png)) != 0) fail_msg("libpng refuses the picture");
  png_init_io(png, file);
  png_read_png(png, info, PNG_TRANSFORM_IDENTITY, NULL);
  p.width = png_get_image_width(png, info);
  p.height = png_get_image_height(png, info);
  p.bits = png_get_bit_depth(png, info);
  p.colour_type = png_get_color_type(png, info);
  png_bytepp rows = png_get_rows(png, info);
  const size_t n = (size_t)p.width * 3;
  p.sample = malloc(n * p.height * sizeof *p.sample);
  assert_non_null(p.sample);
  for (size_t y = 0; y < p.height; ++y) {
    for (size_t i = 0; i < n; ++i) {
      const int sample = p.bits == 8
                             ? rows[y][i]
                             : rows[y][2 * i] << 8 | rows[y][2 * i + 1];
      p.sample[y * n + i] = (uint16_t)sample;
    }
  }
  keep_profile(png, info, &p);
  png_destroy_read_struct(&png, &info, NULL);
  fclose(file);
  return p;
}

static uint32_t big_endian(const unsigned char *at) {
  return (uint32_t)at[0] << 24 | (uint32_t)at[1] << 16 | (uint32_t)at[2] << 8 |
         at[3];
}

/* Names of the chunks in file order, a blank between; IDAT once. The data of
 * `wanted` goes to `data`. */
static void list_chunks(const char *name, char list[256], const char *wanted,
                        unsigned char data[64]) {
  size_t length;
  char *const text = scratch_read(name, &length);
  const unsigned char *const bytes = (const unsigned char *)text;
  assert_memory_equal(bytes, "\x89PNG\r\n\x1a\n", 8);
  list[0] = '\0';
  for (size_t at = 8; at < length;) {
    const uint32_t size = big_endian(bytes + at);
    char type[6] = "";
    memcpy(type, bytes + at + 4, 4);
    if (strcmp(type, wanted) == 0) memcpy(data, bytes + at + 8, size);
    type[4] = ' ';
    if (strstr(list, type) == NULL) strcat(list, type);
    at += 12 + (size_t)size;
  }
  free(text);
}

static void clear(void) {
  char path[SCRATCH_PATH];
  scratch_path("p.png", path);
  assert_int_equal(unlink(path), 0);
}

static ef_status write_picture(size_t width, size_t height, int bits,
                               const uint16_t *sample, const ef_png_tags *tags,
                               bool overwrite, ef_error *error) {
  char path[SCRATCH_PATH];
  scratch_path("p.png", path);
  return ef_png_write(path, overwrite, width, height, bits, sample, tags,
                      error);
}

/* ---- Pixels ------------------------------------------------------------ */

static void sixteen_bits_are_kept(void **state) {
  (void)state;
  enum { WIDTH = 37, HEIGHT = 23, N = WIDTH * HEIGHT * 3 };
  static uint16_t sample[N];
  gen g = gen_new(16);
  for (int i = 0; i < N; ++i) sample[i] = (uint16_t)gen_below(&g, 65536);
  assert_int_equal(write_picture(WIDTH, HEIGHT, 16, sample, NULL, false, NULL),
                   EF_OK);
  const read_picture p = read_back("p.png");
  assert_int_equal(p.width, WIDTH);
  assert_int_equal(p.height, HEIGHT);
  assert_int_equal(p.bits, 16);
  assert_int_equal(p.colour_type, PNG_COLOR_TYPE_RGB);
  assert_memory_equal(p.sample, sample, sizeof sample);
  assert_null(p.profile);
  free(p.sample);
  clear();
}

/* Every one of the 65536 values against rounding in floating point. */
static void eight_bits_are_rounded(void **state) {
  (void)state;
  enum { WIDTH = 256, HEIGHT = 256, N = WIDTH * HEIGHT };
  uint16_t *const sample = malloc(N * 3 * sizeof *sample);
  assert_non_null(sample);
  for (int i = 0; i < N; ++i) {
    sample[3 * i] = (uint16_t)i;
    sample[3 * i + 1] = (uint16_t)(N - 1 - i);
    sample[3 * i + 2] = (uint16_t)(i ^ 0x5555);
  }
  assert_int_equal(write_picture(WIDTH, HEIGHT, 8, sample, NULL, false, NULL),
                   EF_OK);
  const read_picture p = read_back("p.png");
  assert_int_equal(p.bits, 8);
  for (int i = 0; i < 3 * N; ++i) {
    assert_int_equal(p.sample[i], lround(sample[i] * 255.0 / 65535.0));
  }
  free(p.sample);
  free(sample);
  clear();
}

/* ---- Tags -------------------------------------------------------------- */

static unsigned char *make_profile(cmsUInt32Number *length) {
  cmsHPROFILE profile = cmsCreate_sRGBProfile();
  assert_true(cmsSaveProfileToMem(profile, NULL, length));
  unsigned char *const bytes = malloc(*length);
  assert_non_null(bytes);
  assert_true(cmsSaveProfileToMem(profile, bytes, length));
  cmsCloseProfile(profile);
  return bytes;
}

static void tags_are_chunks(void **state) {
  (void)state;
  const uint16_t sample[3] = {65535, 32768, 0};
  cmsUInt32Number length;
  unsigned char *const profile = make_profile(&length);
  /* H.273: BT.2020 primaries, IEC 61966-2-1 transfer. */
  const ef_png_tags tags = {.primaries = 9,
                            .transfer = 13,
                            .profile_name = "wide swatch",
                            .profile = profile,
                            .profile_length = length};
  assert_int_equal(write_picture(1, 1, 8, sample, &tags, false, NULL), EF_OK);
  char list[256];
  unsigned char cicp[64] = {0};
  list_chunks("p.png", list, "cICP", cicp);
  assert_string_equal(list, "IHDR iCCP cICP IDAT IEND ");
  const unsigned char expected[] = {9, 13, 0, 1};
  assert_memory_equal(cicp, expected, 4);
  const read_picture p = read_back("p.png");
  assert_string_equal(p.profile_name, "wide swatch");
  assert_int_equal(p.profile_length, length);
  assert_memory_equal(p.profile, profile, length);
  assert_int_equal(p.sample[1], 128);
  free(p.sample);
  free(p.profile);
  free(profile);
  clear();
}

/* Readers of today's and of yesterday's chunks see the same colours. */
static void srgb_is_said_in_every_way(void **state) {
  (void)state;
  const uint16_t sample[3] = {65535, 32768, 0};
  const ef_png_tags tags = {.primaries = 1, .transfer = 13};
  char list[256], path[SCRATCH_PATH];
  unsigned char cicp[64] = {0};
  assert_int_equal(write_picture(1, 1, 8, sample, &tags, false, NULL), EF_OK);
  list_chunks("p.png", list, "cICP", cicp);
  assert_string_equal(list, "IHDR gAMA sRGB cHRM cICP IDAT IEND ");
  scratch_path("p.png", path);
  ef_png *const png = ef_png_open(path, NULL, NULL);
  assert_non_null(png);
  const ef_png_head *const head = ef_png_get_head(png);
  assert_int_equal(ef_png_get_source(head), EF_PNG_CICP);
  assert_true(head->has_srgb && head->has_gamma && head->has_chromaticities);
  /* PNG third edition, 11.3.2.5: what goes along with sRGB. */
  assert_near(head->gamma, 0.45455, 1e-9);
  assert_near(head->white.x, 0.3127, 1e-9);
  assert_near(head->white.y, 0.329, 1e-9);
  assert_near(head->red.x, 0.64, 1e-9);
  assert_near(head->green.y, 0.6, 1e-9);
  assert_near(head->blue.y, 0.06, 1e-9);
  ef_png_free(png);
  clear();
}

static void no_tags_no_chunks(void **state) {
  (void)state;
  const uint16_t sample[3] = {65535, 32768, 0};
  const ef_png_tags none = {0};
  char list[256];
  unsigned char data[64];
  assert_int_equal(write_picture(1, 1, 16, sample, NULL, false, NULL), EF_OK);
  list_chunks("p.png", list, "", data);
  assert_string_equal(list, "IHDR IDAT IEND ");
  assert_int_equal(write_picture(1, 1, 16, sample, &none, true, NULL), EF_OK);
  list_chunks("p.png", list, "", data);
  assert_string_equal(list, "IHDR IDAT IEND ");
  clear();
}

/* ---- Refusals ---------------------------------------------------------- */

static void bad_arguments(void **state) {
  (void)state;
  const uint16_t sample[3] = {0};
  ef_error error = {0};
  const unsigned char byte = 0;
  const ef_png_tags code = {.primaries = 256};
  const ef_png_tags no_name = {.profile = &byte, .profile_length = 1};
  const ef_png_tags empty = {.profile = &byte, .profile_name = "x"};
  assert_int_equal(write_picture(0, 1, 8, sample, NULL, false, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "a picture of 0 x 1 pixels");
  assert_int_equal(write_picture(1, 1000001, 8, sample, NULL, false, &error),
                   EF_INVALID);
  assert_int_equal(write_picture(1, 1, 4, sample, NULL, false, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "pictures have 8 or 16 bits, not 4");
  assert_int_equal(write_picture(1, 1, 8, sample, &code, false, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "colour tags need code points of 0 to 255");
  assert_int_equal(write_picture(1, 1, 8, sample, &no_name, false, &error),
                   EF_INVALID);
  assert_int_equal(write_picture(1, 1, 8, sample, &empty, false, &error),
                   EF_INVALID);
  assert_int_equal(scratch_count(), 0);
}

static void a_profile_that_is_none(void **state) {
  (void)state;
  const uint16_t sample[3] = {0};
  unsigned char profile[200];
  memset(profile, 0x37, sizeof profile);
  const ef_png_tags tags = {.profile_name = "none",
                            .profile = profile,
                            .profile_length = sizeof profile};
  ef_error error = {0};
  scratch_write("p.png", "old", 3);
  assert_int_equal(write_picture(1, 1, 8, sample, &tags, true, &error),
                   EF_UNWRITABLE);
  assert_error(&error, EF_UNWRITABLE, "the picture cannot be written: ");
  assert_true(strlen(error.message) > 40); /* libpng's reason follows */
  scratch_expect("p.png", "old");
  assert_int_equal(scratch_count(), 1);
  clear();
}

static void failures_leave_nothing(void **state) {
  (void)state;
  const uint16_t sample[3] = {0};
  ef_error error = {0};
  scratch_write("p.png", "old", 3);
  assert_int_equal(write_picture(1, 1, 8, sample, NULL, false, &error),
                   EF_EXISTS);
  scratch_expect("p.png", "old");
  clear();
  uint16_t *const noise = malloc(300 * 300 * 3 * sizeof *noise);
  assert_non_null(noise);
  gen g = gen_new(3);
  for (int i = 0; i < 300 * 300 * 3; ++i) noise[i] = (uint16_t)gen_bits(&g);
  assert_int_equal(
      ef_png_write("/dev/full", true, 300, 300, 16, noise, NULL, &error),
      EF_UNWRITABLE);
  assert_error(&error, EF_UNWRITABLE, "no space is left");
  assert_string_equal(error.file, "/dev/full");
  free(noise);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(sixteen_bits_are_kept),
      cmocka_unit_test(eight_bits_are_rounded),
      cmocka_unit_test(tags_are_chunks),
      cmocka_unit_test(srgb_is_said_in_every_way),
      cmocka_unit_test(no_tags_no_chunks),
      cmocka_unit_test(bad_arguments),
      cmocka_unit_test(a_profile_that_is_none),
      cmocka_unit_test(failures_leave_nothing),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, scratch_make, scratch_remove);
}
