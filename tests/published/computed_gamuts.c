/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Areas, coverages and volumes of gamuts, and optimal colours, against check
 * values computed once by a second implementation from the same definitions:
 * not published figures. They are not part of this repository: the environment
 * variable EVENFIELD_REFERENCE names a folder with
 * surfaces/gamut_areas_computed.csv, gamut_volumes.csv and
 * optimal_colours_computed.csv; without it the tests are skipped. */
#include <stdlib.h>

#include "figures.h"
#include "match/gamut_private.h"
#include "plain_setup.h"

/* ---- Gamuts ------------------------------------------------------------ */

/* Their names of our encodings. */
static const char *const pairs[][2] = {{"BT709", "bt709"},
                                       {"P3_D65", "p3-d65"},
                                       {"BT2020", "bt2020"},
                                       {"OPRGB", "oprgb"},
                                       {"EBU", "ebu"},
                                       {"SMPTE_C", "smpte-c"},
                                       {"NTSC1953", "ntsc-1953"},
                                       {"ROMM", "romm"},
                                       {"AP0", "ap0"},
                                       {"AP1", "ap1"}};
enum { N_PAIRS = sizeof pairs / sizeof pairs[0] };

static void triangle_of(const char *encoding, ef_xy out[3]) {
  const ef_encoding *e = ef_encoding_find(encoding, NULL);
  out[0] = e->red;
  out[1] = e->green;
  out[2] = e->blue;
  assert_int_equal(ef__polygon_hull(3, out), 3);
}

static void computed_areas(void **state) {
  (void)state;
  figures f = figures_reference("gamut_areas_computed.csv");
  deviation area = {0}, locus = {0}, coverage = {0};
  ef_xy wide[3];
  triangle_of("bt2020", wide);
  for (size_t i = 0; i < N_PAIRS; i++) {
    const char *const name = pairs[i][1];
    const size_t row = figures_row(&f, pairs[i][0]);
#define FIGURE(column) figures_number(&f, row, figures_column(&f, column))
    const ef_gamut g = plain_gamut(name);
    deviation_add(&area, g.area_xy, FIGURE("area_xy"), name);
    deviation_add(&area, g.area_uv, FIGURE("area_uv"), name);
    deviation_add(&locus, 100 * g.locus_share_xy, FIGURE("coverage_locus_xy"),
                  name);
    deviation_add(&locus, 100 * g.locus_share_uv, FIGURE("coverage_locus_uv"),
                  name);
    ef_xy t[3];
    triangle_of(name, t);
    deviation_add(&coverage,
                  100 * ef__polygon_overlap(3, t, 3, wide) /
                      ef__polygon_area(3, wide),
                  FIGURE("coverage_bt2020_xy"), name);
  }
  deviation_print(&area, "areas");
  deviation_print(&locus, "coverage of the locus, %");
  deviation_print(&coverage, "coverage of BT.2020, %");
  /* Six decimals there, one of them rounded from a half. */
  assert_near(area.largest, 0, 0.51e-6);
  assert_near(locus.largest, 0, 0.51e-6);
  assert_near(coverage.largest, 0, 0.51e-6);
  figures_free(&f);
}

static void computed_volumes(void **state) {
  (void)state;
  figures f = figures_reference("gamut_volumes.csv");
  const size_t column = figures_column(&f, "volume_own_white");
  deviation box = {0}, solid = {0};
  for (size_t i = 0; i < 8; i++) {
    const size_t row = figures_row(&f, pairs[i][0]);
    plain_setup p = plain_setup_primaries(pairs[i][1], NULL);
    deviation_add(&box,
                  must_gamut(p.setup).volume_lab / figures_number(&f, row, column),
                  1, pairs[i][1]);
    plain_setup_free(&p);
  }
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  static const char *const names[3] = {"D65", "A", "E"};
  for (int i = 0; i < 3; i++) {
    char row_name[32];
    snprintf(row_name, sizeof row_name, "OBJECT_SOLID_%s", names[i]);
    ef_illuminant *light = ef_illuminant_new(names[i], NULL);
    double volume;
    ef_object_solid_volume(observer, light, &volume, NULL);
    deviation_add(
        &solid, volume / figures_number(&f, figures_row(&f, row_name), column),
        1, names[i]);
    ef_illuminant_free(light);
  }
  deviation_print(&box, "volumes of gamuts, ratio");
  deviation_print(&solid, "volumes of the object colours, ratio");
  assert_near(box.largest, 0, 1e-4);
  assert_near(solid.largest, 0, 1e-4);
  ef_observer_free(observer);
  figures_free(&f);
}

/* ---- Optimal colours --------------------------------------------------- */

static ef_lch lch_at(const ef__section *s, double t, size_t i, ef_xyz white,
                     ef_xyy *xyy) {
  const ef__corner *const a = &s->corner[i], *const b =
                                                 &s->corner[(i + 1) % s->n];
  const ef_xyz xyz = {a->x + t * (b->x - a->x), s->Y, a->z + t * (b->z - a->z)};
  *xyy = ef_xyz_to_xyy(xyz);
  return ef_lab_to_lch(ef_xyz_to_lab(xyz, white));
}

/* How far a hue is ahead of another, -180 to 180. */
static double ahead(double h_deg, double of_deg) {
  return remainder(h_deg - of_deg, 360);
}

/* The boundary colour of that hue: the side of the section on which it lies,
 * halved until it is found. */
static ef_lch boundary(const ef__section *s, double h_deg, ef_xyz white,
                       ef_xyy *xyy) {
  for (size_t i = 0; i < s->n; i++) {
    double low = 0, high = 1;
    const double before = ahead(lch_at(s, 0, i, white, xyy).h_deg, h_deg);
    const double after = ahead(lch_at(s, 1, i, white, xyy).h_deg, h_deg);
    if ((before < 0) == (after < 0) || fabs(before - after) > 180)
      continue;
    for (int k = 0; k < 50; k++) {
      const double middle = (low + high) / 2;
      const double there = ahead(lch_at(s, middle, i, white, xyy).h_deg, h_deg);
      if ((there < 0) == (before < 0))
        low = middle;
      else
        high = middle;
    }
    return lch_at(s, low, i, white, xyy);
  }
  return (ef_lch){NOT_A_NUMBER, NOT_A_NUMBER, NOT_A_NUMBER};
}

/* Whether the x, y of a row has the hue it is said to have. One row has not: it
 * lies on a long side near white, where the other implementation interpolated
 * x, y and chroma each for itself. */
static bool is_consistent(ef_xyy xyy, double h_deg, ef_xyz white) {
  const ef_lch lch = ef_lab_to_lch(ef_xyz_to_lab(ef_xyy_to_xyz(xyy), white));
  return fabs(ahead(lch.h_deg, h_deg)) < 0.1;
}

static void computed_optimal_colours(void **state) {
  (void)state;
  figures f = figures_reference("optimal_colours_computed.csv");
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_illuminant *light = NULL;
  ef__solid solid;
  ef__section section = {.corner = NULL};
  deviation chroma = {0}, xy = {0};
  const char *name = "";
  size_t n_inconsistent = 0;
  for (size_t row = 0; row < f.n_rows; row++) {
    if (strcmp(name, figures_text(&f, row, 0)) != 0) {
      name = figures_text(&f, row, 0);
      ef_illuminant_free(light);
      light = ef_illuminant_new(name, NULL);
      assert_int_equal(ef__solid_set(observer, light, &solid, NULL), EF_OK);
      free(section.corner);
      section.corner = calloc(ef__solid_corners(&solid), sizeof(ef__corner));
    }
    ef__solid_cut(&solid, FIGURE("y_lum"), &section);
    ef_xyy xyy;
    const double h_deg = FIGURE("h_ab");
    const ef_lch lch = boundary(&section, h_deg, solid.white, &xyy);
    char where[64];
    snprintf(where, sizeof where, "%s, Y %g, hue %g", name, section.Y, h_deg);
    assert_near(lch.L_star, FIGURE("l_star"), 0.51e-4);
    if (!is_consistent((ef_xyy){FIGURE("x"), FIGURE("y"), section.Y}, h_deg,
                       solid.white)) {
      n_inconsistent++;
      continue;
    }
    deviation_add(&chroma, lch.C_star, FIGURE("c_ab"), where);
    deviation_add(&xy, xyy.x, FIGURE("x"), where);
    deviation_add(&xy, xyy.y, FIGURE("y"), where);
  }
  printf("# %zu boundary colours, %zu left out\n", f.n_rows, n_inconsistent);
  assert_int_equal(n_inconsistent, 1);
  deviation_print(&chroma, "chroma of boundary colours");
  deviation_print(&xy, "x, y of boundary colours");
  /* Its D65 was interpolated from 10 nm, ours is the table of 1 nm. */
  assert_near(chroma.largest, 0, 0.02);
  assert_near(xy.largest, 0, 2e-4);
  free(section.corner);
  ef_illuminant_free(light);
  ef_observer_free(observer);
  figures_free(&f);
}

int main(void) {
  if (figures_no_reference("check values of gamuts"))
    return 0;
  cmocka_set_message_output(CM_OUTPUT_TAP);
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(computed_areas),
      cmocka_unit_test(computed_volumes),
      cmocka_unit_test(computed_optimal_colours),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
