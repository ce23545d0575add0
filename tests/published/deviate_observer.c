/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The CIE standard deviate observer (CIE 80-1989; CIE 15:2004 Table T.10)
 * beside a population of individuals: how alike what the deviate sees of a
 * metameric pair is to what people see. The table is not part of this repository: the
 * environment variable EVENFIELD_REFERENCE names a folder with
 * surfaces/observer_deviate_cie80.csv; without it the tests are skipped.
 *
 * The deviate was made in 1989 from the twenty observers of Stiles and Burch,
 * the individuals of 2016 from anatomy and colour matches: nothing says that
 * they agree. What is checked is that they are of one size and one kind. */
#include <stdlib.h>

#include <evenfield/colour.h>
#include <evenfield/match.h>

#include "gen.h"
#include "near.h"

enum { SAMPLES = 81, N_PAIRS = 200 }; /* 380 to 780 nm at 5 nm */

static const ef_grid grid = {.count = SAMPLES, .start_nm = 380, .step_nm = 5};

/* Columns delta_x, delta_y, delta_z as 3 x SAMPLES. */
static void read_deviate(double delta[3 * SAMPLES]) {
  char path[1024], line[256];
  snprintf(path, sizeof path, "%s/surfaces/observer_deviate_cie80.csv",
           getenv("EVENFIELD_REFERENCE"));
  FILE *const file = fopen(path, "rb");
  if (file == NULL) fail_msg("%s cannot be opened", path);
  size_t row = 0;
  while (fgets(line, sizeof line, file) != NULL) {
    double nm, d[3];
    const int n = sscanf(line, "%lf,%lf,%lf,%lf", &nm, &d[0], &d[1], &d[2]);
    if (n != 4) continue;
    assert_true(row < SAMPLES && nm == 380 + 5 * (double)row);
    for (size_t c = 0; c < 3; ++c) delta[c * SAMPLES + row] = d[c];
    ++row;
  }
  fclose(file);
  assert_int_equal(row, SAMPLES);
}

/* 3 x SAMPLES weights of surfaces under D65: functions of `name` and `delta`
 * (NULL: none), Y = 100 for white. */
static void weigh(const char *name, const double *delta,
                  double weight[3 * SAMPLES], double white[3]) {
  ef_observer *const observer = ef_observer_new(name, NULL);
  ef_illuminant *const d65 = ef_illuminant_new("D65", NULL);
  const ef_channels xyz = ef_observer_channels(observer, EF_TRISTIMULUS);
  double power[SAMPLES], sum = 0;
  ef_illuminant_sample(d65, &grid, power, NULL);
  for (size_t i = 0; i < SAMPLES; ++i) {
    for (size_t c = 0; c < 3; ++c) {
      const double bar = xyz.value[c * xyz.grid.count + 20 + 5 * i];
      weight[c * SAMPLES + i] =
          power[i] * (bar + (delta != NULL ? delta[c * SAMPLES + i] : 0));
    }
    sum += weight[SAMPLES + i];
  }
  for (size_t c = 0; c < 3; ++c) {
    white[c] = 0;
    for (size_t i = 0; i < SAMPLES; ++i) {
      weight[c * SAMPLES + i] *= 100 / sum;
      white[c] += weight[c * SAMPLES + i];
    }
  }
  ef_observer_free(observer);
  ef_illuminant_free(d65);
}

static void see(const double weight[3 * SAMPLES], const double *sample,
                double xyz[3]) {
  for (size_t c = 0; c < 3; ++c) {
    xyz[c] = 0;
    for (size_t i = 0; i < SAMPLES; ++i) {
      xyz[c] += weight[c * SAMPLES + i] * sample[i];
    }
  }
}

/* Solves the 3 x 3 system G k = r by Cramer's rule. */
static double determinant(const double m[9]) {
  return m[0] * (m[4] * m[8] - m[5] * m[7]) -
         m[1] * (m[3] * m[8] - m[5] * m[6]) +
         m[2] * (m[3] * m[7] - m[4] * m[6]);
}

/* `other` becomes a metamer of `sample` for the weights: what they see of the
 * difference is taken out of it, along the weights themselves. */
static void make_metamer(const double weight[3 * SAMPLES], const double *sample,
                         double *other) {
  double a[3], b[3], gram[9] = {0};
  see(weight, sample, a);
  see(weight, other, b);
  for (size_t c = 0; c < 3; ++c) {
    for (size_t d = 0; d < 3; ++d) {
      for (size_t i = 0; i < SAMPLES; ++i) {
        gram[3 * c + d] += weight[c * SAMPLES + i] * weight[d * SAMPLES + i];
      }
    }
  }
  const double whole = determinant(gram);
  for (size_t c = 0; c < 3; ++c) {
    double replaced[9];
    memcpy(replaced, gram, sizeof replaced);
    for (size_t d = 0; d < 3; ++d) replaced[3 * d + c] = a[d] - b[d];
    const double k = determinant(replaced) / whole;
    for (size_t i = 0; i < SAMPLES; ++i) {
      other[i] += k * weight[c * SAMPLES + i];
    }
  }
}

static double lab_difference(const double weight[3 * SAMPLES],
                             const double white[3], const double *one,
                             const double *other) {
  double a[3], b[3];
  see(weight, one, a);
  see(weight, other, b);
  const ef_xyz w = {white[0], white[1], white[2]};
  return ef_delta_e_cielab(
      ef_xyz_to_lab((ef_xyz){a[0], a[1], a[2]}, w),
      ef_xyz_to_lab((ef_xyz){b[0], b[1], b[2]}, w));
}

/* Pairs of surfaces that match for `weight`. */
static void make_pairs(const double weight[3 * SAMPLES], double *one,
                       double *other) {
  gen g = gen_new(80);
  for (size_t p = 0; p < N_PAIRS; ++p) {
    gen_smooth(&g, SAMPLES, one + p * SAMPLES);
    gen_smooth(&g, SAMPLES, other + p * SAMPLES);
    make_metamer(weight, one + p * SAMPLES, other + p * SAMPLES);
  }
}

static void spread_of_people(const double *one, const double *other,
                             double age_max_years, ef_spread *spread) {
  ef_population_settings settings = ef_population_settings_default();
  settings.age_max_years = age_max_years;
  ef_population *const people = ef_population_new(&settings, NULL);
  ef_illuminant *const d65 = ef_illuminant_new("D65", NULL);
  const ef_side a = {grid, one, ef_viewing_default(d65), NULL};
  const ef_side b = {grid, other, ef_viewing_default(d65), NULL};
  ef_spread_settings how = ef_spread_settings_default();
  how.metric = ef_metric_find("cielab", NULL);
  assert_int_equal(ef_population_spread(people, N_PAIRS, &a, &b, &how, 0,
                                        spread, NULL, NULL, NULL),
                   EF_OK);
  ef_illuminant_free(d65);
  ef_population_free(people);
}

static double correlation(size_t n, const double *a, const double *b) {
  double sa = 0, sb = 0, aa = 0, bb = 0, ab = 0;
  for (size_t i = 0; i < n; ++i) {
    sa += a[i];
    sb += b[i];
    aa += a[i] * a[i];
    bb += b[i] * b[i];
    ab += a[i] * b[i];
  }
  const double k = (double)n;
  return (ab - sa * sb / k) / sqrt((aa - sa * sa / k) * (bb - sb * sb / k));
}

static void deviate_beside_people(void **state) {
  (void)state;
  static double delta[3 * SAMPLES], reference[3 * SAMPLES];
  static double deviate[3 * SAMPLES], mean[3 * SAMPLES];
  static double one[N_PAIRS * SAMPLES], other[N_PAIRS * SAMPLES];
  double white[3], reference_white[3], mean_white[3];
  double by_deviate[N_PAIRS], by_people[N_PAIRS];
  ef_spread spread[N_PAIRS];
  read_deviate(delta);
  weigh("cie-1931", NULL, reference, reference_white);
  weigh("cie-1931", delta, deviate, white);
  weigh("model", NULL, mean, mean_white);
  /* Computed with the table's copy from the CIE's 5 nm observer. */
  assert_near(white[0], 93.4308, 0.01);
  assert_near(white[2], 110.6421, 0.01);
  make_pairs(reference, one, other);
  double deviate_sum = 0;
  for (size_t p = 0; p < N_PAIRS; ++p) {
    const double *const a = one + p * SAMPLES, *const b = other + p * SAMPLES;
    assert_near(lab_difference(reference, reference_white, a, b), 0, 1e-9);
    by_deviate[p] = lab_difference(deviate, white, a, b);
    deviate_sum += by_deviate[p];
  }
  make_pairs(mean, one, other);
  const double age_max_years[2] = {40, 60};
  for (size_t k = 0; k < 2; ++k) {
    double mean_sum = 0, p95_sum = 0;
    size_t n_below_p95 = 0;
    spread_of_people(one, other, age_max_years[k], spread);
    for (size_t p = 0; p < N_PAIRS; ++p) {
      by_people[p] = spread[p].mean;
      mean_sum += spread[p].mean;
      p95_sum += spread[p].p95;
      n_below_p95 += by_deviate[p] < spread[p].p95;
    }
    const double r = correlation(N_PAIRS, by_deviate, by_people);
    printf("# ages 20 to %g: Delta E*ab of %d metameric pairs under D65: "
           "deviate %.2f, people %.2f, their 95th percentile %.2f\n",
           age_max_years[k], N_PAIRS, deviate_sum / N_PAIRS,
           mean_sum / N_PAIRS, p95_sum / N_PAIRS);
    printf("# correlation %.3f; the deviate is below the 95th percentile in "
           "%zu pairs\n",
           r, n_below_p95);
    assert_true(r > 0.5);
  }
}

int main(void) {
  const char *const folder = getenv("EVENFIELD_REFERENCE");
  if (folder == NULL || folder[0] == '\0') {
    printf("1..0 # SKIP EVENFIELD_REFERENCE is not set, the deviate observer "
           "is left out\n");
    return 0;
  }
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(deviate_beside_people),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
