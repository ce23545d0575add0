/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Worked examples of CIECAM02 and CIECAM16, and of the spaces on them. */
#include <evenfield/colour.h>

#include "figures.h"
#include "near.h"

static ef_xyz xyz_at(const figures *f, size_t row, size_t first) {
  return (ef_xyz){figures_number(f, row, first),
                  figures_number(f, row, first + 1),
                  figures_number(f, row, first + 2)};
}

static ef_cam_model model_at(ef_cam_version version, const figures *f,
                             size_t row) {
  ef_cam_viewing v =
      ef_cam_viewing_default(xyz_at(f, row, figures_column(f, "Xw")));
  v.adapting_luminance_cd_m2 = figures_number(f, row, figures_column(f, "L_A"));
  v.background_Y = figures_number(f, row, figures_column(f, "Y_b"));
  if (version == EF_CAM_16) {
    const char *const name =
        figures_text(f, row, figures_column(f, "surround"));
    assert_int_equal(ef_surround_find(name, &v.surround, NULL), EF_OK);
  }
  ef_cam_model model;
  assert_int_equal(ef_cam_model_set(version, &v, &model, NULL), EF_OK);
  return model;
}

/* Half a unit of the last digit that is printed. */
static double half_digit(const char *text) {
  const char *const point = strchr(text, '.');
  return point == NULL ? 0.5 : 0.5 * pow(10, -(double)strlen(point + 1));
}

static void check_column(const figures *f, size_t row, const char *column,
                         double actual, deviation *worst) {
  const size_t c = figures_column(f, column);
  const char *const text = figures_text(f, row, c);
  if (text[0] == '\0')
    return;
  /* And what rounding before the print may add. */
  assert_near(actual, figures_number(f, row, c), half_digit(text) * 1.001);
  char where[64];
  snprintf(where, sizeof where, "%s of %s", column, figures_text(f, row, 0));
  deviation_add(worst, actual, figures_number(f, row, c), where);
}

static void check_correlates(const figures *f, size_t row, ef_cam cam,
                             deviation *worst) {
  check_column(f, row, "h", cam.h_deg, worst);
  check_column(f, row, "J", cam.J, worst);
  check_column(f, row, "Q", cam.Q, worst);
  check_column(f, row, "s", cam.s, worst);
  check_column(f, row, "C", cam.C, worst);
  check_column(f, row, "M", cam.M, worst);
}

static void ciecam02_examples(void **state) {
  (void)state;
  figures f = figures_read("published", "ciecam02-examples.csv");
  figures ucs = figures_read("published", "cam02-ucs.csv");
  deviation worst = {0, ""}, worst_ucs = {0, ""};
  assert_int_equal(f.n_rows, 6);
  for (size_t row = 0; row < f.n_rows; ++row) {
    const ef_cam_model model = model_at(EF_CAM_02, &f, row);
    const ef_cam cam = ef_xyz_to_cam(xyz_at(&f, row, 1), &model);
    check_correlates(&f, row, cam, &worst);
    if (strcmp(figures_text(&f, row, 0), "E1") == 0) {
      /* Printed 240.8885, computed 240.88844: one unit of the last digit. */
      assert_near(cam.H, 240.8885, 1e-4);
    } else {
      check_column(&f, row, "H", cam.H, &worst);
    }
    const ef_ucs u = ef_cam_to_ucs(cam, ef_ucs_shape_default());
    check_column(&ucs, row, "ucs_J", u.J_prime, &worst_ucs);
    check_column(&ucs, row, "ucs_a", u.a_prime, &worst_ucs);
    check_column(&ucs, row, "ucs_b", u.b_prime, &worst_ucs);
  }
  deviation_print(&worst, "CIECAM02, 6 published examples");
  deviation_print(&worst_ucs, "CAM02-UCS, second implementation");
  figures_free(&f);
  figures_free(&ucs);
}

static void ciecam16_examples(void **state) {
  (void)state;
  figures f = figures_read("published", "ciecam16-examples.csv");
  deviation worst = {0, ""};
  assert_int_equal(f.n_rows, 8);
  for (size_t row = 0; row < f.n_rows; ++row) {
    const ef_cam_model model = model_at(EF_CAM_16, &f, row);
    const ef_cam cam = ef_xyz_to_cam(xyz_at(&f, row, 1), &model);
    check_correlates(&f, row, cam, &worst);
    check_column(&f, row, "H", cam.H, &worst);
    const ef_ucs u = ef_cam_to_ucs(cam, ef_ucs_shape_default());
    check_column(&f, row, "ucs_J", u.J_prime, &worst);
    check_column(&f, row, "ucs_a", u.a_prime, &worst);
    check_column(&f, row, "ucs_b", u.b_prime, &worst);
  }
  deviation_print(&worst, "CIECAM16, 8 examples to 6 decimals");
  figures_free(&f);
}

/* Check values in circulation, cut to 7 and 8 decimals, see
 * ciecam16-examples.csv. */
static void ciecam16_long_digits(void **state) {
  (void)state;
  figures f = figures_read("published", "ciecam16-examples.csv");
  ef_cam_model model = model_at(EF_CAM_16, &f, 0);
  ef_cam cam = ef_xyz_to_cam(xyz_at(&f, 0, 1), &model);
  assert_near(cam.J, 41.7312079, 1e-7);
  assert_near(cam.C, 0.1033557, 1e-7);
  assert_near(cam.h_deg, 217.0679597, 1e-7);
  assert_near(cam.s, 2.3450150, 1e-7);
  assert_near(cam.Q, 195.3717089, 1e-7);
  assert_near(cam.M, 0.1074367, 1e-7);
  assert_near(cam.H, 275.5949861, 1e-7);
  model = model_at(EF_CAM_16, &f, 1);
  cam = ef_xyz_to_cam(xyz_at(&f, 1, 1), &model);
  assert_near(cam.J, 65.42828069, 1e-8);
  assert_near(cam.M, 42.62473321, 1e-8);
  assert_near(cam.h_deg, 17.48659243, 1e-8);
  figures_free(&f);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(ciecam02_examples),
      cmocka_unit_test(ciecam16_examples),
      cmocka_unit_test(ciecam16_long_digits),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
