/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Published matrices and curves of the encodings. The sources stand beside the
 * figures; the documents are not at hand here, the figures were typed from
 * memory of them and agree with the chromaticities, as this test shows. */
#include <lcms2.h>

#include "base/base_private.h"
#include "device/device_private.h"
#include "near.h"

/* ---- Matrices ---------------------------------------------------------- */

typedef struct published_matrix {
  const char *encoding;
  const char *source;
  double tolerance; /* of an element; see the reason beside it */
  double m[9];
} published_matrix;

/* Half a unit of the last digit published. */
#define FOUR_DIGITS 0.5e-4
#define TEN_DIGITS 0.5e-10

/* Linear RGB to XYZ, Y of white = 1. */
static const published_matrix to_xyz[] = {
    {"srgb", "IEC 61966-2-1:1999", FOUR_DIGITS,
     {0.4124, 0.3576, 0.1805,
      0.2126, 0.7152, 0.0722,
      0.0193, 0.1192, 0.9505}},
    {"oprgb", "IEC 61966-2-5:2007", FOUR_DIGITS,
     {0.5767, 0.1856, 0.1882,
      0.2973, 0.6274, 0.0753,
      0.0270, 0.0707, 0.9913}},
    {"p3-dci", "SMPTE RP 431-2 / EG 432-1", TEN_DIGITS,
     {0.4451698156, 0.2771344092, 0.1722826698,
      0.2094916779, 0.7215952542, 0.0689130679,
      0.0000000000, 0.0470605601, 0.9073553944}},
    {"p3-d65", "SMPTE EG 432-1", TEN_DIGITS,
     {0.4865709486, 0.2656676932, 0.1982172852,
      0.2289745641, 0.6917385218, 0.0792869141,
      0.0000000000, 0.0451133819, 1.0439443689}},
    {"bt2020", "ITU-R BT.2020-2 by SMPTE RP 177, as in ITU-R BT.2407",
     FOUR_DIGITS,
     {0.6370, 0.1446, 0.1689,
      0.2627, 0.6780, 0.0593,
      0.0000, 0.0281, 1.0610}},
    {"ap0", "SMPTE ST 2065-1", TEN_DIGITS,
     {0.9525523959, 0.0000000000, 0.0000936786,
      0.3439664498, 0.7281660966, -0.0721325464,
      0.0000000000, 0.0000000000, 1.0088251844}},
};

/* ISO 22028-2 starts from the white X = 0.9642, Y = 1, Z = 0.8249 of the ICC,
 * not from its chromaticity to four digits. */
static const published_matrix romm = {
    "romm", "ISO 22028-2", FOUR_DIGITS,
    {0.7977, 0.1352, 0.0313,
     0.2880, 0.7119, 0.0001,
     0.0000, 0.0000, 0.8249}};

/* XYZ to linear RGB, from the exact matrix. */
static const published_matrix from_xyz[] = {
    {"p3-dci", "SMPTE RP 431-2 / EG 432-1", TEN_DIGITS,
     {2.7253940305, -1.0180030062, -0.4401631952,
      -0.7951680258, 1.6897320548, 0.0226471906,
      0.0412418914, -0.0876390192, 1.1009293786}},
    {"bt2020", "as in ITU-R BT.2407", FOUR_DIGITS,
     {1.7167, -0.3557, -0.2534,
      -0.6667, 1.6165, 0.0158,
      0.0176, -0.0428, 0.9421}},
};

/* XYZ to linear RGB, from the matrix that the standard itself had rounded to
 * four digits (to_xyz[0]). */
static const published_matrix from_rounded[] = {
    {"srgb", "IEC 61966-2-1:1999", FOUR_DIGITS,
     {3.2406, -1.5372, -0.4986,
      -0.9689, 1.8758, 0.0415,
      0.0557, -0.2040, 1.0570}},
    {"srgb", "IEC 61966-2-1:1999/Amd 1:2003", 0.5e-7,
     {3.2406255, -1.5372080, -0.4986286,
      -0.9689307, 1.8757561, 0.0415175,
      0.0557101, -0.2040211, 1.0569959}},
};

static void compare(const double actual[9], const published_matrix *published) {
  deviation off = {0};
  for (int i = 0; i < 9; i++) {
    char where[32];
    snprintf(where, sizeof where, "row %d, column %d", i / 3 + 1, i % 3 + 1);
    deviation_add(&off, actual[i], published->m[i], where);
  }
  char what[128];
  snprintf(what, sizeof what, "%s (%s)", published->encoding,
           published->source);
  deviation_print(&off, what);
  /* The decimal text of the figure is itself rounded in the last place. */
  assert_near(off.largest, 0, published->tolerance * (1 + 1e-6));
}

static void exact_matrix(const char *name, double matrix[9]) {
  ef_error error;
  const ef_encoding *encoding = ef_encoding_find(name, &error);
  if (encoding == NULL ||
      ef_encoding_matrix(encoding, matrix, &error) != EF_OK)
    fail_msg("%s", error.message);
}

static void rgb_to_xyz(void **state) {
  (void)state;
  double matrix[9];
  for (size_t i = 0; i < sizeof to_xyz / sizeof to_xyz[0]; i++) {
    exact_matrix(to_xyz[i].encoding, matrix);
    compare(matrix, &to_xyz[i]);
  }
}

static void rgb_to_xyz_of_romm(void **state) {
  (void)state;
  const double X = 0.9642, Y = 1.0, Z = 0.8249;
  ef_encoding encoding = *ef_encoding_find("romm", NULL);
  assert_near(encoding.white.x, X / (X + Y + Z), 0.5e-4);
  assert_near(encoding.white.y, Y / (X + Y + Z), 0.5e-4);
  encoding.white = (ef_xy){X / (X + Y + Z), Y / (X + Y + Z)};
  double matrix[9];
  assert_int_equal(ef_encoding_matrix(&encoding, matrix, NULL), EF_OK);
  compare(matrix, &romm);
}

static void xyz_to_rgb(void **state) {
  (void)state;
  double matrix[9];
  for (size_t i = 0; i < sizeof from_xyz / sizeof from_xyz[0]; i++) {
    exact_matrix(from_xyz[i].encoding, matrix);
    assert_true(ef__mat3_inverse(matrix, matrix));
    compare(matrix, &from_xyz[i]);
  }
  assert_true(ef__mat3_inverse(to_xyz[0].m, matrix));
  for (size_t i = 0; i < sizeof from_rounded / sizeof from_rounded[0]; i++)
    compare(matrix, &from_rounded[i]);
}

static void rgb_to_rgb(void **state) {
  (void)state;
  static const published_matrix forth = {
      "bt709 to bt2020", "ITU-R BT.2087-0", FOUR_DIGITS,
      {0.6274, 0.3293, 0.0433,
       0.0691, 0.9195, 0.0114,
       0.0164, 0.0880, 0.8956}};
  static const published_matrix back = {
      "bt2020 to bt709", "ITU-R BT.2407", FOUR_DIGITS,
      {1.6605, -0.5876, -0.0728,
       -0.1246, 1.1329, -0.0083,
       -0.0182, -0.1006, 1.1187}};
  double narrow[9], wide[9], matrix[9];
  exact_matrix("bt709", narrow);
  exact_matrix("bt2020", wide);
  assert_true(ef__mat3_inverse(wide, matrix));
  ef__mat3_multiply(matrix, narrow, matrix);
  compare(matrix, &forth);
  assert_true(ef__mat3_inverse(matrix, matrix));
  compare(matrix, &back);
}

/* ---- The curve of IEC 61966-2-1 ---------------------------------------- */

/* The standard gives the curve in both directions with rounded constants: from
 * linear, 12.92 C up to 0.0031308, 1.055 C^(1/2.4) - 0.055 above (equations
 * (9) and (10)); to linear with the joint at 0.04045. From memory. */
static double published_encode(double linear) {
  return linear <= 0.0031308 ? 12.92 * linear
                             : 1.055 * pow(linear, 1.0 / 2.4) - 0.055;
}

static void iec_61966_2_1_both_ways(void **state) {
  (void)state;
  ef_tone_curve *curve = ef_tone_curve_new("iec61966-2-1", NULL);
  deviation off = {0};
  for (int i = 0; i <= 100000; i++) {
    char where[32];
    snprintf(where, sizeof where, "%g", i / 100000.0);
    deviation_add(&off, ef_tone_curve_drive(curve, i / 100000.0),
                  published_encode(i / 100000.0), where);
  }
  deviation_print(&off, "IEC 61966-2-1 from linear");
  /* Only between the two joints do the directions of the standard differ, and
   * none of these amounts lies there: rounding is left, which the offset
   * magnifies by 1.055 / 0.04. */
  assert_near(off.largest, 0, 30 * 2.2e-16);
  /* Both joints, to the digits they are published with. */
  assert_near(ef_tone_curve_amount(curve, 0.04045, NULL), 0.0031308, 0.5e-7);
  assert_near(ef_tone_curve_drive(curve, 0.0031308), 0.04045, 0.5e-5);
  ef_tone_curve_free(curve);
}

/* A second implementation of the same curve: the profile that lcms2 builds
 * in. Single precision. */
static void iec_61966_2_1_against_lcms2(void **state) {
  (void)state;
  cmsContext context = cmsCreateContext(NULL, NULL);
  cmsHPROFILE profile = cmsCreate_sRGBProfileTHR(context);
  const cmsToneCurve *peer = cmsReadTag(profile, cmsSigRedTRCTag);
  ef_tone_curve *curve = ef_tone_curve_new("iec61966-2-1", NULL);
  deviation off = {0};
  for (int code = 0; code <= 255; code++) {
    char where[32];
    snprintf(where, sizeof where, "code %d", code);
    deviation_add(&off, ef_tone_curve_amount(curve, code / 255.0, NULL),
                  (double)cmsEvalToneCurveFloat(peer, (float)code / 255.0f),
                  where);
  }
  deviation_print(&off, "IEC 61966-2-1 against lcms2");
  assert_near(off.largest, 0, 3e-7); /* 2.4 times the rounding of a float */
  ef_tone_curve_free(curve);
  cmsCloseProfile(profile);
  cmsDeleteContext(context);
}

/* ISO 22028-2: the joint of ROMM at 16^(1.8 / (1 - 1.8)), and 16 times that as
 * a drive. From memory. */
static void romm_joint(void **state) {
  (void)state;
  ef_tone_curve *curve = ef_tone_curve_new("romm", NULL);
  const double joint = pow(16.0, 1.8 / (1.0 - 1.8));
  assert_near(joint, 0.001953125, 1e-17);
  assert_near(ef_tone_curve_drive(curve, joint), 16.0 * joint, 1e-16);
  assert_near(ef_tone_curve_amount(curve, 0.5, NULL), pow(0.5, 1.8), 1e-16);
  assert_near(ef_tone_curve_amount(curve, 0.02, NULL), 0.02 / 16.0, 1e-17);
  ef_tone_curve_free(curve);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(rgb_to_xyz),
      cmocka_unit_test(rgb_to_xyz_of_romm),
      cmocka_unit_test(xyz_to_rgb),
      cmocka_unit_test(rgb_to_rgb),
      cmocka_unit_test(iec_61966_2_1_both_ways),
      cmocka_unit_test(iec_61966_2_1_against_lcms2),
      cmocka_unit_test(romm_joint),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
