/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tone curves, ramps, encodings, and the profiles made of them. */
#include <stdlib.h>

#include <lcms2.h>

#include "base/base_private.h"
#include "device/device_private.h"
#include "fail_alloc.h"
#include "gen.h"
#include "near.h"

/* ---- Closed forms ------------------------------------------------------ */

static ef_tone_curve *curve_named(const char *name) {
  ef_error error;
  ef_tone_curve *curve = ef_tone_curve_new(name, &error);
  if (curve == NULL)
    fail_msg("%s: %s", name, error.message);
  return curve;
}

static void curves_by_name(void **state) {
  (void)state;
  static const struct {
    const char *name, *about;
    double amount_at_half;
  } cases[] = {
      {"linear", "linear", 0.5},
      {"LINEAR", "linear", 0.5},
      {"power:2.2", "power 2.2", 0.21763764082403103},
      {"Power:1", "power 1", 0.5},
      {"power:0.5", "power 0.5", 0.70710678118654752},
      {"iec61966-2-1", "IEC 61966-2-1 (power 2.4 with a linear toe)",
       0.21404114048223244},
      {"romm", "ISO 22028-2 (power 1.8 with a linear toe)",
       0.28717458874925875},
  };
  for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
    ef_tone_curve *curve = curve_named(cases[i].name);
    assert_string_equal(ef_tone_curve_about(curve), cases[i].about);
    /* Computed with 100 digits, rounded; pow errs by a unit or two. */
    assert_near(ef_tone_curve_amount(curve, 0.5, NULL), cases[i].amount_at_half,
                4e-16);
    ef_tone_curve_free(curve);
  }
}

static void curve_names_at_fault(void **state) {
  (void)state;
  static const struct {
    const char *name;
    ef_status status;
    const char *part;
  } cases[] = {
      {NULL, EF_INVALID, "a tone curve needs a name"},
      {"liner", EF_UNKNOWN_NAME,
       "no tone curve is called 'liner'; near names: linear"},
      {"gamma", EF_UNKNOWN_NAME,
       "known: linear, iec61966-2-1, romm, power:2.2"},
      {"power:", EF_INVALID,
       "tone curve 'power:': the power must be a number from 0.1 to 10"},
      {"power:0.09", EF_INVALID, "from 0.1 to 10"},
      {"power:10.5", EF_INVALID, "from 0.1 to 10"},
      {"power:nan", EF_INVALID, "from 0.1 to 10"},
      {"power:2,2", EF_INVALID, "from 0.1 to 10"},
      {"power:2.2x", EF_INVALID, "from 0.1 to 10"},
  };
  for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
    ef_error error;
    assert_null(ef_tone_curve_new(cases[i].name, &error));
    assert_error(&error, cases[i].status, cases[i].part);
    assert_null(ef_tone_curve_new(cases[i].name, NULL));
  }
}

static void curve_ends_and_beyond(void **state) {
  (void)state;
  static const char *const names[] = {"linear", "power:0.3", "power:2.6",
                                      "iec61966-2-1", "romm"};
  for (size_t i = 0; i < sizeof names / sizeof names[0]; i++) {
    ef_tone_curve *curve = curve_named(names[i]);
    double slope = -1.0;
    assert_true(ef_tone_curve_amount(curve, 0.0, NULL) == 0.0);
    assert_true(ef_tone_curve_amount(curve, 1.0, NULL) == 1.0);
    assert_true(ef_tone_curve_amount(curve, -3.7, NULL) == 0.0);
    assert_true(ef_tone_curve_amount(curve, INFINITE, NULL) == 1.0);
    assert_true(isnan(ef_tone_curve_amount(curve, NOT_A_NUMBER, &slope)));
    assert_true(isnan(slope));
    assert_true(ef_tone_curve_drive(curve, 0.0) == 0.0);
    assert_true(ef_tone_curve_drive(curve, 1.0) == 1.0);
    assert_true(ef_tone_curve_drive(curve, -0.2) == 0.0);
    assert_true(ef_tone_curve_drive(curve, 1.3) == 1.0);
    assert_true(isnan(ef_tone_curve_drive(curve, NOT_A_NUMBER)));
    ef_tone_curve_free(curve);
  }
  ef_tone_curve *steep = curve_named("power:0.5");
  double slope = 0.0;
  ef_tone_curve_amount(steep, 0.0, &slope);
  assert_true(isinf(slope));
  ef_tone_curve_free(steep);
  ef_tone_curve_free(NULL);
}

static void joint_of_iec_61966_2_1(void **state) {
  (void)state;
  ef_tone_curve *curve = curve_named("iec61966-2-1");
  const double below = ef_tone_curve_amount(curve, 0.04045, NULL);
  const double above = ef_tone_curve_amount(curve, nextafter(0.04045, 1), NULL);
  /* The jump that ef_tone_curve_drive speaks of. */
  assert_near(above - below, 2.3e-9, 0.05e-9);
  assert_true(ef_tone_curve_drive(curve, below) == 0.04045);
  assert_true(ef_tone_curve_drive(curve, 0.5 * (below + above)) == 0.04045);
  ef_tone_curve_free(curve);
}

/* ---- Ramps ------------------------------------------------------------- */

static void ramp_at_fault(void **state) {
  (void)state;
  static const struct {
    size_t n;
    double drive[4], level[4];
    const char *part;
  } cases[] = {
      {1, {0}, {0}, "at least 2 points, found 1"},
      {4,
       {0, 0.4, 0.4, 1},
       {0, 1, 2, 3},
       "point 3 of the tone ramp: drive 0.4 "
       "does not rise above 0.4"},
      {4,
       {0, 0.2, 0.4, 1},
       {0, 2, 1.5, 3},
       "point 3 of the tone ramp: level 1.5 does not rise above 2"},
      {4,
       {0, 0.2, 0.4, 1},
       {0, 0, 1.5, 3},
       "point 2 of the tone ramp: level 0 does not rise above 0"},
      {3,
       {0.1, 0.4, 1},
       {0, 1, 2},
       "point 1 of the tone ramp: drive 0.1, "
       "expected 0 "},
      {3,
       {0, 0.4, 0.9},
       {0, 1, 2},
       "point 3 of the tone ramp: drive 0.9, "
       "expected 1 "},
      {3,
       {0, (double)NAN, 1},
       {0, 1, 2},
       "point 2 of the tone ramp is not "
       "finite"},
      {3,
       {0, 0.5, 1},
       {0, 1, (double)INFINITY},
       "point 3 of the tone ramp is "
       "not finite"},
      {3, {0, 0.5, 1}, {-1e308, 0, 1e308}, "can tell from nothing"},
      {3, {0, 0.5, 1}, {0, 5e-324, 37.23}, "point 2 of the tone ramp: level"},
  };
  for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
    ef_error error;
    assert_null(ef_tone_curve_from_ramp(cases[i].n, cases[i].drive,
                                        cases[i].level, &error));
    assert_error(&error, EF_INVALID, cases[i].part);
  }
}

static void ramp_goes_through_its_points(void **state) {
  (void)state;
  /* Levels in cd/m2 with a black of 0.31, uneven drives. */
  static const double drive[] = {0.0, 0.11, 0.3, 0.55, 0.8, 1.0};
  static const double level[] = {0.31, 1.42, 9.7, 37.23, 80.5, 121.9};
  ef_tone_curve *curve = ef_tone_curve_from_ramp(6, drive, level, NULL);
  assert_non_null(curve);
  assert_string_equal(ef_tone_curve_about(curve), "measured ramp of 6 points");
  ef__parametric form;
  assert_false(ef__tone_curve_parametric(curve, &form));
  for (size_t i = 0; i < 6; i++) {
    const double amount = (level[i] - 0.31) / (121.9 - 0.31);
    assert_near(ef_tone_curve_amount(curve, drive[i], NULL), amount, 2e-16);
    assert_near(ef_tone_curve_drive(curve, amount), drive[i], 1e-14);
  }
  ef_tone_curve *copy = ef_tone_curve_copy(curve, NULL);
  ef_tone_curve_free(curve);
  assert_near(ef_tone_curve_amount(copy, 0.55, NULL), 36.92 / 121.59, 2e-16);
  ef_tone_curve_free(copy);
}

/* Steffen 1990, equations (2), (8) and (11), by hand for one interval. */
static void ramp_between_points_is_steffens_cubic(void **state) {
  (void)state;
  static const double drive[] = {0.0, 0.25, 0.5, 1.0};
  static const double level[] = {0.0, 0.1, 0.4, 1.0};
  ef_tone_curve *curve = ef_tone_curve_from_ramp(4, drive, level, NULL);
  /* Secants 0.4, 1.2, 1.2; p1 = (0.4 * 0.25 + 1.2 * 0.25) / 0.5 = 0.8, not
   * above 2 * 0.4; p2 = (1.2 * 0.5 + 1.2 * 0.25) / 0.75 = 1.2. */
  const double y1 = 0.8, y2 = 1.2, s = 1.2, h = 0.25;
  const double a = (y1 + y2 - 2 * s) / (h * h), b = (3 * s - 2 * y1 - y2) / h;
  const double x = 0.07;
  double slope;
  assert_near(ef_tone_curve_amount(curve, 0.25 + x, &slope),
              ((a * x + b) * x + y1) * x + 0.1, 4e-16);
  assert_near(slope, (3 * a * x + 2 * b) * x + y1, 4e-15);
  ef_tone_curve_free(curve);
}

static void ramp_of_two_points_is_a_line(void **state) {
  (void)state;
  static const double drive[] = {0.0, 1.0}, level[] = {4.2, 37.23};
  ef_tone_curve *curve = ef_tone_curve_from_ramp(2, drive, level, NULL);
  double slope = 0.0;
  assert_true(ef_tone_curve_amount(curve, 0.3723, &slope) == 0.3723);
  assert_true(slope == 1.0);
  assert_near(ef_tone_curve_drive(curve, 0.3723), 0.3723, 1e-15);
  ef_tone_curve_free(curve);
}

/* ---- Readings to a ramp ------------------------------------------------ */

static void readings_become_a_ramp(void **state) {
  (void)state;
  size_t n_pooled;
  /* Unsorted; 0.5 twice; 0.7 falls below 0.6; 0.9 lies above the end. */
  ef__ramp_point point[] = {
      {1.0, 1.0, 1},  {0.5, 0.22, 1}, {0.0, 0.0, 1},  {0.6, 0.50, 1},
      {0.7, 0.40, 1}, {0.5, 0.26, 1}, {0.9, 1.01, 1},
  };
  assert_int_equal(ef__ramp_make_monotone(7, point, &n_pooled), 4);
  assert_int_equal(n_pooled, 2);
  static const double drive[] = {0.0, 0.5, 0.65, 1.0};
  static const double level[] = {0.0, 0.24, 0.45, 1.0};
  for (size_t i = 0; i < 4; i++) {
    assert_near(point[i].drive, drive[i], 2e-16);
    assert_near(point[i].level, level[i], 2e-16);
  }
}

static void pooling_weighs_by_readings(void **state) {
  (void)state;
  size_t n_pooled;
  /* Three readings of 0.4 with mean 0.31, then one of 0.19 at 0.6. */
  ef__ramp_point point[] = {
      {0.0, 0.0, 1},  {0.4, 0.30, 1}, {0.4, 0.33, 1},
      {0.4, 0.30, 1}, {0.6, 0.19, 1}, {1.0, 1.0, 1},
  };
  assert_int_equal(ef__ramp_make_monotone(6, point, &n_pooled), 3);
  assert_int_equal(n_pooled, 1);
  assert_near(point[1].level, (3 * 0.31 + 0.19) / 4, 2e-16);
  assert_near(point[1].drive, (3 * 0.4 + 0.6) / 4, 2e-16);
}

static void flat_start_is_left_out(void **state) {
  (void)state;
  size_t n_pooled;
  ef__ramp_point point[] = {
      {0.0, 0.0, 1},  {0.1, 0.0, 1}, {0.2, -0.001, 1},
      {0.3, 0.08, 1}, {1.0, 1.0, 1},
  };
  assert_int_equal(ef__ramp_make_monotone(5, point, &n_pooled), 3);
  assert_int_equal(n_pooled, 2);
  assert_true(point[1].drive == 0.3);
}

/* ---- Encodings --------------------------------------------------------- */

static void encodings_by_name(void **state) {
  (void)state;
  static const char *const names[] = {
      "srgb",    "bt709",     "bt2020", "p3-dci", "p3-d65", "ebu", "smpte-c",
      "h273-22", "ntsc-1953", "film",   "oprgb",  "romm",   "ap0", "ap1"};
  assert_int_equal(ef_encoding_count(), sizeof names / sizeof names[0]);
  for (size_t i = 0; i < ef_encoding_count(); i++) {
    const ef_encoding *encoding = ef_encoding_at(i);
    assert_string_equal(encoding->name, names[i]);
    assert_ptr_equal(ef_encoding_find(names[i], NULL), encoding);
    assert_true(strlen(encoding->standard) > 5);
    ef_tone_curve_free(curve_named(encoding->tone));
  }
  assert_null(ef_encoding_at(ef_encoding_count()));
  assert_ptr_equal(ef_encoding_find("BT2020", NULL), ef_encoding_at(2));
  ef_error error;
  assert_null(ef_encoding_find("bt202", &error));
  assert_error(&error, EF_UNKNOWN_NAME,
               "no encoding is called 'bt202'; near names: bt2020");
  assert_null(ef_encoding_find(NULL, &error));
  assert_error(&error, EF_INVALID, "an encoding needs a name");
}

static void encoding_matrix_at_fault(void **state) {
  (void)state;
  ef_error error;
  double matrix[9];
  ef_encoding encoding = *ef_encoding_at(0);
  encoding.white.y = 0.0;
  assert_int_equal(ef_encoding_matrix(&encoding, matrix, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, "the white x = 0.3127, y = 0 has no");
  encoding = *ef_encoding_at(0);
  encoding.name = "flat";
  encoding.blue.x = 0.5 * (encoding.red.x + encoding.green.x);
  encoding.blue.y = 0.5 * (encoding.red.y + encoding.green.y);
  assert_int_equal(ef_encoding_matrix(&encoding, matrix, &error), EF_NO_ANSWER);
  assert_error(&error, EF_NO_ANSWER, "the primaries of 'flat' lie on one line");
}

/* ---- Profiles ---------------------------------------------------------- */

static cmsHPROFILE profile_of(const ef_encoding *encoding, cmsContext context) {
  unsigned char *bytes = NULL;
  size_t length = 0;
  ef_error error;
  if (ef_profile_make_matrix("Kiosk (test)", encoding, &bytes, &length,
                             &error) != EF_OK)
    fail_msg("%s: %s", encoding->name, error.message);
  cmsHPROFILE profile =
      cmsOpenProfileFromMemTHR(context, bytes, (cmsUInt32Number)length);
  free(bytes);
  assert_non_null(profile);
  return profile;
}

/* Column `c` of the matrix for D50, from the chromaticities by our own
 * adaptation, against the colorant in the profile. */
static void check_colorants(cmsHPROFILE profile, const ef_encoding *encoding,
                            deviation *off) {
  static const cmsTagSignature tag[3] = {
      cmsSigRedColorantTag, cmsSigGreenColorantTag, cmsSigBlueColorantTag};
  double matrix[9], adapt[9];
  const ef_xy w = encoding->white;
  const ef_xyz white = {w.x / w.y, 1, (1 - w.x - w.y) / w.y};
  const ef_xyz d50 = {0.9642, 1, 0.8249}; /* ICC.1:2022, 7.2.16 */
  assert_int_equal(ef_encoding_matrix(encoding, matrix, NULL), EF_OK);
  assert_int_equal(
      ef_adaptation_matrix(EF_ADAPT_BRADFORD, white, d50, adapt, NULL), EF_OK);
  ef__mat3_multiply(adapt, matrix, matrix);
  for (int c = 0; c < 3; c++) {
    const cmsCIEXYZ *xyz = cmsReadTag(profile, tag[c]);
    assert_non_null(xyz);
    deviation_add(off, xyz->X, matrix[c], encoding->name);
    deviation_add(off, xyz->Y, matrix[3 + c], encoding->name);
    deviation_add(off, xyz->Z, matrix[6 + c], encoding->name);
  }
}

static void check_curve(cmsHPROFILE profile, const ef_encoding *encoding,
                        deviation *off) {
  const cmsToneCurve *read = cmsReadTag(profile, cmsSigGreenTRCTag);
  assert_non_null(read);
  ef_tone_curve *curve = curve_named(encoding->tone);
  for (int code = 0; code <= 255; code++)
    deviation_add(
        off, (double)cmsEvalToneCurveFloat(read, (float)code / 255.0f),
        ef_tone_curve_amount(curve, code / 255.0, NULL), encoding->name);
  ef_tone_curve_free(curve);
}

static void check_texts(cmsHPROFILE profile) {
  char text[64] = "";
  cmsGetProfileInfoASCII(profile, cmsInfoDescription, "en", "US", text,
                         sizeof text);
  assert_string_equal(text, "Kiosk (test)");
  assert_true(cmsGetProfileVersion(profile) >= 4.0);
  assert_true(cmsGetDeviceClass(profile) == cmsSigDisplayClass);
  assert_true(cmsGetColorSpace(profile) == cmsSigRgbData);
  assert_true(cmsGetPCS(profile) == cmsSigXYZData);
  assert_true(cmsIsTag(profile, cmsSigChromaticAdaptationTag));
}

static void profiles_read_back(void **state) {
  (void)state;
  cmsContext context = cmsCreateContext(NULL, NULL);
  deviation colorant = {0}, curve = {0};
  for (size_t i = 0; i < ef_encoding_count(); i++) {
    const ef_encoding *encoding = ef_encoding_at(i);
    cmsHPROFILE profile = profile_of(encoding, context);
    check_texts(profile);
    check_colorants(profile, encoding, &colorant);
    check_curve(profile, encoding, &curve);
    cmsCloseProfile(profile);
  }
  deviation_print(&colorant, "colorants of profiles");
  deviation_print(&curve, "curves of profiles");
  /* Numbers are kept in s15Fixed16, rounded to half a unit of 2^-16. */
  const double half_unit = 0x1p-17;
  assert_near(colorant.largest, 0, half_unit);
  /* A change of a or b in (a X + b)^g moves an amount by at most g times as
   * much, one of g by 1 / (e g), of the toe's slope by less. */
  assert_near(curve.largest, 0, (2 * 2.4 + 0.4) * half_unit);
  cmsDeleteContext(context);
}

static void equal_input_gives_equal_bytes(void **state) {
  (void)state;
  unsigned char *a = NULL, *b = NULL;
  size_t n_a = 0, n_b = 0;
  const ef_encoding *encoding = ef_encoding_find("p3-d65", NULL);
  ef_profile_make_matrix("one", encoding, &a, &n_a, NULL);
  ef_profile_make_matrix("one", encoding, &b, &n_b, NULL);
  assert_int_equal(n_a, n_b);
  assert_memory_equal(a, b, n_a);
  assert_memory_equal(a + 24, "\x07\xd0\0\1\0\1\0\0\0\0\0\0", 12);
  free(a);
  free(b);
}

static void profiles_at_fault(void **state) {
  (void)state;
  unsigned char *bytes = NULL;
  size_t length = 0;
  ef_error error;
  ef_encoding encoding = *ef_encoding_at(0);
  assert_int_equal(
      ef_profile_make_matrix(NULL, &encoding, &bytes, &length, &error),
      EF_INVALID);
  assert_error(&error, EF_INVALID, "a profile needs a description");
  ef_profile_make_matrix("caf\xc3\xa9", &encoding, &bytes, &length, &error);
  assert_error(&error, EF_INVALID, "must be plain ASCII");
  encoding.tone = "gamma";
  ef_profile_make_matrix("x", &encoding, &bytes, &length, &error);
  assert_error(&error, EF_UNKNOWN_NAME, "no tone curve is called 'gamma'");
  encoding.white.y = -1.0;
  ef_profile_make_matrix("x", &encoding, &bytes, &length, &error);
  assert_error(&error, EF_INVALID, "has no luminance");
  assert_null(bytes);
}

/* ---- Out of memory ----------------------------------------------------- */

static bool try_ramp(void *context) {
  (void)context;
  static const double drive[] = {0.0, 0.2, 1.0}, level[] = {0, 4.2, 37.23};
  ef_error error = {0};
  ef_tone_curve *curve = ef_tone_curve_from_ramp(3, drive, level, &error);
  ef_tone_curve *copy = curve ? ef_tone_curve_copy(curve, &error) : NULL;
  const bool done = copy != NULL;
  if (!done)
    assert_int_equal(error.status, EF_NO_MEMORY);
  ef_tone_curve_free(copy);
  ef_tone_curve_free(curve);
  return done;
}

static void curves_survive_lack_of_memory(void **state) {
  (void)state;
  assert_true(fail_alloc_each(try_ramp, NULL) >= 4);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(curves_by_name),
      cmocka_unit_test(curve_names_at_fault),
      cmocka_unit_test(curve_ends_and_beyond),
      cmocka_unit_test(joint_of_iec_61966_2_1),
      cmocka_unit_test(ramp_at_fault),
      cmocka_unit_test(ramp_goes_through_its_points),
      cmocka_unit_test(ramp_between_points_is_steffens_cubic),
      cmocka_unit_test(ramp_of_two_points_is_a_line),
      cmocka_unit_test(readings_become_a_ramp),
      cmocka_unit_test(pooling_weighs_by_readings),
      cmocka_unit_test(flat_start_is_left_out),
      cmocka_unit_test(encodings_by_name),
      cmocka_unit_test(encoding_matrix_at_fault),
      cmocka_unit_test(profiles_read_back),
      cmocka_unit_test(equal_input_gives_equal_bytes),
      cmocka_unit_test(profiles_at_fault),
      cmocka_unit_test(curves_survive_lack_of_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
