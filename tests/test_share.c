/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Shares with their score intervals. */
#include <setjmp.h>

#include "near.h"

#include <evenfield/panel.h>

/* R. G. Newcombe, Statistics in Medicine 17 (1998) 857-872, table I, method 3
 * (score without continuity correction), from memory, four decimals. */
static void test_published(void **state) {
  (void)state;
  static const struct {
    size_t n, k;
    double low, high;
  } published[] = {{263, 81, 0.2553, 0.3662},
                   {148, 15, 0.0624, 0.1605},
                   {20, 0, 0.0, 0.1611},
                   {29, 1, 0.0061, 0.1718}};
  for (size_t i = 0; i < sizeof published / sizeof *published; ++i) {
    const ef_estimate e = ef_share_estimate(published[i].n, published[i].k);
    assert_near(e.low, published[i].low, 5e-5);
    assert_near(e.high, published[i].high, 5e-5);
  }
}

/* The ends are where the share differs from the true one by 1.96 of its
 * standard errors (the equation that defines them); both sides mirror each
 * other; nothing leaves 0 to 1. */
static void test_laws(void **state) {
  (void)state;
  for (size_t n = 1; n < 60; ++n) {
    for (size_t k = 0; k <= n; ++k) {
      const ef_estimate e = ef_share_estimate(n, k);
      const ef_estimate other = ef_share_estimate(n, n - k);
      assert_near(e.low, 1.0 - other.high, 1e-14);
      assert_true(e.low >= 0.0 && e.high <= 1.0);
      assert_true(e.low <= e.value && e.value <= e.high);
      const double ends[2] = {e.low, e.high};
      for (size_t i = 0; i < 2; ++i) {
        const double t = ends[i];
        if (t <= 0.0 || t >= 1.0)
          continue;
        assert_near(fabs(e.value - t) / sqrt(t * (1.0 - t) / (double)n),
                    1.959963984540054, 1e-9);
      }
    }
  }
}

static void test_nothing_shown(void **state) {
  (void)state;
  assert_true(isnan(ef_share_estimate(0, 0).value));
  assert_true(isnan(ef_share_estimate(3, 4).low));
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_published),
      cmocka_unit_test(test_laws),
      cmocka_unit_test(test_nothing_shown),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
