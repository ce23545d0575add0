/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Laws of gamuts, on random triangles of primaries. */
#include <stdlib.h>

#include "base/base_private.h"
#include "gen.h"
#include "match/gamut_private.h"
#include "plain_setup.h"

enum { N = 12 };

/* Primaries at a random share of the way from a random white to red, green and
 * blue corners near or outside the locus (up to 1.08 the Y of blue is above 0).
 * Returns the XYZ matrix for a white of Y = 100. */
static void random_matrix(gen *g, double low, double high, double out[9]) {
  static const double corner[3][2] = {{0.74, 0.26}, {0.05, 0.9}, {0.15, 0.03}};
  const double wx = gen_between(g, 0.29, 0.36), wy = wx + 0.015;
  double a[9];
  for (int i = 0; i < 3; i++) {
    const double t = gen_between(g, low, high);
    const double x = wx + t * (corner[i][0] - wx);
    const double y = wy + t * (corner[i][1] - wy);
    a[i] = x;
    a[3 + i] = y;
    a[6 + i] = 1 - x - y;
  }
  double amount[3] = {100 * wx / wy, 100, 100 * (1 - wx - wy) / wy};
  double solved[9];
  for (int i = 0; i < 9; i++)
    solved[i] = a[i];
  assert_true(ef__solve(3, solved, 1, amount));
  for (int i = 0; i < 9; i++)
    out[i] = a[i] * amount[i % 3];
}

static ef_gamut measure(const ef_setup *setup, const char *light,
                        ef_adaptation adaptation, int jobs) {
  ef_illuminant *illuminant = ef_illuminant_new(light, NULL);
  ef_gamut out;
  ef_error error;
  if (ef_gamut_measure(setup, illuminant, adaptation, jobs, &out, &error) !=
      EF_OK)
    fail_msg("%s", error.message);
  ef_illuminant_free(illuminant);
  return out;
}

static const ef_adaptation adaptations[3] = {EF_ADAPT_NONE, EF_ADAPT_BRADFORD,
                                             EF_ADAPT_CAT16};
static const char *const lights[4] = {"D65", "A", "FL2", "planck:12000"};

/* ---- Shares ------------------------------------------------------------ */

/* Also under lights whose adaptation takes the Y of some bands below zero. */
static void shares_lie_between_0_and_1(void **state) {
  (void)state;
  gen g = gen_new(1);
  for (int i = 0; i < N; i++) {
    double m[9];
    random_matrix(&g, 0.2, 1.08, m);
    plain_setup p = plain_setup_new(m);
    const ef_gamut a = measure(p.setup, lights[i % 4], adaptations[i % 3], 0);
    assert_true(a.solid_share > 0 && a.solid_share <= 1);
    assert_true(a.locus_share_xy > 0 && a.locus_share_xy <= 1 + 1e-12);
    assert_true(a.locus_share_uv > 0 && a.locus_share_uv <= 1 + 1e-12);
    plain_setup_free(&p);
  }
}

/* Of two setups with one white, the one whose primaries lie farther out on the
 * same lines shows all that the other shows. */
static void larger_primaries_never_show_less(void **state) {
  (void)state;
  gen g = gen_new(2);
  for (int i = 0; i < N; i++) {
    double small[9], large[9];
    const double reach = gen_between(&g, 0.3, 0.95);
    gen again = g; /* the same white */
    random_matrix(&g, reach, reach * 1.0001, small);
    random_matrix(&again, reach * 1.02, reach * 1.12, large);
    plain_setup p = plain_setup_new(small), q = plain_setup_new(large);
    const ef_gamut a = measure(p.setup, lights[i % 4], adaptations[i % 3], 0);
    const ef_gamut b = measure(q.setup, lights[i % 4], adaptations[i % 3], 0);
    assert_true(b.solid_share >= a.solid_share);
    assert_true(b.volume_lab > a.volume_lab);
    assert_true(b.area_xy > a.area_xy && b.area_uv > a.area_uv);
    assert_true(b.locus_share_xy >= a.locus_share_xy - 1e-12);
    assert_true(b.locus_share_uv >= a.locus_share_uv - 1e-12);
    plain_setup_free(&p);
    plain_setup_free(&q);
  }
}

/* ---- Boxes ------------------------------------------------------------- */

/* CIELAB knows ratios to the white only. */
static void scaled_amounts_keep_the_volume(void **state) {
  (void)state;
  gen g = gen_new(3);
  for (int i = 0; i < N; i++) {
    double m[9];
    random_matrix(&g, 0.3, 1, m);
    plain_setup p = plain_setup_new(m);
    const ef_xyz w = ef_setup_white(p.setup);
    const double scale = gen_between(&g, 0.1, 5);
    ef__box box;
    assert_true(ef__box_from_setup(p.setup, &box));
    double one, other;
    ef__box_volume(&box, w, 32, 1, &one, NULL);
    for (int k = 0; k < 3; k++)
      box.high[k] = scale;
    ef__box_volume(&box, (ef_xyz){scale * w.X, scale * w.Y, scale * w.Z}, 32, 1,
                   &other, NULL);
    assert_near_relative(other, one, 1e-11);
    plain_setup_free(&p);
  }
}

static double overlap(const ef__solid *solid, const ef__box *box,
                      ef_xyz white) {
  size_t n;
  double whole, part;
  double *const triangle = ef__box_triangles(box, &n, NULL);
  assert_int_equal(
      ef__solid_overlap(solid, white, n, triangle, 24, 1, &whole, &part, NULL),
      EF_OK);
  free(triangle);
  return part;
}

/* Two parts of a box have its volume together, and its share of the solid. The
 * sections are cut at the same heights, so that the latter agree but for the
 * bend of pieces of sides; the meshes agree to what their steps leave. */
static void parts_of_a_box_add_up(void **state) {
  (void)state;
  gen g = gen_new(4);
  for (int i = 0; i < N; i++) {
    double m[9], volume[3], share[3];
    random_matrix(&g, 0.3, 1.08, m);
    plain_setup p = plain_setup_new(m);
    ef_illuminant *light = ef_illuminant_new(lights[i % 4], NULL);
    ef__solid solid;
    assert_int_equal(ef__solid_set(p.observer, light, &solid, NULL), EF_OK);
    const double at = gen_between(&g, 0.1, 0.9);
    const int k = i % 3;
    for (int part = 0; part < 3; part++) {
      ef__box box;
      assert_true(ef__box_from_setup(p.setup, &box));
      if (part == 1)
        box.high[k] = at;
      if (part == 2)
        box.low[k] = at;
      ef__box_volume(&box, solid.white, 128, 0, &volume[part], NULL);
      share[part] = overlap(&solid, &box, solid.white);
      assert_true(volume[part] > 0 && share[part] > 0);
    }
    assert_near_relative(volume[1] + volume[2], volume[0], 1e-4);
    assert_near_relative(share[1] + share[2], share[0], 1e-5);
    ef_illuminant_free(light);
    plain_setup_free(&p);
  }
}

/* ---- Order and threads ------------------------------------------------- */

static void order_of_primaries_does_not_matter(void **state) {
  (void)state;
  gen g = gen_new(5);
  for (int i = 0; i < N; i++) {
    double m[9], turned[9];
    random_matrix(&g, 0.3, 1.08, m);
    for (int c = 0; c < 9; c++)
      turned[c] = m[3 * (c / 3) + (i % 2 == 0 ? (c + 1) % 3 : 2 - c % 3)];
    plain_setup p = plain_setup_new(m), q = plain_setup_new(turned);
    const ef_gamut a = measure(p.setup, "D65", EF_ADAPT_CAT16, 0);
    const ef_gamut b = measure(q.setup, "D65", EF_ADAPT_CAT16, 0);
    assert_near(b.area_xy, a.area_xy, 1e-15);
    /* Cells are divided along the other diagonal. */
    assert_near_relative(b.volume_lab, a.volume_lab, 1e-4);
    assert_near(b.solid_share, a.solid_share, 1e-9);
    plain_setup_free(&p);
    plain_setup_free(&q);
  }
}

static void threads_do_not_matter(void **state) {
  (void)state;
  gen g = gen_new(6);
  double m[9];
  random_matrix(&g, 0.5, 1.08, m);
  plain_setup p = plain_setup_new(m);
  const ef_gamut one = measure(p.setup, "D50", EF_ADAPT_BRADFORD, 1);
  static const int jobs[] = {0, 2, 3, 7};
  for (size_t i = 0; i < sizeof jobs / sizeof jobs[0]; i++) {
    const ef_gamut many = measure(p.setup, "D50", EF_ADAPT_BRADFORD, jobs[i]);
    assert_same_bits(&many.volume_lab, &one.volume_lab, 1);
    assert_same_bits(&many.solid_share, &one.solid_share, 1);
    assert_same_bits(&many.locus_share_uv, &one.locus_share_uv, 1);
  }
  plain_setup_free(&p);
}

int main(void) {
  cmocka_set_message_output(CM_OUTPUT_TAP);
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(shares_lie_between_0_and_1),
      cmocka_unit_test(larger_primaries_never_show_less),
      cmocka_unit_test(scaled_amounts_keep_the_volume),
      cmocka_unit_test(parts_of_a_box_add_up),
      cmocka_unit_test(order_of_primaries_does_not_matter),
      cmocka_unit_test(threads_do_not_matter),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
