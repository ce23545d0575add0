/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Profiles: read, as devices, as transforms, checked against measurements; and
 * what is refused. How they are made is in test_profile_make.c. */
#include <stdlib.h>

#include <evenfield/device.h>
#include <evenfield/difference.h>
#include <evenfield/match.h>

#include "fail_alloc.h"
#include "gen.h"
#include "invented_profile.h"
#include "near.h"

static char noted[4000];

static void keep_note(void *cookie, const char *line) {
  (void)cookie;
  const size_t used = strlen(noted);
  snprintf(noted + used, sizeof noted - used, "%s\n", line);
}

static const ef_notes sink = {keep_note, NULL};

static made_profile encoding_bytes(const char *name) {
  made_profile made;
  ef_error error;
  if (ef_profile_make_matrix(name, ef_encoding_find(name, NULL), &made.bytes,
                             &made.length, &error) != EF_OK)
    fail_msg("%s", error.message);
  return made;
}

static ef_profile *read_made(made_profile made) {
  ef_error error;
  ef_profile *profile =
      ef_profile_new("t.icc", made.bytes, made.length, &error);
  if (profile == NULL)
    fail_msg("%s", error.message);
  free(made.bytes);
  return profile;
}

static ef_device *device_of(const ef_profile *profile,
                            ef_profile_settings settings) {
  ef_error error;
  noted[0] = '\0';
  settings.notes = &sink;
  ef_device *device = ef_profile_device(profile, &settings, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  return device;
}

static ef_setup *seen(const ef_device *device) {
  static ef_observer *observer = NULL; /* lives as long as the tests */
  ef_error error;
  if (observer == NULL)
    observer = ef_observer_new("cie-1931", NULL);
  ef_setup *setup = ef_setup_new(device, observer, NULL, NULL, &error);
  if (setup == NULL)
    fail_msg("%s", error.message);
  return setup;
}

/* ---- Intents ------------------------------------------------------------- */

static void intents_have_names(void **state) {
  (void)state;
  ef_intent intent;
  ef_error error;
  assert_int_equal(ef_intent_find("Absolute", &intent, NULL), EF_OK);
  assert_int_equal(intent, EF_INTENT_ABSOLUTE);
  assert_string_equal(ef_intent_name(EF_INTENT_PERCEPTUAL), "perceptual");
  assert_string_equal(ef_intent_name((ef_intent)7), "unknown");
  assert_int_equal(ef_intent_find("absolut", &intent, &error), EF_UNKNOWN_NAME);
  assert_string_equal(error.message, "no intent is called 'absolut'; near "
                                     "names: absolute");
}

/* ---- What profiles say --------------------------------------------------- */

static void profiles_say_what_they_are(void **state) {
  (void)state;
  ef_profile *display = read_made(encoding_bytes("bt2020"));
  ef_profile_info info = ef_profile_get_info(display);
  assert_string_equal(info.name, "t.icc");
  assert_string_equal(info.description, "bt2020");
  assert_string_equal(info.device_class, "display");
  assert_string_equal(info.space, "RGB");
  assert_string_equal(info.pcs, "XYZ");
  assert_int_equal(info.major, 4);
  assert_int_equal(info.n_channels, 3);
  assert_true(info.is_matrix);
  assert_true(info.has_intent[EF_INTENT_SATURATION]);
  assert_near(info.media_white.X, 96.42, 0.005);
  assert_string_equal(info.missing, "");
  ef_profile_free(display);
  ef_profile *print = read_made(make_ink_profile(cmsSigCmykData, 2.1));
  info = ef_profile_get_info(print);
  assert_string_equal(info.device_class, "output");
  assert_string_equal(info.space, "CMYK");
  assert_string_equal(info.pcs, "Lab");
  assert_int_equal(info.major, 2);
  assert_int_equal(info.minor, 1);
  assert_int_equal(info.n_channels, 4);
  assert_false(info.is_matrix);
  assert_true(info.has_intent[EF_INTENT_ABSOLUTE]);
  assert_near(info.media_white.Y, 83, 0.005);
  assert_string_equal(info.missing, "B2A0 B2A1 B2A2 gamt");
  ef_profile_free(print);
  ef_profile_free(NULL);
}

/* ---- Matrix profiles ----------------------------------------------------- */

/* A profile of a published encoding is that encoding, its white at D50 by
 * linear Bradford. Columns are rounded to 2^-16. */
static void matrix_profile_is_the_encoding(void **state) {
  (void)state;
  gen g = gen_new(3601);
  deviation off = {0};
  for (size_t e = 0; e < ef_encoding_count(); e++) {
    const ef_encoding *encoding = ef_encoding_at(e);
    if (strcmp(encoding->name, "ap0") == 0)
      continue; /* its blue has Y below zero: no colour to lcms2 */
    ef_profile *profile = read_made(encoding_bytes(encoding->name));
    ef_device *described = device_of(profile, ef_profile_settings_default());
    ef_device *display = ef_display_from_encoding(encoding->name, NULL, NULL);
    ef_setup *a = seen(described), *b = seen(display);
    double matrix[9];
    assert_true(ef_setup_affine(a));
    ef_adaptation_matrix(EF_ADAPT_BRADFORD, ef_setup_white(b),
                         (ef_xyz){96.42, 100, 82.49}, matrix, NULL);
    for (int k = 0; k < 200; k++) {
      double drive[3], amount[3], own[3];
      gen_fill(&g, 3, 0, 1, drive);
      for (size_t i = 0; i < 3; i++) {
        amount[i] = ef_device_amount(described, i, drive[i], NULL);
        own[i] = ef_device_amount(display, i, drive[i], NULL);
      }
      const ef_xyz found = ef_setup_xyz(a, amount, NULL);
      const ef_xyz wanted =
          ef_xyz_transform(matrix, ef_setup_xyz(b, own, NULL));
      deviation_add(&off, found.X, wanted.X, encoding->name);
      deviation_add(&off, found.Y, wanted.Y, encoding->name);
      deviation_add(&off, found.Z, wanted.Z, encoding->name);
    }
    assert_string_equal(ef_device_kind(described), "profile");
    assert_false(ef_device_reflects(described));
    ef_setup_free(a);
    ef_setup_free(b);
    ef_device_free(display);
    ef_device_free(described);
    ef_profile_free(profile);
  }
  deviation_print(&off, "X, Y, Z of encodings and their profiles");
  /* Three columns of half of 2^-16 each, times 100, and as much for D50. */
  assert_near(off.largest, 0, 0.006);
}

static void matrix_profile_has_names_and_notes(void **state) {
  (void)state;
  ef_profile *profile = read_made(encoding_bytes("srgb"));
  ef_profile_settings settings = ef_profile_settings_default();
  ef_device *device = device_of(profile, settings);
  char said[400];
  snprintf(said, sizeof said,
           "t.icc: display profile of version 4.%d, intent relative; a matrix "
           "with curves, taken as an additive device\n"
           "t.icc: colours are relative to the medium, whose white stands at "
           "D50; its black stays as it is\n",
           ef_profile_get_info(profile).minor);
  assert_string_equal(noted, said);
  assert_string_equal(ef_device_drive_name(device, 2), "blue");
  assert_string_equal(ef_device_limit_name(device, 0, true),
                      "red at full drive");
  assert_string_equal(ef_device_curve_about(device, 0), "curve of the profile");
  double spectrum[1];
  const double drive[3] = {0};
  assert_int_equal(ef_device_spectrum(device, drive, spectrum, NULL, NULL),
                   EF_NO_ANSWER);
  ef_error error;
  ef_observer *large = ef_observer_new("cie-1964", NULL);
  assert_null(ef_setup_new(device, large, NULL, NULL, &error));
  assert_string_equal(error.message,
                      "'t.icc' is a profile: it knows colours of the observer "
                      "cie-1931 under D50 only; observer cie-1964 needs the "
                      "spectra of the device");
  ef_observer_free(large);
  ef_device_free(device);
  ef_profile_free(profile);
}

/* ---- Table profiles ------------------------------------------------------ */

/* What the profile gives, worked out again. */
static ef_xyz ink_xyz(const double drive[3], double black, bool absolute) {
  const ef_xyz white = {96.42, 100, 82.49};
  ef_xyz xyz = ef_lab_to_xyz(
      invented_ink_lab(drive[0], drive[1], drive[2], black), white);
  if (absolute)
    xyz = (ef_xyz){xyz.X * 80 / 96.42, xyz.Y * 83 / 100, xyz.Z * 71 / 82.49};
  return xyz;
}

/* Between points of its table, where the surface of the formula is bent, the
 * table is off by some tenths; at its points by its 16 bits alone. */
static void check_ink_profile(cmsColorSpaceSignature space, double version,
                              ef_intent intent, double black) {
  gen g = gen_new(3602);
  ef_profile *profile = read_made(make_ink_profile(space, version));
  ef_profile_settings settings = ef_profile_settings_default();
  settings.intent = intent;
  settings.black = black;
  ef_device *device = device_of(profile, settings);
  ef_setup *setup = seen(device);
  deviation off = {0};
  const bool absolute = intent == EF_INTENT_ABSOLUTE;
  assert_false(ef_setup_affine(setup));
  assert_near(ef_setup_resolution(setup), 1e-4, 0);
  assert_near(ef_setup_white(setup).X, 96.42, 0.005);
  for (int k = 0; k < 200; k++) {
    double drive[3];
    for (int i = 0; i < 3; i++)
      drive[i] = (double)gen_below(&g, 9) / 8;
    const ef_xyz found = ef_setup_xyz(setup, drive, NULL);
    const ef_xyz wanted = ink_xyz(drive, black, absolute);
    deviation_add(&off, found.X, wanted.X, "X");
    deviation_add(&off, found.Y, wanted.Y, "Y");
    deviation_add(&off, found.Z, wanted.Z, "Z");
  }
  deviation_print(&off, "X, Y, Z at points of the table");
  /* L* to 0.0015, a* and b* to 0.004 (16 bits; of version 2 a little less),
   * times d X / d a* of up to 0.6. */
  assert_near(off.largest, 0, 0.012);
  assert_string_equal(ef_device_drive_name(device, 0), "cyan");
  assert_string_equal(ef_device_limit_name(device, 1, true),
                      "magenta at 100 %");
  ef_setup_free(setup);
  ef_device_free(device);
  ef_profile_free(profile);
}

static void ink_profiles_are_their_tables(void **state) {
  (void)state;
  check_ink_profile(cmsSigCmykData, 2.1, EF_INTENT_RELATIVE, 0);
  assert_non_null(strstr(noted, "t.icc: black is fixed at 0 %\n"));
  check_ink_profile(cmsSigCmykData, 4.3, EF_INTENT_RELATIVE, 0.5);
  assert_string_equal(
      noted,
      "t.icc: output profile of version 4.3, intent relative; evaluated in "
      "single precision, slopes over 1/256 of a drive\n"
      "t.icc: colours are relative to the medium, whose white stands at D50; "
      "its black stays as it is\n"
      "t.icc: black is fixed at 50 %\n");
  check_ink_profile(cmsSigCmyData, 4.3, EF_INTENT_SATURATION, 0);
  check_ink_profile(cmsSigCmyData, 2.1, EF_INTENT_PERCEPTUAL, 0);
  check_ink_profile(cmsSigCmykData, 4.3, EF_INTENT_ABSOLUTE, 0.25);
  assert_non_null(strstr(noted, "t.icc: colours are absolute under D50; the "
                                "medium's white is X 80.00 Y 83.00 Z 71.00\n"));
}

/* Version 4: the reference medium of these intents has a black, Y = 0.34731
 * (ICC.1 annex), which is no light. */
static void perceptual_black_of_version_4(void **state) {
  (void)state;
  ef_profile *profile = read_made(make_ink_profile(cmsSigCmykData, 4.3));
  ef_profile_settings settings = ef_profile_settings_default();
  settings.intent = EF_INTENT_PERCEPTUAL;
  for (int k = 0; k < 2; k++) {
    settings.black_point_compensation = k == 1;
    ef_device *device = device_of(profile, settings);
    ef_setup *setup = seen(device);
    const double drive[3] = {0.5, 0.5, 0.5};
    const double found = ef_setup_xyz(setup, drive, NULL).Y;
    const double Y = ink_xyz(drive, 0, false).Y;
    const double scaled = 100 * (Y - 0.34731) / (100 - 0.34731);
    assert_near(found, k == 0 ? Y : scaled, 0.005);
    ef_setup_free(setup);
    ef_device_free(device);
  }
  ef_profile_free(profile);
}

static void slopes_of_tables_are_differences(void **state) {
  (void)state;
  ef_profile *profile = read_made(make_ink_profile(cmsSigCmykData, 4.3));
  ef_device *device = device_of(profile, ef_profile_settings_default());
  ef_setup *setup = seen(device);
  static const double at[3][3] = {{0.3, 0.6, 0.2}, {0, 0.4, 1}, {1, 1, 0}};
  for (int k = 0; k < 3; k++) {
    double j[9], up[3], down[3];
    ef_setup_xyz(setup, at[k], j);
    for (int i = 0; i < 3; i++) {
      memcpy(up, at[k], sizeof up);
      memcpy(down, at[k], sizeof down);
      up[i] = fmin(up[i] + 1.0 / 256, 1);
      down[i] = fmax(down[i] - 1.0 / 256, 0);
      const double run = up[i] - down[i];
      const ef_xyz a = ef_setup_xyz(setup, up, NULL);
      const ef_xyz b = ef_setup_xyz(setup, down, NULL);
      assert_near(j[i], (a.X - b.X) / run, 1e-9);
      assert_near(j[3 + i], (a.Y - b.Y) / run, 1e-9);
      assert_near(j[6 + i], (a.Z - b.Z) / run, 1e-9);
    }
  }
  ef_setup_free(setup);
  ef_device_free(device);
  ef_profile_free(profile);
}

/* Colours of the profile are found in gamut, and what is shown differs by no
 * more than 16 bits hide. */
static void tables_are_matched(void **state) {
  (void)state;
  enum { N = 100 };
  static double target[3 * N];
  static ef_match match[N];
  gen g = gen_new(3603);
  deviation off = {0};
  ef_profile *profile = read_made(make_ink_profile(cmsSigCmykData, 4.3));
  ef_device *device = device_of(profile, ef_profile_settings_default());
  ef_setup *setup = seen(device);
  const ef_match_settings settings = ef_match_settings_default();
  const ef_xyz white = ef_setup_white(setup);
  for (int i = 0; i < N; i++) {
    double drive[3];
    gen_fill(&g, 3, 0.01, 0.99, drive);
    const ef_xyz xyz = ef_setup_xyz(setup, drive, NULL);
    target[3 * i] = xyz.X;
    target[3 * i + 1] = xyz.Y;
    target[3 * i + 2] = xyz.Z;
  }
  assert_int_equal(ef_match_batch(setup, N, target, &settings, 1, match, NULL),
                   EF_OK);
  for (int i = 0; i < N; i++) {
    const double *t = target + 3 * i;
    assert_true(match[i].in_gamut);
    const ef_xyz shown = ef_setup_xyz(setup, match[i].nearest.amount, NULL);
    deviation_add(
        &off,
        ef_delta_e_ciede2000(ef_xyz_to_lab((ef_xyz){t[0], t[1], t[2]}, white),
                             ef_xyz_to_lab(shown, white), 1, 1, 1),
        0, "a colour");
  }
  deviation_print(&off, "CIEDE2000 of matches through a table");
  assert_near(off.largest, 0, 0.02);
  ef_setup_free(setup);
  ef_device_free(device);
  ef_profile_free(profile);
}

static void rgb_tables_are_lights(void **state) {
  (void)state;
  ef_profile *profile =
      read_made(make_table_profile(cmsSigRgbData, cmsSigDisplayClass));
  ef_device *device = device_of(profile, ef_profile_settings_default());
  ef_setup *setup = seen(device);
  const double half[3] = {0.5, 0.5, 0.5};
  assert_false(ef_setup_affine(setup));
  assert_near(ef_setup_xyz(setup, half, NULL).Y, 50, 0.02);
  assert_string_equal(ef_profile_get_info(profile).missing, "B2A0");
  ef_setup_free(setup);
  ef_device_free(device);
  ef_profile_free(profile);
}

/* ---- What is refused ----------------------------------------------------- */

static void refuse_device(made_profile made, ef_profile_settings settings,
                          ef_status status, const char *message) {
  ef_error error = {0};
  char text[800];
  ef_profile *profile = read_made(made);
  assert_null(ef_profile_device(profile, &settings, &error));
  assert_int_equal(error.status, status);
  ef_error_describe(&error, text, sizeof text);
  assert_string_equal(text, message);
  ef_profile_free(profile);
}

static void profiles_that_cannot_serve(void **state) {
  (void)state;
  const ef_profile_settings plain = ef_profile_settings_default();
  ef_profile_settings settings = plain;
  refuse_device(make_grey_profile(), plain, EF_NO_ANSWER,
                "t.icc: has device values of space GRAY; profiles of RGB, CMY "
                "and CMYK can be matched with");
  refuse_device(make_table_profile(cmsSigLabData, cmsSigAbstractClass), plain,
                EF_NO_ANSWER,
                "t.icc: is a profile of class abstract, which describes no "
                "device");
  refuse_device(make_table_profile(cmsSigRgbData, cmsSigLinkClass), plain,
                EF_NO_ANSWER,
                "t.icc: is a profile of class device link, which describes no "
                "device");
  settings.black = 1.5;
  refuse_device(make_ink_profile(cmsSigCmykData, 4.3), settings, EF_INVALID,
                "black fixed at 1.5; expected a drive from 0 to 1");
  settings.black = 0.5;
  refuse_device(make_ink_profile(cmsSigCmyData, 4.3), settings, EF_INVALID,
                "black is fixed at 0.5, but 't.icc' has no black (CMY)");
}

static void refuse_bytes(const unsigned char *bytes, size_t length,
                         const char *message) {
  ef_error error = {0};
  char text[800];
  assert_null(ef_profile_new("t.icc", bytes, length, &error));
  assert_int_equal(error.status, EF_MALFORMED);
  ef_error_describe(&error, text, sizeof text);
  assert_string_equal(text, message);
}

/* Place of a tag's entry in the tag table. */
static unsigned char *entry_of(const made_profile *made, const char *tag) {
  const size_t n = made->bytes[131];
  for (size_t i = 0; i < n; i++)
    if (memcmp(made->bytes + 132 + 12 * i, tag, 4) == 0)
      return made->bytes + 132 + 12 * i;
  fail_msg("no tag %s", tag);
  return NULL;
}

static unsigned char *tag_of(const made_profile *made, const char *tag) {
  const unsigned char *entry = entry_of(made, tag);
  return made->bytes +
         ((size_t)entry[5] << 16 | (size_t)entry[6] << 8 | entry[7]);
}

static void bytes_that_are_no_profile(void **state) {
  (void)state;
  made_profile made = encoding_bytes("srgb");
  unsigned char *b = made.bytes;
  refuse_bytes(b, 100,
               "t.icc: is no ICC profile: it has 100 bytes, expected at least "
               "132");
  char cut[200];
  snprintf(cut, sizeof cut,
           "t.icc: is cut off: its header says %zu bytes, found %zu",
           made.length, made.length - 1);
  refuse_bytes(b, made.length - 1, cut);
  b[36] = 'x';
  refuse_bytes(b, made.length,
               "t.icc: is no ICC profile: 'acsp' does not stand at byte 36");
  b[36] = 'a';
  b[8] = 5;
  refuse_bytes(b, made.length,
               "t.icc: is of version 5; profiles of versions 2 and 4 are read");
  b[8] = 4;
  const unsigned char kept = b[3];
  memset(b, 0, 3);
  b[3] = 60;
  snprintf(cut, sizeof cut, "t.icc: says that it has 60 bytes, found %zu",
           made.length);
  refuse_bytes(b, made.length, cut);
  b[0] = 0;
  b[2] = (unsigned char)(made.length >> 8);
  b[3] = kept;
  b[128] = 255;
  snprintf(cut, sizeof cut,
           "t.icc: says that it has %zu tags; expected at most 100, and no "
           "more than there is room for",
           ((size_t)255 << 24) + b[131]);
  refuse_bytes(b, made.length, cut);
  b[128] = 0;
  unsigned char *entry = entry_of(&made, "rXYZ");
  entry[8] = 127; /* its size */
  refuse_bytes(b, made.length,
               "t.icc: field rXYZ: the tag lies outside the profile; the "
               "profile is damaged or made to mislead");
  free(made.bytes);
}

static void refuse_table(made_profile made, const char *message) {
  char text[300];
  snprintf(text, sizeof text,
           "t.icc: field A2B0: %s; the profile is damaged or made to mislead",
           message);
  refuse_bytes(made.bytes, made.length, text);
  free(made.bytes);
}

/* Tables that claim more than is there. */
static void tables_made_to_mislead(void **state) {
  (void)state;
  made_profile made = make_ink_profile(cmsSigCmykData, 2.1);
  assert_memory_equal(tag_of(&made, "A2B0"), "mft2", 4);
  tag_of(&made, "A2B0")[10] = 255; /* points of the grid */
  refuse_table(made, "the table says it is larger than its tag");
  made = make_ink_profile(cmsSigCmykData, 2.1);
  tag_of(&made, "A2B0")[8] = 0; /* inputs */
  refuse_table(made, "the table has no channels, or more than 15");
  made = make_ink_profile(cmsSigCmykData, 2.1);
  tag_of(&made, "A2B0")[48] = 255; /* entries of a curve */
  refuse_table(made, "a curve of the table has other than 2 to 4096 entries");
  made = make_ink_profile(cmsSigCmykData, 4.3);
  assert_memory_equal(tag_of(&made, "A2B0"), "mAB ", 4);
  unsigned char *table = tag_of(&made, "A2B0");
  const size_t at = (size_t)table[26] << 8 | table[27];
  table[at] = 200;
  refuse_table(made, "the table says it is larger than its tag");
  made = make_ink_profile(cmsSigCmykData, 4.3);
  tag_of(&made, "A2B0")[24] = 200; /* where the table stands */
  refuse_table(made, "the table lies beyond its tag");
  made = make_ink_profile(cmsSigCmykData, 4.3);
  tag_of(&made, "A2B0")[9] = 16;
  refuse_table(made, "the table has no channels, or more than 15");
}

/* A table of floating-point elements, put together by hand. */
static void elements_made_to_mislead(void **state) {
  (void)state;
  made_profile made = make_ink_profile(cmsSigCmykData, 4.3);
  unsigned char *tag = tag_of(&made, "A2B0");
  unsigned char *entry = entry_of(&made, "A2B0");
  static const unsigned char elements[] = {
      'm', 'p', 'e', 't', 0, 0, 0, 0,  0, 4, 0, 3, 0, 0, 0, 1, /* one element */
      0,   0,   0,   24,  0, 0, 0, 40,                         /* its place */
      'c', 'l', 'u', 't', 0, 0, 0, 0,  0, 4, 0, 3, 9, 9, 9, 9};
  memcpy(tag, elements, sizeof elements);
  entry[8] = entry[9] = 0;
  entry[10] = 0;
  entry[11] = 80;
  refuse_table((made_profile){made.bytes, made.length},
               "a table says it is larger than its element");
  made = make_ink_profile(cmsSigCmykData, 4.3);
  tag = tag_of(&made, "A2B0");
  memcpy(tag, elements, sizeof elements);
  tag[20] = 255; /* size of the element */
  refuse_table((made_profile){made.bytes, made.length},
               "an element lies beyond its tag");
  made = make_ink_profile(cmsSigCmykData, 4.3);
  tag = tag_of(&made, "A2B0");
  memcpy(tag, elements, sizeof elements);
  tag[12] = 255; /* number of elements */
  refuse_table((made_profile){made.bytes, made.length},
               "the list of elements is longer than its tag");
}

/* ---- Transforms ---------------------------------------------------------- */

static ef_transform *transform_of(const ef_profile *from, const ef_profile *to,
                                  ef_intent intent, bool lab) {
  const ef_transform_settings settings = {.intent = intent, .lab = lab};
  ef_error error;
  ef_transform *t = ef_transform_new(from, to, &settings, &error);
  if (t == NULL)
    fail_msg("%s", error.message);
  return t;
}

/* There and back, through X, Y, Z and through Lab, and between two encodings;
 * the same for one and for two threads. */
static void colours_go_there_and_back(void **state) {
  (void)state;
  enum { N = 700 };
  static double rgb[3 * N], mid[3 * N], back[3 * N], again[3 * N];
  gen g = gen_new(3604);
  ef_profile *wide = read_made(encoding_bytes("bt2020"));
  ef_profile *narrow = read_made(encoding_bytes("srgb"));
  gen_fill(&g, 3 * N, 0, 1, rgb);
  for (int k = 0; k < 3; k++) {
    const bool lab = k == 1;
    ef_profile *other = k == 2 ? wide : NULL;
    ef_transform *out = transform_of(narrow, other, EF_INTENT_RELATIVE, lab);
    ef_transform *in = transform_of(other, narrow, EF_INTENT_RELATIVE, lab);
    assert_int_equal(ef_transform_inputs(out), 3);
    assert_int_equal(ef_transform_outputs(in), 3);
    ef_transform_apply(out, N, rgb, 1, mid, NULL);
    ef_transform_apply(out, N, rgb, 2, again, NULL);
    assert_same_bits(again, mid, 3 * N);
    ef_transform_apply(in, N, mid, 0, back, NULL);
    deviation off = {0};
    for (size_t i = 0; i < 3 * N; i++)
      deviation_add(&off, back[i], rgb[i],
                    k == 0   ? "X, Y, Z"
                    : k == 1 ? "Lab"
                             : "encoding");
    deviation_print(&off, "there and back");
    /* Single precision, steepest at black. */
    assert_near(off.largest, 0, 1e-4);
    ef_transform_free(out);
    ef_transform_free(in);
  }
  ef_profile_free(narrow);
  ef_profile_free(wide);
}

static void transforms_have_scales(void **state) {
  (void)state;
  ef_profile *display = read_made(encoding_bytes("srgb"));
  ef_profile *print = read_made(make_ink_profile(cmsSigCmykData, 4.3));
  const double white[3] = {1, 1, 1}, paper[4] = {0, 0, 0, 0};
  const double much[3] = {7, -3, 1};
  double out[3];
  ef_transform *t = transform_of(display, NULL, EF_INTENT_RELATIVE, false);
  ef_transform_apply(t, 1, white, 1, out, NULL);
  assert_near(out[1], 100, 1e-3);
  ef_transform_free(t);
  t = transform_of(display, NULL, EF_INTENT_RELATIVE, true);
  ef_transform_apply(t, 1, white, 1, out, NULL);
  assert_near(out[0], 100, 1e-3);
  assert_near(out[1], 0, 0.02);
  ef_transform_free(t);
  t = transform_of(print, NULL, EF_INTENT_ABSOLUTE, false);
  assert_int_equal(ef_transform_inputs(t), 4);
  ef_transform_apply(t, 1, paper, 1, out, NULL);
  assert_near(out[1], 83, 0.01);
  ef_transform_free(t);
  t = transform_of(display, display, EF_INTENT_RELATIVE, false);
  ef_transform_apply(t, 1, much, 1, out, NULL);
  assert_near(out[0], 1, 1e-4);
  assert_near(out[1], 0, 1e-4);
  ef_transform_free(t);
  ef_profile_free(print);
  ef_profile_free(display);
}

static void transforms_at_fault(void **state) {
  (void)state;
  ef_profile *print = read_made(make_ink_profile(cmsSigCmykData, 4.3));
  ef_profile *link =
      read_made(make_table_profile(cmsSigRgbData, cmsSigLinkClass));
  ef_error error = {0};
  char text[800];
  assert_null(ef_transform_new(NULL, NULL, NULL, &error));
  assert_string_equal(error.message, "a transform needs a profile");
  assert_null(ef_transform_new(NULL, print, NULL, &error));
  assert_int_equal(error.status, EF_NO_ANSWER);
  ef_error_describe(&error, text, sizeof text);
  assert_non_null(strstr(text, "t.icc: there is no transform in this direction "
                               "with intent relative"));
  assert_null(ef_transform_new(link, NULL, NULL, &error));
  assert_string_equal(error.message, "is a profile of class device link, which "
                                     "describes no device");
  ef_transform *t = ef_transform_new(print, NULL, NULL, &error);
  const double in[8] = {0, 0, 0, 0, 0, NOT_A_NUMBER, 0, 0};
  double out[6];
  assert_int_equal(ef_transform_apply(t, 2, in, 1, out, &error), EF_INVALID);
  assert_string_equal(error.message, "value 2 of colour 2 is not finite");
  ef_transform_free(t);
  ef_transform_free(NULL);
  ef_profile_free(link);
  ef_profile_free(print);
}

/* The black of a table is scaled away, and white stays. */
static void blacks_are_compensated(void **state) {
  (void)state;
  ef_profile *print = read_made(make_ink_profile(cmsSigCmyData, 4.3));
  ef_profile_settings settings = ef_profile_settings_default();
  ef_device *plain = device_of(print, settings);
  settings.black_point_compensation = true;
  ef_device *scaled = device_of(print, settings);
  assert_non_null(strstr(noted, "its black is scaled to no light\n"));
  ef_setup *a = seen(plain), *b = seen(scaled);
  const double full[3] = {1, 1, 1};
  const double before = ef_setup_xyz(a, full, NULL).Y;
  const double after = ef_setup_xyz(b, full, NULL).Y;
  printf("# Y of the black: %.4f, compensated %.4f\n", before, after);
  assert_true(before > 1);
  assert_near(after, 0, 0.05);
  const double none[3] = {0};
  assert_near(ef_setup_xyz(b, none, NULL).Y, 100, 0.02);
  ef_setup_free(a);
  ef_setup_free(b);
  ef_device_free(scaled);
  ef_device_free(plain);
  ef_profile_free(print);
}

/* ---- Checks -------------------------------------------------------------- */

/* A display measured in cd/m2 with a white of its own, against the profile of
 * the encoding it keeps to. */
static void good_profile_passes_its_check(void **state) {
  (void)state;
  enum { ROWS = 60 };
  gen g = gen_new(3605);
  double drive[3 * ROWS], xyz[3 * ROWS];
  ef_residual residual[ROWS];
  ef_profile *profile = read_made(encoding_bytes("p3-d65"));
  ef_device *display = ef_display_from_encoding("p3-d65", NULL, NULL);
  ef_setup *setup = seen(display);
  gen_fill(&g, 3 * ROWS, 0, 1, drive);
  drive[0] = drive[1] = drive[2] = 1;
  for (size_t r = 0; r < ROWS; r++) {
    double amount[3];
    for (size_t i = 0; i < 3; i++)
      amount[i] = ef_device_amount(display, i, drive[3 * r + i], NULL);
    const ef_xyz seen_xyz = ef_setup_xyz(setup, amount, NULL);
    xyz[3 * r] = 1.73 * seen_xyz.X; /* some luminance */
    xyz[3 * r + 1] = 1.73 * seen_xyz.Y;
    xyz[3 * r + 2] = 1.73 * seen_xyz.Z;
  }
  const ef_measurements m = {
      .n_rows = ROWS, .n_drives = 3, .drive = drive, .xyz = xyz};
  deviation off = {0};
  assert_int_equal(ef_profile_check(profile, &m, NULL, residual, NULL), EF_OK);
  for (size_t r = 0; r < ROWS; r++) {
    const ef_residual *q = &residual[r];
    assert_int_equal(q->row, r);
    deviation_add(&off,
                  ef_delta_e_ciede2000(ef_xyz_to_lab(q->measured, q->white),
                                       ef_xyz_to_lab(q->predicted, q->white), 1,
                                       1, 1),
                  0, "a row");
  }
  deviation_print(&off, "CIEDE2000 of a display and its profile");
  assert_near(off.largest, 0, 0.02);
  ef_setup_free(setup);
  ef_device_free(display);
  ef_profile_free(profile);
}

static void refuse_check(const ef_profile *profile, const ef_measurements *m,
                         ef_status status, const char *message, size_t line) {
  ef_residual residual[4];
  ef_error error = {0};
  assert_int_equal(ef_profile_check(profile, m, NULL, residual, &error),
                   status);
  assert_string_equal(error.message, message);
  assert_int_equal(error.line, line);
}

static void checks_at_fault(void **state) {
  (void)state;
  ef_profile *display = read_made(encoding_bytes("srgb"));
  ef_profile *print = read_made(make_ink_profile(cmsSigCmykData, 4.3));
  double drive[8] = {1, 1, 1, 0.5, 0.5, 0.5, 0, 0};
  double xyz[6] = {95, 100, 108, 20, 21, 22};
  const size_t line[2] = {4, 5};
  ef_measurements m = {
      .n_rows = 2, .n_drives = 3, .drive = drive, .xyz = xyz, .line = line};
  ef_residual residual[2];
  ef_error error;
  assert_int_equal(ef_profile_check(display, &m, NULL, residual, NULL), EF_OK);
  assert_int_equal(ef_profile_check(display, &m, NULL, NULL, &error),
                   EF_INVALID);
  assert_string_equal(error.message, "a check needs a profile, measurements "
                                     "and a place for what it finds");
  refuse_check(print, &m, EF_INVALID,
               "found 3 device values a row; the profile 't.icc' has 4 (CMYK)",
               0);
  drive[0] = 0.99;
  refuse_check(display, &m, EF_NO_ANSWER,
               "no row shows the white (all device values 1), which intent "
               "relative is relative to",
               0);
  drive[0] = 1;
  xyz[4] = INFINITE;
  refuse_check(display, &m, EF_INVALID,
               "row 2: expected device values of 0 to 1 and finite "
               "measurements",
               5);
  xyz[4] = 21;
  drive[4] = -1;
  refuse_check(display, &m, EF_INVALID,
               "row 2: expected device values of 0 to 1 and finite "
               "measurements",
               5);
  m.n_rows = 0;
  refuse_check(display, &m, EF_INVALID, "a table of measurements without rows",
               0);
  m.n_rows = 2;
  m.spectrum = xyz;
  refuse_check(display, &m, EF_INVALID,
               "measurements are either tristimulus values or spectra; found "
               "both",
               0);
  m.n_drives = 4;
  m.xyz = NULL;
  refuse_check(print, &m, EF_INVALID,
               "a profile of inks is checked against X, Y, Z under D50, not "
               "against spectra",
               0);
  ef_profile_free(print);
  ef_profile_free(display);
}

/* Inks are relative to their paper by ratios, and absolute as measured. */
static void ink_profile_passes_its_check(void **state) {
  (void)state;
  enum { ROWS = 3 };
  const double drive[4 * ROWS] = {0, 0, 0, 0, 1, 0, 0.5, 0, 0.25, 0.5, 0, 1};
  double xyz[3 * ROWS];
  ef_residual residual[ROWS];
  ef_profile *profile = read_made(make_ink_profile(cmsSigCmykData, 4.3));
  for (size_t r = 0; r < ROWS; r++) {
    const ef_xyz paper = ink_xyz(drive + 4 * r, drive[4 * r + 3], true);
    xyz[3 * r] = paper.X;
    xyz[3 * r + 1] = paper.Y;
    xyz[3 * r + 2] = paper.Z;
  }
  const ef_measurements m = {
      .n_rows = ROWS, .n_drives = 4, .drive = drive, .xyz = xyz};
  for (int k = 0; k < 2; k++) {
    ef_profile_settings settings = ef_profile_settings_default();
    settings.intent = k == 0 ? EF_INTENT_RELATIVE : EF_INTENT_ABSOLUTE;
    assert_int_equal(ef_profile_check(profile, &m, &settings, residual, NULL),
                     EF_OK);
    assert_near(residual[0].measured.Y, k == 0 ? 100 : 83, 1e-9);
    for (size_t r = 0; r < ROWS; r++) {
      assert_near(residual[r].predicted.X, residual[r].measured.X, 0.012);
      assert_near(residual[r].predicted.Y, residual[r].measured.Y, 0.012);
      assert_near(residual[r].predicted.Z, residual[r].measured.Z, 0.012);
    }
  }
  ef_profile_free(profile);
}

/* ---- Memory -------------------------------------------------------------- */

static bool attempt(void *context) {
  const made_profile *made = context;
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_profile *profile =
      ef_profile_new("t.icc", made->bytes, made->length, NULL);
  ef_device *device =
      profile != NULL ? ef_profile_device(profile, NULL, NULL) : NULL;
  ef_transform *transform =
      profile != NULL ? ef_transform_new(profile, NULL, NULL, NULL) : NULL;
  ef_setup *setup = NULL;
  if (device != NULL && observer != NULL)
    setup = ef_setup_new(device, observer, NULL, NULL, NULL);
  /* A profile that cannot be read as a matrix for want of memory still serves
   * through lcms2; that is no failure. */
  const bool whole =
      setup != NULL && transform != NULL && ef_setup_affine(setup);
  ef_setup_free(setup);
  ef_transform_free(transform);
  ef_device_free(device);
  ef_profile_free(profile);
  ef_observer_free(observer);
  return whole;
}

static void no_memory(void **state) {
  (void)state;
  made_profile made = encoding_bytes("srgb");
  assert_true(fail_alloc_each(attempt, &made) > 10);
  free(made.bytes);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(intents_have_names),
      cmocka_unit_test(profiles_say_what_they_are),
      cmocka_unit_test(matrix_profile_is_the_encoding),
      cmocka_unit_test(matrix_profile_has_names_and_notes),
      cmocka_unit_test(ink_profiles_are_their_tables),
      cmocka_unit_test(perceptual_black_of_version_4),
      cmocka_unit_test(slopes_of_tables_are_differences),
      cmocka_unit_test(tables_are_matched),
      cmocka_unit_test(rgb_tables_are_lights),
      cmocka_unit_test(profiles_that_cannot_serve),
      cmocka_unit_test(bytes_that_are_no_profile),
      cmocka_unit_test(tables_made_to_mislead),
      cmocka_unit_test(elements_made_to_mislead),
      cmocka_unit_test(colours_go_there_and_back),
      cmocka_unit_test(transforms_have_scales),
      cmocka_unit_test(transforms_at_fault),
      cmocka_unit_test(blacks_are_compensated),
      cmocka_unit_test(good_profile_passes_its_check),
      cmocka_unit_test(checks_at_fault),
      cmocka_unit_test(ink_profile_passes_its_check),
      cmocka_unit_test(no_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
