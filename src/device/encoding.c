/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The published colour encodings: chromaticities, their standards, and the
 * curve a reference display of each has. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <math.h>

/* ITU-R BT.1886 with a black of zero: the video encodings are shown with a
 * power of 2.4, whatever curve the camera had. */
#define VIDEO "power:2.4"
/* SMPTE RP 431-2: projection with a power of 2.6. */
#define CINEMA "power:2.6"

/* clang-format off */
/* Whites as published: illuminants to four and three digits, and a white near
 * D60 of its own (SMPTE ST 2065-1). */
#define D65 {0.3127, 0.3290}
#define D50 {0.3457, 0.3585}
#define C_WHITE {0.310, 0.316}
#define D60 {0.32168, 0.33767}

/* Chromaticities with a code point agree with ITU-T H.273, table 2; those of
 * opRGB, ROMM, AP0 and AP1 are from memory, as are the curves of opRGB and
 * BT.470 System M and the numbers of the standards. Published matrices confirm
 * BT.709, BT.2020, both P3, opRGB, ROMM and AP0 (tests/published). */
static const ef_encoding encodings[] = {
    {"srgb", "IEC 61966-2-1:1999", 1,
     {0.640, 0.330}, {0.300, 0.600}, {0.150, 0.060}, D65,
     "iec61966-2-1"},
    {"bt709", "ITU-R BT.709-6, shown per ITU-R BT.1886", 1,
     {0.640, 0.330}, {0.300, 0.600}, {0.150, 0.060}, D65,
     VIDEO},
    {"bt2020", "ITU-R BT.2020-2, shown per ITU-R BT.1886", 9,
     {0.708, 0.292}, {0.170, 0.797}, {0.131, 0.046}, D65,
     VIDEO},
    {"p3-dci", "SMPTE RP 431-2", 11,
     {0.680, 0.320}, {0.265, 0.690}, {0.150, 0.060}, {0.314, 0.351},
     CINEMA},
    {"p3-d65", "SMPTE EG 432-1", 12,
     {0.680, 0.320}, {0.265, 0.690}, {0.150, 0.060}, D65,
     CINEMA},
    {"ebu", "EBU Tech. 3213-E, shown per ITU-R BT.1886", 5,
     {0.640, 0.330}, {0.290, 0.600}, {0.150, 0.060}, D65,
     VIDEO},
    {"smpte-c", "SMPTE RP 145, shown per ITU-R BT.1886", 6,
     {0.630, 0.340}, {0.310, 0.595}, {0.155, 0.070}, D65,
     VIDEO},
    /* H.273 attributes it to EBU Tech. 3213-E, which has other values. */
    {"h273-22", "ITU-T H.273, code 22, shown per ITU-R BT.1886", 22,
     {0.630, 0.340}, {0.295, 0.605}, {0.155, 0.077}, D65,
     VIDEO},
    {"ntsc-1953", "ITU-R BT.470-6 System M", 4,
     {0.67, 0.33}, {0.21, 0.71}, {0.14, 0.08}, C_WHITE,
     "power:2.2"},
    /* Generic film, colour filters under illuminant C. */
    {"film", "ITU-T H.273, code 8", 8,
     {0.681, 0.319}, {0.243, 0.692}, {0.145, 0.049}, C_WHITE,
     "linear"},
    /* Its power is 2 + 51/256 = 563/256. */
    {"oprgb", "IEC 61966-2-5:2007", 0,
     {0.6400, 0.3300}, {0.2100, 0.7100}, {0.1500, 0.0600}, D65,
     "power:2.19921875"},
    {"romm", "ISO 22028-2", 0,
     {0.7347, 0.2653}, {0.1596, 0.8404}, {0.0366, 0.0001}, D50,
     "romm"},
    /* Green and blue lie outside the spectrum locus: no display can be built
     * on them. */
    {"ap0", "SMPTE ST 2065-1", 0,
     {0.7347, 0.2653}, {0.0000, 1.0000}, {0.0001, -0.0770}, D60,
     "linear"},
    {"ap1", "Academy S-2014-004", 0,
     {0.713, 0.293}, {0.165, 0.830}, {0.128, 0.044}, D60,
     "linear"},
};
/* clang-format on */
enum { N_ENCODINGS = sizeof encodings / sizeof encodings[0] };

size_t ef_encoding_count(void) {
  return N_ENCODINGS;
}

const ef_encoding *ef_encoding_at(size_t i) {
  return i < N_ENCODINGS ? &encodings[i] : NULL;
}

const ef_encoding *ef_encoding_find(const char *name, ef_error *error) {
  if (name == NULL) {
    ef__error_set(error, EF_INVALID, "an encoding needs a name");
    return NULL;
  }
  const char *known[N_ENCODINGS];
  for (size_t i = 0; i < N_ENCODINGS; i++) {
    if (ef__name_equal(name, encodings[i].name))
      return &encodings[i];
    known[i] = encodings[i].name;
  }
  ef__error_unknown(error, "encoding", name, known, N_ENCODINGS);
  return NULL;
}

ef_status ef_encoding_matrix(const ef_encoding *encoding, double matrix[9],
                             ef_error *error) {
  const ef_xy corner[3] = {encoding->red, encoding->green, encoding->blue};
  const ef_xy white = encoding->white;
  if (!(white.y > 0.0) || !isfinite(white.x) || !isfinite(white.y))
    return ef__error_set(error, EF_INVALID,
                         "the white x = %g, y = %g has no luminance", white.x,
                         white.y);
  /* SMPTE RP 177, 3.3: columns are the chromaticities, each scaled so that
   * together they give the white. */
  for (int i = 0; i < 3; i++) {
    matrix[i] = corner[i].x;
    matrix[3 + i] = corner[i].y;
    matrix[6 + i] = 1.0 - corner[i].x - corner[i].y;
  }
  double inverse[9];
  if (!ef__mat3_inverse(matrix, inverse))
    return ef__error_set(error, EF_NO_ANSWER,
                         "the primaries of '%s' lie on one line",
                         encoding->name);
  double scale[3] = {white.x / white.y, 1.0,
                     (1.0 - white.x - white.y) / white.y};
  ef__mat3_apply(inverse, scale, scale);
  for (int i = 0; i < 9; i++)
    matrix[i] *= scale[i % 3];
  return EF_OK;
}

/* Black, and each primary, of a display that is the encoding. */
static ef_device *display_of(const ef_encoding *encoding,
                             const double matrix[9],
                             const ef_display_settings *settings,
                             ef_error *error) {
  static const char *const names[3] = {"red", "green", "blue"};
  static const double black[3] = {0.0, 0.0, 0.0};
  ef_tone_curve *tone = ef_tone_curve_new(encoding->tone, error);
  if (tone == NULL)
    return NULL;
  const ef_tone_curve *const curves[3] = {tone, tone, tone};
  double primary[9];
  ef__mat3_transpose(matrix, primary);
  const ef__display_parts parts = {
      .name = encoding->name,
      .n_primaries = 3,
      .primary_name = names,
      .imaginary = true,
      .black = black,
      .primary = primary,
      .curve = curves,
  };
  ef_device *device = ef__display_new(&parts, settings, error);
  ef_tone_curve_free(tone);
  return device;
}

ef_device *ef_display_from_encoding(const char *name,
                                    const ef_display_settings *settings,
                                    ef_error *error) {
  const ef_encoding *encoding = ef_encoding_find(name, error);
  double matrix[9];
  if (encoding == NULL || ef_encoding_matrix(encoding, matrix, error) != EF_OK)
    return NULL;
  return display_of(encoding, matrix, settings, error);
}
