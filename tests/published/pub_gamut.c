/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sizes of gamuts from published sources. */
#include "base/base_private.h"
#include "match/gamut_private.h"
#include "plain_setup.h"

/* ---- Published figures ------------------------------------------------- */

/* Shares of the area of the BT.2020 triangle in x, y that are quoted with the
 * standard; from memory. */
static void areas_against_bt2020(void **state) {
  (void)state;
  const double whole = plain_gamut("bt2020").area_xy;
  assert_near(100 * plain_gamut("bt709").area_xy / whole, 52.9, 0.05);
  assert_near(100 * plain_gamut("p3-d65").area_xy / whole, 71.7, 0.05);
}

static void to_d50(const double m[9], double out[9]) {
  const ef_xyz d50 = {0.96422, 1, 0.82521};
  const ef_xyz white = {m[0] + m[1] + m[2], m[3] + m[4] + m[5],
                        m[6] + m[7] + m[8]};
  double adapt[9];
  assert_int_equal(
      ef_adaptation_matrix(EF_ADAPT_BRADFORD, white, d50, adapt, NULL), EF_OK);
  ef__mat3_multiply(adapt, m, out);
}

/* Volumes in CIELAB relative to D50, adapted by linear Bradford, of a table of
 * working spaces that is in wide use; from memory. How finely its author cut
 * the solids is not known: they lie up to 0.05 % off. */
static void volumes_relative_to_d50(void **state) {
  (void)state;
  static const struct {
    const char *encoding;
    double volume;
  } published[] = {{"srgb", 832870},       {"oprgb", 1208631},
                   {"ebu", 849831},        {"smpte-c", 758857},
                   {"ntsc-1953", 1300252}, {"romm", 2879568}};
  deviation off = {0};
  for (size_t i = 0; i < sizeof published / sizeof published[0]; i++) {
    plain_setup p = plain_setup_primaries(published[i].encoding, to_d50);
    deviation_add(&off, must_gamut(p.setup).volume_lab / published[i].volume, 1,
                  published[i].encoding);
    plain_setup_free(&p);
  }
  deviation_print(&off, "volume relative to D50, ratio");
  assert_near(off.largest, 0, 5e-4);
}

/* About 2.28 million under D65: M. R. Pointer & G. G. Attridge, The number of
 * discernible colours, Color Research and Application 23 (1998) 52-54; to the
 * three digits quoted, which their own wavelength step limits (ours at 5 nm has
 * 2.280 million). */
static void object_colours_under_d65(void **state) {
  (void)state;
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  double volume;
  assert_int_equal(ef_object_solid_volume(observer, d65, &volume, NULL), EF_OK);
  printf("# object-colour solid under D65: %.0f\n", volume);
  assert_near(volume, 2.28e6, 0.01e6);
  ef_illuminant_free(d65);
  ef_observer_free(observer);
}

int main(void) {
  cmocka_set_message_output(CM_OUTPUT_TAP);
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(areas_against_bt2020),
      cmocka_unit_test(volumes_relative_to_d50),
      cmocka_unit_test(object_colours_under_d65),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
