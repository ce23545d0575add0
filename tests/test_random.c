/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/base_private.h"
#include "near.h"

/* First values of xoshiro256** from the state 1, 2, 3, 4; the first by hand:
 * rotl(2 * 5, 7) * 9. The others from memory of the authors' reference code,
 * confirmed by ours. */
static void generator_is_the_published_one(void **state) {
  (void)state;
  ef__random random = {{1, 2, 3, 4}};
  assert_true(ef__random_bits(&random) == 11520);
  assert_true(ef__random_bits(&random) == 0);
  assert_true(ef__random_bits(&random) == 1509978240);
  assert_true(ef__random_bits(&random) == UINT64_C(1215971899390074240));
}

static void streams_are_their_own(void **state) {
  (void)state;
  ef__random a = ef__random_stream(1, 2), b = ef__random_stream(1, 2);
  ef__random c = ef__random_stream(2, 1), d = ef__random_stream(1, 3);
  for (int i = 0; i < 100; ++i) {
    const uint64_t bits = ef__random_bits(&a);
    assert_true(bits == ef__random_bits(&b));
    assert_true(bits != ef__random_bits(&c));
    assert_true(bits != ef__random_bits(&d));
  }
}

/* Mean and variance of 200 000 values, each the first of its stream: that
 * streams are unrelated matters as much as that values of one are. Four
 * standard errors. */
static void first_values_of_streams_are_spread(void **state) {
  (void)state;
  enum { N = 200000 };
  double sum = 0, square = 0, normal = 0, normal_square = 0, product = 0;
  double before = 0;
  for (uint64_t i = 0; i < N; ++i) {
    ef__random random = ef__random_stream(77, i);
    const double u = ef__random_unit(&random) - 0.5;
    const double z = ef__random_normal(&random);
    assert_true(u > -0.5 && u < 0.5);
    sum += u;
    square += u * u;
    normal += z;
    normal_square += z * z;
    product += u * before;
    before = u;
  }
  const double root = sqrt(N);
  assert_near(sum / N, 0, 4 * sqrt(1.0 / 12) / root);
  assert_near(square / N, 1.0 / 12, 4 * sqrt(1.0 / 180) / root);
  assert_near(product / N, 0, 4 * (1.0 / 12) / root);
  assert_near(normal / N, 0, 4 / root);
  assert_near(normal_square / N, 1, 4 * sqrt(2) / root);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(generator_is_the_published_one),
      cmocka_unit_test(streams_are_their_own),
      cmocka_unit_test(first_values_of_streams_are_spread),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
