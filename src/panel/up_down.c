/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Up-down rules. */
#include "panel/panel_private.h"

#include <math.h>

/* Chance that n_down right answers in a row come before n_up wrong ones in a
 * row, for independent answers right with probability p: a success run before a
 * failure run (Feller, An Introduction to Probability Theory, vol. 1, XIII.8),
 *   p^(r-1) (1 - q^s) / (p^(r-1) + q^(s-1) - p^(r-1) q^(s-1)). */
static double down_before_up(double p, unsigned r, unsigned s) {
  const double q = 1 - p;
  const double a = pow(p, r - 1.0), b = pow(q, s - 1.0);
  return a * (1 - b * q) / (a + b - a * b);
}

static bool is_rule(const ef_up_down *rule) {
  return rule->n_down >= 1 && rule->n_up >= 1 && rule->step_down > 1 &&
         rule->step_up > 1 && rule->step_first > 1 &&
         isfinite(rule->step_down) && isfinite(rule->step_up) &&
         isfinite(rule->step_first);
}

ef_up_down ef_up_down_default(void) {
  return (ef_up_down){.n_down = 2,
                      .n_up = 1,
                      .step_down = 1.25,
                      .step_up = 1.25,
                      .step_first = 1.6,
                      .n_turns_left_out = 2};
}

double ef_up_down_target(const ef_up_down *rule) {
  if (!is_rule(rule))
    return (double)NAN;
  /* At rest the expected change is none: P down = (1 - P) up. */
  const double down = log(rule->step_down), up = log(rule->step_up);
  const double balance = up / (up + down);
  double low = 0, high = 1;
  for (int i = 0; i < 100 && low < high; ++i) {
    const double middle = 0.5 * (low + high);
    if (middle <= low || middle >= high)
      break;
    if (down_before_up(middle, rule->n_down, rule->n_up) < balance)
      low = middle;
    else
      high = middle;
  }
  return 0.5 * (low + high);
}

ef__run ef__run_begin(const ef_up_down *rule, double level) {
  return (ef__run){.rule = *rule, .t = log(level)};
}

/* A change of direction is a turn, at the level before it. */
static void change(ef__run *run, int direction, double step) {
  if (run->direction != 0 && direction != run->direction) {
    if (run->n_turns++ >= run->rule.n_turns_left_out) {
      run->last[0] = run->last[1];
      run->last[1] = run->t;
      run->sum += run->t;
      run->n_summed++;
    }
  }
  run->direction = direction;
  const bool is_first = run->n_turns < run->rule.n_turns_left_out;
  run->t += direction * log(is_first ? run->rule.step_first : step);
  run->n_right = run->n_wrong = 0;
}

void ef__run_answer(ef__run *run, bool is_right) {
  if (is_right) {
    run->n_wrong = 0;
    if (++run->n_right == run->rule.n_down)
      change(run, -1, run->rule.step_down);
  } else {
    run->n_right = 0;
    if (++run->n_wrong == run->rule.n_up)
      change(run, 1, run->rule.step_up);
  }
}

double ef__run_estimate(const ef__run *run) {
  if (run->n_summed < 2)
    return (double)NAN;
  /* As many peaks as valleys: an odd last turn is left out. */
  const bool is_odd = run->n_summed % 2 == 1;
  const double sum = is_odd ? run->sum - run->last[1] : run->sum;
  return exp(sum / (double)(run->n_summed - is_odd));
}
