/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Code values are the best of all, wherever the target lies. With the argument
 * "every" against each of the 256^3 codes, which takes minutes; else against
 * the search by bounds, itself checked on every code of fewer bits, and against
 * neighbourhoods. */
#include <stdlib.h>

#include "base/base_private.h"
#include "gen.h"
#include "invented_display.h"
#include "match/match_private.h"
#include "metrics.h"
#include "near.h"

enum { MOST_BITS = 10, MOST_CODES = 1 << MOST_BITS };

/* A setup with the amounts of its codes. */
typedef struct scene {
  const char *name;
  ef_observer *observer;
  ef_device *device;
  ef_setup *setup;
  ef__mixing mixing;
  double amount[3][MOST_CODES];
  ef__lattice lattice;
} scene;

enum { SRGB, MEASURED, BT2020, N_SCENES };
static const char *const names[N_SCENES] = {"srgb", "measured", "bt2020"};

/* From rows as an instrument gives them: ramps of each channel, their light a
 * little off the additive model by the flicker of repeated readings. */
static ef_device *measured_display(void) {
  enum { LEVELS = 9, ROWS = 3 * LEVELS + 2 };
  ef_device *const truth = invented_display(true);
  ef_observer *const observer = ef_observer_new("cie-1931", NULL);
  ef_setup *const setup = ef_setup_new(truth, observer, NULL, NULL, NULL);
  static double drive[3 * ROWS], xyz[3 * ROWS];
  gen g = gen_new(3);
  for (int r = 0; r < ROWS; r++) {
    double amount[3];
    for (int c = 0; c < 3; c++) {
      const bool on = r == 1 || (r > 1 && (r - 2) % 3 == c);
      const double level = r == 1 ? 1 : ((r - 2) / 3 + 1.0) / LEVELS;
      drive[3 * r + c] = on ? level : 0;
      amount[c] = ef_device_amount(truth, (size_t)c, drive[3 * r + c], NULL);
    }
    const ef_xyz light = ef_setup_xyz(setup, amount, NULL);
    const double flicker = r < 2 ? 1 : gen_between(&g, 0.995, 1.005);
    xyz[3 * r] = flicker * light.X;
    xyz[3 * r + 1] = flicker * light.Y;
    xyz[3 * r + 2] = flicker * light.Z;
  }
  const ef_measurements rows = {
      .n_rows = ROWS, .n_drives = 3, .drive = drive, .xyz = xyz};
  const ef_display_settings settings = ef_display_settings_default();
  ef_error error;
  ef_device *const device = ef_display_from_measurements(
      "measured", &rows, &settings, NULL, NULL, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  ef_setup_free(setup);
  ef_observer_free(observer);
  ef_device_free(truth);
  return device;
}

static scene *scene_new(int which) {
  scene *const s = calloc(1, sizeof *s);
  assert_non_null(s);
  s->name = names[which];
  s->observer = ef_observer_new("cie-1931", NULL);
  s->device = which == MEASURED ? measured_display()
                                : ef_display_from_encoding(s->name, NULL, NULL);
  s->setup = ef_setup_new(s->device, s->observer, NULL, NULL, NULL);
  assert_non_null(s->setup);
  assert_int_equal(ef__mixing_from_setup(s->setup, &s->mixing, NULL), EF_OK);
  return s;
}

static void set_bits(scene *s, int bits) {
  s->lattice.n_codes = (size_t)1 << bits;
  for (size_t c = 0; c < 3; c++) {
    for (size_t i = 0; i < s->lattice.n_codes; i++) {
      s->amount[c][i] = ef_device_amount(
          s->device, c, (double)i / (double)(s->lattice.n_codes - 1), NULL);
    }
    s->lattice.amount[c] = s->amount[c];
  }
}

static void scene_free(scene *s) {
  ef_setup_free(s->setup);
  ef_device_free(s->device);
  ef_observer_free(s->observer);
  free(s);
}

/* ---- Targets ------------------------------------------------------------ */

/* Anywhere in CIELAB, most of it impossible; beyond the amounts there are, far
 * into the dark; near the gamut or in it; nearly neutral. */
enum { FAR, BEYOND, NEAR, NEUTRAL, N_KINDS };

static ef_xyz random_target(gen *g, const scene *s, int kind) {
  if (kind == BEYOND || kind == NEAR) {
    double amount[3];
    for (int c = 0; c < 3; c++) {
      amount[c] = kind == BEYOND ? gen_between(g, -0.3, 1.3)
                                 : pow(gen_between(g, 0, 1.05), 2.2) - 0.02;
    }
    return ef__mixing_xyz(&s->mixing, amount, NULL);
  }
  ef_lab lab = {gen_between(g, 0, 100), gen_between(g, -128, 128),
                gen_between(g, -128, 128)};
  if (kind == NEUTRAL) {
    const double chroma = 6 * gen_unit(g), h = 6.2832 * gen_unit(g);
    lab = (ef_lab){gen_between(g, -5, 115), chroma * cos(h), chroma * sin(h)};
  }
  return ef_lab_to_xyz(lab, s->mixing.conditions.white);
}

static ef__search search_for(const scene *s, const ef_metric *metric,
                             ef_xyz target) {
  ef__search search = {.mixing = &s->mixing, .metric = metric};
  ef_metric_coordinates(metric, target, &s->mixing.conditions, search.target);
  return search;
}

static ef_match match_of(const scene *s, const ef_metric *metric, int bits,
                         ef_xyz target) {
  ef_match_settings settings = ef_match_settings_default();
  const double xyz[3] = {target.X, target.Y, target.Z};
  ef_match m;
  settings.metric = metric;
  settings.bits = bits;
  settings.hue_kept = false;
  assert_int_equal(ef_match_batch(s->setup, 1, xyz, &settings, 1, &m, NULL),
                   EF_OK);
  return m;
}

static bool has_bound(const scene *s, const ef_metric *metric) {
  return ef__boxes_apply(&s->mixing, metric);
}

/* ---- The bounds --------------------------------------------------------- */

/* Boxes of amounts of all sizes, with the lightest and darkest corners as
 * frequent as they are among codes. */
static void random_box(gen *g, double from[3], double to[3]) {
  const double size = pow(10, gen_between(g, -3, 0));
  for (int c = 0; c < 3; c++) {
    const double a = gen_unit(g), b = a + size * gen_between(g, 0.2, 1);
    from[c] = pow(a, 2.4);
    to[c] = pow(fmin(b, 1), 2.4);
  }
}

static void no_colour_of_a_box_is_below_its_bound(void **state) {
  (void)state;
  enum { BOXES = 3000, POINTS = 40 };
  gen g = gen_new(31);
  size_t n_bounds = 0, n_close = 0;
  for (int d = 0; d < N_SCENES; d++) {
    scene *const s = scene_new(d);
    for (size_t i = 0; i < every_metric_count(); i++) {
      const ef_metric *const metric = every_metric(i);
      if (!has_bound(s, metric))
        continue;
      for (int n = 0; n < BOXES; n++) {
        ef__search search =
            search_for(s, metric, random_target(&g, s, n % N_KINDS));
        double from[3], to[3], least = INFINITE;
        random_box(&g, from, to);
        const double bound = ef__least_over(&search, from, to, INFINITE);
        for (int p = 0; p < POINTS; p++) {
          double amount[3];
          /* Corners and middles, then anywhere. */
          const int digit[3] = {p % 3, p / 3 % 3, p / 9};
          for (int c = 0; c < 3; c++) {
            const double share = p < 27 ? digit[c] / 2.0 : gen_unit(&g);
            amount[c] = from[c] + share * (to[c] - from[c]);
          }
          least = fmin(least, sqrt(ef__search_value(&search, amount)));
        }
        if (!(bound <= least)) {
          fail_msg("%s, %s: bound %.9g, colour at %.9g; target %.4f %.4f %.4f, "
                   "box %.6g %.6g %.6g to %.6g %.6g %.6g",
                   s->name, ef_metric_name(metric), bound, least,
                   search.target[0], search.target[1], search.target[2],
                   from[0], from[1], from[2], to[0], to[1], to[2]);
        }
        n_bounds++;
        n_close += bound > 0.9 * least;
      }
    }
    scene_free(s);
  }
  printf(
      "# %zu bounds, %.0f %% of them above 0.9 of the least that was found\n",
      n_bounds, 100.0 * (double)n_close / (double)n_bounds);
  assert_true(n_close > n_bounds / 10);
}

/* ---- Against every code of few bits ------------------------------------- */

static double least_of_all(const scene *s, ef__search *search,
                           const size_t from[3], const size_t to[3]) {
  double least = INFINITE;
  for (size_t i = from[0]; i <= to[0]; i++) {
    for (size_t j = from[1]; j <= to[1]; j++) {
      for (size_t k = from[2]; k <= to[2]; k++) {
        const double amount[3] = {s->amount[0][i], s->amount[1][j],
                                  s->amount[2][k]};
        least = fmin(least, ef__search_value(search, amount));
      }
    }
  }
  return sqrt(least);
}

static void few_bits_are_the_best_of_all(void **state) {
  (void)state;
  enum { BITS = 5 };
  gen g = gen_new(32);
  size_t n = 0;
  for (int d = 0; d < N_SCENES; d++) {
    scene *const s = scene_new(d);
    set_bits(s, BITS);
    const size_t last = s->lattice.n_codes - 1;
    for (size_t i = 0; i < ef_metric_count(); i++) {
      const ef_metric *const metric = ef_metric_at(i);
      for (int t = 0; t < 2 * N_KINDS; t++) {
        const ef_xyz target = random_target(&g, s, t % N_KINDS);
        ef__search search = search_for(s, metric, target);
        /* The appearance models and ITP have no answer for some impossible
         * colours. */
        if (!isfinite(search.target[0] + search.target[1] + search.target[2]))
          continue;
        const double least = least_of_all(s, &search, (size_t[3]){0, 0, 0},
                                          (size_t[3]){last, last, last});
        const ef_match m = match_of(s, metric, BITS, target);
        if (!(m.coded.difference <= least + 1e-9 * (1 + least))) {
          fail_msg("%s, %s, target %.6f %.6f %.6f: %.9g for codes %u %u %u, "
                   "best of all %.9g; nearest %.9g at %g %g %g",
                   s->name, ef_metric_name(metric), search.target[0],
                   search.target[1], search.target[2], m.coded.difference,
                   m.code[0], m.code[1], m.code[2], least, m.nearest.difference,
                   m.nearest.amount[0], m.nearest.amount[1],
                   m.nearest.amount[2]);
        }
        n++;
        if (!has_bound(s, metric))
          continue;
        uint32_t code[3];
        double square = INFINITE;
        ef__search_boxes(&search, &s->lattice, code, &square);
        assert_near(sqrt(square), least, 1e-9 * (1 + least));
      }
    }
    scene_free(s);
  }
  printf("# %zu targets with %d bits\n", n, BITS);
}

/* ---- Against the bounds ------------------------------------------------- */

static size_t n_a_kind = 40;

static void codes_are_what_the_bounds_leave(void **state) {
  (void)state;
  static const int bits[] = {5, 6, 8, 10};
  size_t n = 0;
  for (int d = 0; d < N_SCENES; d++) {
    scene *const s = scene_new(d);
    gen g = gen_new(40 + (uint64_t)d);
    for (size_t b = 0; b < sizeof bits / sizeof bits[0]; b++) {
      set_bits(s, bits[b]);
      for (size_t i = 0; i < every_metric_count(); i++) {
        const ef_metric *const metric = every_metric(i);
        if (!has_bound(s, metric))
          continue;
        const bool main_one = strcmp(ef_metric_name(metric), "ciede2000") == 0;
        const size_t n_targets = main_one ? n_a_kind * N_KINDS : n_a_kind / 2;
        for (size_t t = 0; t < n_targets; t++) {
          const ef_xyz target = random_target(&g, s, (int)(t % N_KINDS));
          const ef_match m = match_of(s, metric, bits[b], target);
          ef__search search = search_for(s, metric, target);
          uint32_t code[3];
          double square = m.coded.difference * m.coded.difference;
          ef__search_boxes(&search, &s->lattice, code, &square);
          if (!(m.coded.difference <= sqrt(square) + 1e-9)) {
            fail_msg("%s, %s, %d bits, target %.6f %.6f %.6f: %.9g for codes "
                     "%u %u %u, %.9g for %u %u %u",
                     s->name, ef_metric_name(metric), bits[b], search.target[0],
                     search.target[1], search.target[2], m.coded.difference,
                     m.code[0], m.code[1], m.code[2], sqrt(square), code[0],
                     code[1], code[2]);
          }
          n++;
        }
      }
    }
    scene_free(s);
  }
  printf("# %zu targets\n", n);
}

/* A blue that no display has, darker than its own chroma allows: the codes are
 * not next to the nearest colour but one step along two channels. regression:
 * the least of all 256^3 codes, 21.0504, was found by trying each. */
static void an_impossible_blue(void **state) {
  (void)state;
  scene *const s = scene_new(SRGB);
  const ef_metric *const metric = ef_metric_find("ciede2000", NULL);
  set_bits(s, 8);
  const ef_xyz target =
      ef_lab_to_xyz((ef_lab){8, -33, -76}, s->mixing.conditions.white);
  const ef_match m = match_of(s, metric, 8, target);
  ef__search search = search_for(s, metric, target);
  const double least =
      least_of_all(s, &search, (size_t[3]){0, 30, 40}, (size_t[3]){12, 70, 95});
  assert_near(least, 21.0504, 5e-5);
  assert_near(m.coded.difference, least, 1e-9);
  scene_free(s);
}

/* ---- Against every code of eight bits ----------------------------------- */

enum { N_CODES = 256, MOST_TARGETS = 88 };
typedef struct trial {
  const scene *scene;
  const ef_metric *metric;
  size_t n;
  double coordinate[MOST_TARGETS][3];
  double reference[MOST_TARGETS][N_CODES][3]; /* the same for each code */
  double ours[MOST_TARGETS];
  double least[N_CODES][MOST_TARGETS]; /* by the first code */
} trial;

/* Colours are computed once for all targets, 256 at a time. */
static void try_slices(void *context, size_t begin, size_t end) {
  trial *const t = context;
  const scene *const s = t->scene;
  for (size_t i = begin; i < end; i++) {
    for (size_t q = 0; q < t->n; q++)
      t->least[i][q] = INFINITE;
    for (size_t j = 0; j < N_CODES; j++) {
      double colour[N_CODES][3], difference[N_CODES];
      for (size_t k = 0; k < N_CODES; k++) {
        const double amount[3] = {s->amount[0][i], s->amount[1][j],
                                  s->amount[2][k]};
        const ef_xyz xyz = ef__mixing_xyz(&s->mixing, amount, NULL);
        memcpy(colour[k], &xyz, sizeof colour[k]);
      }
      ef_metric_coordinates_batch(t->metric, N_CODES, colour[0],
                                  &s->mixing.conditions, 1, colour[0]);
      for (size_t q = 0; q < t->n; q++) {
        ef_metric_difference_batch(t->metric, N_CODES, t->reference[q][0],
                                   colour[0], 1, difference);
        for (size_t k = 0; k < N_CODES; k++) {
          if (difference[k] < t->least[i][q])
            t->least[i][q] = difference[k];
        }
      }
    }
  }
}

static void set_targets(trial *t, size_t n_a_target_kind) {
  const scene *const s = t->scene;
  gen g = gen_new(50);
  while (t->n < N_KINDS * n_a_target_kind) {
    const ef_xyz target = random_target(&g, s, (int)(t->n % N_KINDS));
    const ef__search search = search_for(s, t->metric, target);
    if (!isfinite(search.target[0] + search.target[1] + search.target[2]))
      continue;
    memcpy(t->coordinate[t->n], search.target, sizeof search.target);
    for (size_t k = 0; k < N_CODES; k++)
      memcpy(t->reference[t->n][k], search.target, sizeof search.target);
    t->ours[t->n] = match_of(s, t->metric, 8, target).coded.difference;
    t->n++;
  }
}

static void try_every_code(const scene *s, const ef_metric *metric,
                           size_t n_a_target_kind) {
  trial *const t = calloc(1, sizeof *t);
  assert_non_null(t);
  t->scene = s;
  t->metric = metric;
  set_targets(t, n_a_target_kind);
  ef__parallel_for(N_CODES, 4, 0, try_slices, t);
  size_t n_missed = 0;
  double worst = 0;
  for (size_t q = 0; q < t->n; q++) {
    double least = INFINITE;
    for (size_t i = 0; i < N_CODES; i++)
      least = fmin(least, t->least[i][q]);
    if (t->ours[q] <= least + 1e-9)
      continue;
    n_missed++;
    worst = fmax(worst, t->ours[q] - least);
    print_error("target %.6f %.6f %.6f: %.9g, best of all %.9g\n",
                t->coordinate[q][0], t->coordinate[q][1], t->coordinate[q][2],
                t->ours[q], least);
  }
  printf("# %s, %s: %zu of %zu targets missed, by up to %.3g\n", s->name,
         ef_metric_name(metric), n_missed, t->n, worst);
  assert_int_equal(n_missed, 0);
  free(t);
}

static void each_of_the_codes_is_worse(void **state) {
  (void)state;
  for (int d = SRGB; d <= MEASURED; d++) {
    scene *const s = scene_new(d);
    set_bits(s, 8);
    for (size_t i = 0; i < ef_metric_count(); i++) {
      const ef_metric *const metric = ef_metric_at(i);
      if (strcmp(ef_metric_name(metric), "ciede2000") == 0) {
        try_every_code(s, metric, MOST_TARGETS / N_KINDS);
      } else if (d == SRGB) {
        try_every_code(s, metric, 5);
      }
    }
    scene_free(s);
  }
}

int main(int argc, char **argv) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(no_colour_of_a_box_is_below_its_bound),
      cmocka_unit_test(few_bits_are_the_best_of_all),
      cmocka_unit_test(codes_are_what_the_bounds_leave),
      cmocka_unit_test(an_impossible_blue),
  };
  const struct CMUnitTest slow_tests[] = {
      cmocka_unit_test(codes_are_what_the_bounds_leave),
      cmocka_unit_test(each_of_the_codes_is_worse),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  if (argc > 1 && strcmp(argv[1], "every") == 0) {
    n_a_kind = 100;
    return cmocka_run_group_tests(slow_tests, NULL, NULL);
  }
  return cmocka_run_group_tests(tests, NULL, NULL);
}
