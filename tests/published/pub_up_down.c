/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Where up-down rules come to rest: H. Levitt, J. Acoust. Soc. Am. 49 (1971)
 * 467, table I: 1 up after one wrong answer, down after n right ones:
 * 0.5^(1/n); the same turned over: 1 - 0.5^(1/n). The three- and four-digit
 * figures are the ones in use (70.7, 79.4, 84.1 %). Weighted steps: C.
 * Kaernbach, Percept. Psychophys. 49 (1991) 227: p step_up = q step_down the
 * other way about, a step up three times that down rests at 75 %. */
#include <evenfield/panel.h>

#include "near.h"

#include "panel/panel_private.h"

static ef_up_down rule_of(unsigned n_down, unsigned n_up) {
  ef_up_down rule = ef_up_down_default();
  rule.n_down = n_down;
  rule.n_up = n_up;
  return rule;
}

static void target_percentages(void **state) {
  (void)state;
  static const struct {
    unsigned n_down, n_up;
    double target;
  } published[] = {{1, 1, 0.500}, {2, 1, 0.707}, {3, 1, 0.794}, {4, 1, 0.841},
                   {1, 2, 0.293}, {1, 3, 0.206}, {1, 4, 0.159}};
  for (size_t i = 0; i < sizeof published / sizeof published[0]; ++i) {
    const ef_up_down rule = rule_of(published[i].n_down, published[i].n_up);
    assert_near(ef_up_down_target(&rule), published[i].target, 0.0005);
  }
  const ef_up_down two = rule_of(2, 1);
  assert_near(ef_up_down_target(&two), sqrt(0.5), 1e-14);
}

static void weighted_steps(void **state) {
  (void)state;
  ef_up_down rule = rule_of(1, 1);
  rule.step_down = 1.1;
  rule.step_up = pow(1.1, 3);
  assert_near(ef_up_down_target(&rule), 0.75, 1e-14);
  rule = rule_of(2, 1);
  rule.step_down = 1;
  assert_true(isnan(ef_up_down_target(&rule)));
  rule = rule_of(0, 1);
  assert_true(isnan(ef_up_down_target(&rule)));
}

/* Long runs rest there: the share of right answers over 200 000 trials of a run
 * with small steps, for rules with counts on both sides too. The share of
 * trials is not quite that of the level of rest, as a curve is not straight:
 * 0.01. */
static void long_runs_rest_there(void **state) {
  (void)state;
  const ef_psychometric observer = {.shape = EF_SHAPE_GAUSSIAN,
                                    .axis = EF_AXIS_LOG,
                                    .task = EF_TASK_YES_NO,
                                    .location = 0,
                                    .width = 0.5};
  for (unsigned n_down = 1; n_down <= 4; ++n_down) {
    for (unsigned n_up = 1; n_up <= 3; ++n_up) {
      ef_up_down rule = rule_of(n_down, n_up);
      rule.step_down = rule.step_up = 1.02;
      ef__run run = ef__run_begin(&rule, 1);
      ef__random random = ef__random_stream(3, 10 * n_down + n_up);
      size_t n_right = 0;
      for (int i = 0; i < 200000; ++i) {
        const bool is_right = ef__random_unit(&random) <
                              ef_psychometric_value(&observer, exp(run.t));
        n_right += is_right;
        ef__run_answer(&run, is_right);
      }
      assert_near((double)n_right / 200000, ef_up_down_target(&rule), 0.01);
    }
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(target_percentages),
      cmocka_unit_test(weighted_steps),
      cmocka_unit_test(long_runs_rest_there),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
