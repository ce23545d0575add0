/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Additive setups of given tristimulus values, black zero, for the CIE 1931
 * observer. */
#ifndef EVENFIELD_TESTS_PLAIN_SETUP_H
#define EVENFIELD_TESTS_PLAIN_SETUP_H

#include "must.h"
#include "near.h"

typedef struct plain_setup {
  ef_observer *observer;
  ef_device *device;
  ef_setup *setup;
} plain_setup;

static inline plain_setup plain_setup_of(ef_device *device) {
  plain_setup p = {ef_observer_new("cie-1931", NULL), device, NULL};
  ef_error error;
  p.setup = ef_setup_new(device, p.observer, NULL, NULL, &error);
  if (p.setup == NULL)
    fail_msg("%s", error.message);
  return p;
}

/** `vector` is 3 x 3 as in an RGB to XYZ matrix. */
static inline plain_setup plain_setup_new(const double vector[9]) {
  static const double drive[9] = {1, 0, 0, 0, 1, 0, 0, 0, 1};
  double xyz[9];
  for (int i = 0; i < 9; i++)
    xyz[i] = vector[3 * (i % 3) + i / 3];
  ef_measurements rows = {
      .n_rows = 3, .n_drives = 3, .drive = drive, .xyz = xyz};
  ef_tone_curve *linear = ef_tone_curve_new("linear", NULL);
  ef_display_settings settings = ef_display_settings_default();
  settings.n_curves = 1;
  settings.curve = (const ef_tone_curve *const *)&linear;
  ef_error error;
  ef_device *device = ef_display_from_measurements("plain", &rows, &settings,
                                                   NULL, NULL, &error);
  ef_tone_curve_free(linear);
  if (device == NULL)
    fail_msg("%s", error.message);
  return plain_setup_of(device);
}

static inline plain_setup plain_setup_named(const char *encoding) {
  ef_error error;
  ef_device *device = ef_display_from_encoding(encoding, NULL, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  return plain_setup_of(device);
}

/** Primaries of an encoding, colours multiplied by `adapt` unless NULL. For
 * ntsc-1953 the white is illuminant C to five digits, 0.31006 and 0.31616: the
 * standard rounds it to 0.310 and 0.316, tables of volumes do not. */
static inline plain_setup plain_setup_primaries(const char *encoding,
                                                void (*adapt)(const double m[9],
                                                              double out[9])) {
  ef_encoding e = *ef_encoding_find(encoding, NULL);
  if (strcmp(encoding, "ntsc-1953") == 0)
    e.white = (ef_xy){0.31006, 0.31616};
  double m[9];
  assert_int_equal(ef_encoding_matrix(&e, m, NULL), EF_OK);
  if (adapt != NULL)
    adapt(m, m);
  return plain_setup_new(m);
}

static inline void plain_setup_free(plain_setup *p) {
  ef_setup_free(p->setup);
  ef_device_free(p->device);
  ef_observer_free(p->observer);
}

static inline ef_gamut plain_gamut(const char *encoding) {
  plain_setup p = plain_setup_named(encoding);
  const ef_gamut gamut = must_gamut(p.setup);
  plain_setup_free(&p);
  return gamut;
}

#endif
