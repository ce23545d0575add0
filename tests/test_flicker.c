/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Luminance weights from flicker photometry. */
#include <evenfield/panel.h>

#include "gen.h"
#include "near.h"

enum { MAX = 12 };

typedef struct lights {
  double l1[MAX], m1[MAX], l2[MAX], m2[MAX];
} lights;

/* A steady reference and a second light whose amount makes l L + m M equal but
 * for `noise` in ln luminance. */
static void match(gen *g, size_t n, double share, double noise, lights *out) {
  for (size_t i = 0; i < n; ++i) {
    out->l1[i] = gen_between(g, 5, 12);
    out->m1[i] = out->l1[i] * gen_between(g, 0.2, 0.6); /* reddish */
    const double ratio = gen_between(g, 0.8, 1.4);      /* greenish */
    const double wanted = (share * out->l1[i] + (1 - share) * out->m1[i]) *
                          exp(noise * gen_normal(g));
    const double amount = wanted / (share + (1 - share) * ratio);
    out->l2[i] = amount;
    out->m2[i] = amount * ratio;
  }
}

static ef_flicker weights_of(const lights *x, size_t n) {
  ef_flicker f;
  ef_error error;
  if (ef_flicker_weights(n, x->l1, x->m1, x->l2, x->m2, &f, &error) != EF_OK)
    fail_msg("%s", error.message);
  return f;
}

static void weights_come_back(void **state) {
  (void)state;
  gen g = gen_new(41);
  for (int i = 0; i < 200; ++i) {
    const double share = gen_between(&g, 0.05, 0.95);
    lights x;
    match(&g, 5, share, 0, &x);
    const ef_flicker f = weights_of(&x, 5);
    assert_near(f.l_share.value, share, 1e-12);
    assert_near_relative(f.ratio.value, share / (1 - share), 1e-10);
    assert_near(f.residual, 0, 1e-12);
    /* Which light is called the first does not matter. */
    const lights turned = x;
    ef_flicker other;
    ef_error error;
    assert_int_equal(ef_flicker_weights(5, turned.l2, turned.m2, turned.l1,
                                        turned.m1, &other, &error),
                     EF_OK);
    assert_near(other.l_share.value, f.l_share.value, 1e-12);
  }
}

static void interval_holds_the_truth(void **state) {
  (void)state;
  gen g = gen_new(42);
  const double share = 0.66; /* l : m near 2 */
  size_t n_held = 0;
  enum { TIMES = 2000 };
  for (int i = 0; i < TIMES; ++i) {
    lights x;
    match(&g, 8, share, 0.04, &x);
    const ef_flicker f = weights_of(&x, 8);
    n_held += f.l_share.low <= share && share <= f.l_share.high;
    assert_true(f.ratio.low <= f.ratio.value && f.ratio.value <= f.ratio.high);
  }
  printf("# eight settings, 4 %% noise: interval holds the truth in %.1f %%\n",
         100.0 * (double)n_held / TIMES);
  assert_near((double)n_held / TIMES, 0.95, 0.02);
}

static void refused(void **state) {
  (void)state;
  const double l1[] = {1, 2, 3}, m1[] = {0.5, 1, 1.5};
  const double l2[] = {2, 4, 6}, m2[] = {1, 2, 3}, zero[] = {1, 0, 1};
  ef_flicker f;
  ef_error error;
  assert_int_equal(ef_flicker_weights(1, l1, m1, l2, m2, &f, &error),
                   EF_NO_ANSWER);
  assert_string_equal(error.message,
                      "1 setting of least flicker: weights with an interval "
                      "need at least two");
  assert_int_equal(ef_flicker_weights(3, l1, m1, l2, m2, &f, &error),
                   EF_NO_ANSWER);
  assert_string_equal(
      error.message,
      "the two lights have the same L to M ratio in every setting: flicker "
      "between lights of different colour, red and green for instance, tells "
      "the weights");
  assert_int_equal(ef_flicker_weights(3, l1, zero, l2, m2, &f, &error),
                   EF_MALFORMED);
  assert_string_equal(error.message,
                      "setting 2: cone excitations 2, 0 and 4, 2, expected "
                      "numbers above 0");
  assert_int_equal(error.line, 2);
  /* The second light is brighter for both kinds of cone. */
  const double bright_l[] = {2, 5, 7}, bright_m[] = {1.7, 3.1, 4.4};
  assert_int_equal(
      ef_flicker_weights(3, l1, m1, bright_l, bright_m, &f, &error),
      EF_NO_ANSWER);
  assert_string_equal(error.message,
                      "the settings ask for weights of L alone or beyond: "
                      "check that the lights, and which was adjusted, are as "
                      "recorded");
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(weights_come_back),
      cmocka_unit_test(interval_holds_the_truth),
      cmocka_unit_test(refused),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
