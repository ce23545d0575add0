/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Metamer mismatch bodies against metamers made otherwise: 100 000 random ones
 * by walks in the null space of the reference, and for few samples every corner
 * of the set by trying all of them. */
#include <stdlib.h>

#include <evenfield/match.h>

#include "gen.h"
#include "must.h"
#include "near.h"

enum { SAMPLES = 81, METAMERS = 100000, BLOCK = 1000 };

typedef struct eyes {
  ef_illuminant *d65, *a, *fl11;
  ef_observer *cie_1931, *cie_1964;
  ef_look reference, test[3];
} eyes;

static int open_eyes(void **state) {
  eyes *const e = calloc(1, sizeof *e);
  e->d65 = ef_illuminant_new("D65", NULL);
  e->a = ef_illuminant_new("A", NULL);
  e->fl11 = ef_illuminant_new("FL11", NULL);
  e->cie_1931 = ef_observer_new("cie-1931", NULL);
  e->cie_1964 = ef_observer_new("cie-1964", NULL);
  e->reference = (ef_look){e->cie_1931, ef_viewing_default(e->d65)};
  e->test[0] = (ef_look){e->cie_1931, ef_viewing_default(e->a)};
  e->test[1] = (ef_look){e->cie_1931, ef_viewing_default(e->fl11)};
  e->test[2] = (ef_look){e->cie_1964, ef_viewing_default(e->d65)};
  *state = e;
  return 0;
}

static int close_eyes(void **state) {
  eyes *const e = *state;
  ef_observer_free(e->cie_1931);
  ef_observer_free(e->cie_1964);
  ef_illuminant_free(e->d65);
  ef_illuminant_free(e->a);
  ef_illuminant_free(e->fl11);
  free(e);
  return 0;
}

static ef_xyz colour_of(const ef_weights *weights, const double *spectrum) {
  double xyz[3];
  assert_int_equal(ef_weights_apply(weights, 1, spectrum, 1, xyz, NULL),
                   EF_OK);
  return (ef_xyz){xyz[0], xyz[1], xyz[2]};
}

static ef_metamer_set *make(const eyes *e, size_t test, ef_xyz xyz,
                            const ef_metamer_settings *settings, int jobs) {
  ef_error error;
  ef_metamer_set *const set = ef_metamer_set_new(
      1, &e->reference, &xyz, &e->test[test], settings, jobs, &error);
  if (set == NULL)
    fail_msg("%s", error.message);
  return set;
}

/* The next metamer of a walk: in a random direction that the reference does not
 * see, as far as the limits allow or a random part of it. */
static void walk(gen *g, const ef_weights *reference, double *spectrum) {
  static const double nothing[SAMPLES];
  double way[SAMPLES], low = -INFINITE, high = INFINITE;
  for (size_t k = 0; k < SAMPLES; ++k)
    way[k] = gen_normal(g);
  assert_int_equal(
      ef_spectral_correct(reference, 1, nothing, way, way, NULL), EF_OK);
  for (size_t k = 0; k < SAMPLES; ++k) {
    const double to_0 = (0 - spectrum[k]) / way[k];
    const double to_1 = (1 - spectrum[k]) / way[k];
    low = fmax(low, fmin(to_0, to_1));
    high = fmin(high, fmax(to_0, to_1));
  }
  const double part = gen_between(g, -0.2, 1.2);
  const double length =
      low + (part < 0 ? 0 : part > 1 ? 1 : part) * (high - low);
  for (size_t k = 0; k < SAMPLES; ++k)
    spectrum[k] += length * way[k];
}

/* Whether the tetrahedron from the centre to some triangle of the mesh holds
 * the colour: then it is inside the points found, not inside the planes alone.
 */
static bool in_mesh(const ef_metamer_set *set, ef_xyz xyz) {
  const ef_xyz c = ef_metamer_set_body(set).center;
  const double q[3] = {xyz.X - c.X, xyz.Y - c.Y, xyz.Z - c.Z};
  const size_t *corner;
  const size_t n = ef_metamer_set_triangles(set, &corner);
  for (size_t t = 0; t < n; ++t) {
    double v[3][3], cross[3][3], share[3];
    for (size_t i = 0; i < 3; ++i) {
      const ef_xyz p = ef_metamer_set_point(set, corner[3 * t + i]);
      v[i][0] = p.X - c.X;
      v[i][1] = p.Y - c.Y;
      v[i][2] = p.Z - c.Z;
    }
    bool inside = true;
    double sum = 0;
    for (size_t i = 0; i < 3 && inside; ++i) {
      const double *const a = v[(i + 1) % 3], *const b = v[(i + 2) % 3];
      cross[i][0] = a[1] * b[2] - a[2] * b[1];
      cross[i][1] = a[2] * b[0] - a[0] * b[2];
      cross[i][2] = a[0] * b[1] - a[1] * b[0];
      const double whole = v[i][0] * cross[i][0] + v[i][1] * cross[i][1] +
                           v[i][2] * cross[i][2];
      share[i] =
          (q[0] * cross[i][0] + q[1] * cross[i][1] + q[2] * cross[i][2]) /
          whole;
      inside = share[i] >= 0;
      sum += share[i];
    }
    if (inside)
      return sum <= 1;
  }
  return false;
}

/* METAMERS random metamers of a grey, a red and a green are all within the
 * planes, and within the mesh of points. */
static void random_metamers_are_inside(void **state) {
  const eyes *const e = *state;
  const ef_metamer_settings settings = ef_metamer_settings_default();
  ef_weights *const reference = must_weights(&e->reference, &settings.grid);
  static double spectrum[BLOCK * SAMPLES], xyz[3 * BLOCK];
  gen g = gen_new(81);
  size_t n_seen = 0, n_mesh = 0;
  double nearest = -INFINITE;
  for (size_t s = 0; s < 3; ++s) {
    double start[SAMPLES], at[SAMPLES];
    for (size_t k = 0; k < SAMPLES; ++k)
      start[k] = s == 0   ? 0.5
                 : s == 1 ? 0.1 + 0.6 / (1 + exp(0.2 * (46 - (double)k)))
                          : 0.05 + 0.5 * exp(-0.005 * pow((double)k - 30, 2));
    ef_weights *const test = must_weights(&e->test[s], &settings.grid);
    ef_metamer_set *const set =
        make(e, s, colour_of(reference, start), &settings, 0);
    while (n_seen < (s + 1) * METAMERS / 3 + 1) {
      memcpy(at, start, sizeof at);
      for (size_t i = 0; i < BLOCK; ++i) {
        walk(&g, reference, at);
        memcpy(spectrum + i * SAMPLES, at, sizeof at);
      }
      ef_weights_apply(test, BLOCK, spectrum, 1, xyz, NULL);
      for (size_t i = 0; i < BLOCK; ++i) {
        const ef_xyz colour = {xyz[3 * i], xyz[3 * i + 1], xyz[3 * i + 2]};
        const double outside = ef_metamer_set_outside(set, colour);
        nearest = fmax(nearest, outside);
        assert_true(outside <= 1e-9);
        if (i % 10 == 0) {
          assert_true(in_mesh(set, colour));
          ++n_mesh;
        }
      }
      n_seen += BLOCK;
    }
    ef_metamer_set_free(set);
    ef_weights_free(test);
  }
  assert_true(n_seen >= METAMERS);
  printf("# %zu random metamers within the planes, the nearest to one by %.3g; "
         "%zu of %zu within the mesh\n",
         n_seen, -nearest, n_mesh, n_mesh);
  ef_weights_free(reference);
}

/* The surface that reaches each point is a metamer and has its colour, and the
 * plane touches there: the others are on its inner side. */
static void points_are_metamers(void **state) {
  const eyes *const e = *state;
  const ef_metamer_settings settings = ef_metamer_settings_default();
  ef_weights *const reference = must_weights(&e->reference, &settings.grid);
  gen g = gen_new(82);
  for (int round = 0; round < 12; ++round) {
    double start[SAMPLES];
    gen_smooth(&g, SAMPLES, start);
    const size_t t = (size_t)round % 3;
    ef_weights *const test = must_weights(&e->test[t], &settings.grid);
    const ef_xyz target = colour_of(reference, start);
    ef_metamer_set *const set = make(e, t, target, &settings, 0);
    assert_false(ef_metamer_set_body(set).is_flat);
    for (size_t i = 0; i < ef_metamer_set_count(set); ++i) {
      const double *const spectrum = ef_metamer_set_spectrum(set, i);
      for (size_t k = 0; k < SAMPLES; ++k)
        assert_true(spectrum[k] >= 0 && spectrum[k] <= 1);
      const ef_xyz seen = colour_of(reference, spectrum);
      const ef_xyz there = colour_of(test, spectrum);
      const ef_xyz point = ef_metamer_set_point(set, i);
      assert_near(seen.X, target.X, 1e-9);
      assert_near(seen.Y, target.Y, 1e-9);
      assert_near(seen.Z, target.Z, 1e-9);
      assert_near(there.X, point.X, 1e-9);
      assert_near(there.Y, point.Y, 1e-9);
      assert_near(there.Z, point.Z, 1e-9);
      /* On its own plane and inside all others. */
      assert_near(ef_metamer_set_outside(set, point), 0, 1e-8);
    }
    const ef_xyz own = colour_of(test, start);
    assert_true(ef_metamer_set_outside(set, own) < 0);
    ef_metamer_set_free(set);
    ef_weights_free(test);
  }
  ef_weights_free(reference);
}

/* ---- Few samples: every corner ----------------------------------------- */

enum { FEW = 6, MOST_CORNERS = 20 * 8 };

typedef struct corners {
  size_t n;
  double spectrum[MOST_CORNERS][FEW];
  double colour[MOST_CORNERS][3];
} corners;

static double determinant(const double *a, const double *b, const double *c) {
  return a[0] * (b[1] * c[2] - b[2] * c[1]) -
         a[1] * (b[0] * c[2] - b[2] * c[0]) +
         a[2] * (b[0] * c[1] - b[1] * c[0]);
}

/* The metamer with these three samples free and the others at limits. */
static bool solve_corner(const double *w, const double target[3],
                         const size_t which[3], double spectrum[FEW]) {
  double rest[3], column[3][3];
  for (size_t c = 0; c < 3; ++c) {
    rest[c] = target[c];
    for (size_t k = 0; k < FEW; ++k)
      rest[c] -= w[c * FEW + k] * spectrum[k];
    for (size_t i = 0; i < 3; ++i)
      column[i][c] = w[c * FEW + which[i]];
  }
  const double whole = determinant(column[0], column[1], column[2]);
  const double part[3] = {determinant(rest, column[1], column[2]),
                          determinant(column[0], rest, column[2]),
                          determinant(column[0], column[1], rest)};
  bool within = true;
  for (size_t i = 0; i < 3; ++i) {
    spectrum[which[i]] = part[i] / whole;
    within = within && spectrum[which[i]] >= 0 && spectrum[which[i]] <= 1;
  }
  return within;
}

/* Corners of the set of metamers: all but three samples are at a limit. */
static void find_corners(const ef_weights *reference, const ef_weights *test,
                         const double target[3], corners *out) {
  const double *const v = ef_weights_matrix(test);
  out->n = 0;
  for (unsigned choice = 0; choice < 1u << FEW; ++choice) {
    size_t which[FEW], n_free = 0;
    for (size_t k = 0; k < FEW; ++k) {
      if ((choice >> k & 1) != 0)
        which[n_free++] = k;
    }
    for (unsigned limits = 0; n_free == 3 && limits < 8; ++limits) {
      double *const spectrum = out->spectrum[out->n];
      for (size_t k = 0, bit = 0; k < FEW; ++k)
        spectrum[k] = (choice >> k & 1) != 0 ? 0 : limits >> bit++ & 1;
      if (!solve_corner(ef_weights_matrix(reference), target, which, spectrum))
        continue;
      for (size_t c = 0; c < 3; ++c) {
        out->colour[out->n][c] = 0;
        for (size_t k = 0; k < FEW; ++k)
          out->colour[out->n][c] += v[c * FEW + k] * spectrum[k];
      }
      if (++out->n == MOST_CORNERS)
        return;
    }
  }
}

typedef struct on_face {
  double turn;
  const double *colour;
} on_face;

static int by_turn(const void *a, const void *b) {
  const double p = ((const on_face *)a)->turn, q = ((const on_face *)b)->turn;
  return (p > q) - (p < q);
}

/* Of the pyramid from `inside` to the face on which sample k is at `limit`. */
static double pyramid(const corners *c, const double inside[3], size_t k,
                      double limit) {
  on_face at[MOST_CORNERS];
  size_t n = 0;
  double middle[3] = {0};
  for (size_t i = 0; i < c->n; ++i) {
    if (c->spectrum[i][k] != limit)
      continue;
    at[n++].colour = c->colour[i];
    for (size_t d = 0; d < 3; ++d)
      middle[d] += c->colour[i][d];
  }
  if (n < 3)
    return 0;
  double axis[3][3], m[3]; /* two in the face, the first to corner 0 */
  for (size_t d = 0; d < 3; ++d) {
    middle[d] /= (double)n;
    m[d] = middle[d] - inside[d];
    axis[0][d] = at[0].colour[d] - middle[d];
    axis[1][d] = at[1].colour[d] - middle[d];
  }
  for (size_t d = 0; d < 3; ++d)
    axis[2][d] = axis[0][(d + 1) % 3] * axis[1][(d + 2) % 3] -
                 axis[0][(d + 2) % 3] * axis[1][(d + 1) % 3];
  for (size_t i = 0; i < n; ++i) {
    double to[3], along = 0;
    for (size_t d = 0; d < 3; ++d) {
      to[d] = at[i].colour[d] - middle[d];
      along += to[d] * axis[0][d];
    }
    const double size = sqrt(axis[0][0] * axis[0][0] +
                             axis[0][1] * axis[0][1] +
                             axis[0][2] * axis[0][2]);
    const double normal = sqrt(axis[2][0] * axis[2][0] +
                               axis[2][1] * axis[2][1] +
                               axis[2][2] * axis[2][2]);
    at[i].turn = atan2(determinant(axis[2], axis[0], to) / normal / size,
                       along / size);
  }
  qsort(at, n, sizeof at[0], by_turn);
  double volume = 0;
  for (size_t i = 0; i < n; ++i) {
    double a[3], b[3];
    for (size_t d = 0; d < 3; ++d) {
      a[d] = at[i].colour[d] - inside[d];
      b[d] = at[(i + 1) % n].colour[d] - inside[d];
    }
    volume += fabs(determinant(a, b, m)) / 6;
  }
  return volume;
}

/* Six samples: the body is a polyhedron with a face for each limit of each
 * sample. Its volume lies between the two told, planes touch its corners, and
 * the farthest metamer is one of them. */
static void all_corners_are_known(void **state) {
  const eyes *const e = *state;
  ef_metamer_settings settings = ef_metamer_settings_default();
  settings.grid = (ef_grid){.count = FEW, .start_nm = 420, .step_nm = 50};
  ef_weights *const reference = must_weights(&e->reference, &settings.grid);
  const ef_metric *const metric = ef_metric_find("cielab", NULL);
  gen g = gen_new(83);
  static corners c;
  double widest_gap = 0;
  for (int round = 0; round < 60; ++round) {
    settings.level = round % 3 + 2;
    ef_weights *const test = must_weights(&e->test[round % 3], &settings.grid);
    double start[FEW], target[3], inside[3] = {0};
    gen_fill(&g, FEW, 0.1, 0.9, start);
    ef_weights_apply(reference, 1, start, 1, target, NULL);
    find_corners(reference, test, target, &c);
    assert_true(c.n >= 4);
    for (size_t i = 0; i < 3 * c.n; ++i)
      inside[i % 3] += c.colour[i / 3][i % 3] / (double)c.n;
    double volume = 0;
    for (size_t k = 0; k < FEW; ++k)
      volume += pyramid(&c, inside, k, 0) + pyramid(&c, inside, k, 1);
    ef_metamer_set *const set = make(
        e, (size_t)round % 3, (ef_xyz){target[0], target[1], target[2]},
        &settings, 0);
    const ef_metamer_body body = ef_metamer_set_body(set);
    assert_true(body.volume_low <= volume * (1 + 1e-9));
    assert_true(body.volume_high >= volume * (1 - 1e-9));
    if (settings.level == 4)
      widest_gap = fmax(widest_gap, body.volume_high / body.volume_low - 1);
    double farthest, by_corners = 0;
    ef_xyz there;
    const ef_xyz own = colour_of(test, start);
    const ef_lab lab = ef_xyz_to_lab(own, body.white);
    ef_metamer_set_farthest(set, metric, NULL, own, &there, &farthest, NULL);
    for (size_t i = 0; i < c.n; ++i) {
      const double *const q = c.colour[i];
      const ef_xyz corner = {q[0], q[1], q[2]};
      assert_true(ef_metamer_set_outside(set, corner) < 1e-8);
      by_corners = fmax(by_corners,
                        ef_delta_e_cielab(lab, ef_xyz_to_lab(corner,
                                                             body.white)));
    }
    assert_near(farthest, by_corners, 1e-7 * by_corners);
    ef_metamer_set_free(set);
    ef_weights_free(test);
  }
  printf("# polyhedra: upper volume above lower at level 4: at most %.1f %%\n",
         100 * widest_gap);
  assert_true(widest_gap < 0.1);
  ef_weights_free(reference);
}

/* Each level of directions quarters the gap between the volumes (the square of
 * the angle between directions); threads do not matter, to the bit. */
static void directions_close_the_gap(void **state) {
  const eyes *const e = *state;
  ef_metamer_settings settings = ef_metamer_settings_default();
  ef_weights *const reference = must_weights(&e->reference, &settings.grid);
  double grey[SAMPLES], before = 0;
  for (size_t k = 0; k < SAMPLES; ++k)
    grey[k] = 0.5;
  const ef_xyz xyz = colour_of(reference, grey);
  for (int level = 1; level <= 4; ++level) {
    settings.level = level;
    ef_metamer_set *const set = make(e, 0, xyz, &settings, 1);
    ef_metamer_set *const other = make(e, 0, xyz, &settings, 3);
    const ef_metamer_body body = ef_metamer_set_body(set);
    printf("# grey 0.5, D65 to A, 5 nm, level %d: XYZ volume %.2f to %.2f, "
           "CIELAB %.1f\n",
           level, body.volume_low, body.volume_high, body.volume_lab);
    const double gap = body.volume_high - body.volume_low;
    assert_true(gap > 0 && (level == 1 || gap < 0.35 * before));
    before = gap;
    for (size_t i = 0; i < ef_metamer_set_count(set); ++i) {
      const ef_xyz p = ef_metamer_set_point(set, i);
      const ef_xyz q = ef_metamer_set_point(other, i);
      assert_same_bits(&p.X, &q.X, 3);
    }
    ef_metamer_set_free(other);
    ef_metamer_set_free(set);
  }
  ef_weights_free(reference);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(random_metamers_are_inside),
      cmocka_unit_test(points_are_metamers),
      cmocka_unit_test(all_corners_are_known),
      cmocka_unit_test(directions_close_the_gap),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, open_eyes, close_eyes);
}
