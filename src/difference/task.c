/* SPDX-License-Identifier: GPL-3.0-or-later */
/* From sensitivity d' to answers and back, task by task. */
#include "difference/difference_private.h"

#include "base/base_private.h"

#include <float.h>
#include <math.h>

#define SQRT_2 1.4142135623730950488
#define SQRT_6 2.4494897427831780982
#define PI 3.14159265358979323846

typedef struct task_row {
  const char *name;
  const char *positive;
  double chance;
} task_row;

/* NaN: the observer's own false-alarm rate. */
static const task_row rows[] = {
    [EF_TASK_YES_NO] = {"yes-no", "yes", (double)NAN},
    [EF_TASK_2IFC] = {"2ifc", "right", 0.5},
    [EF_TASK_SAME_DIFFERENT] = {"same-different", "different", (double)NAN},
    [EF_TASK_TRIANGLE] = {"triangle", "right", 1.0 / 3},
    [EF_TASK_GREATER_LESS] = {"greater-less", "greater", 0},
};

size_t ef_task_count(void) {
  return sizeof rows / sizeof rows[0];
}

static bool is_task(ef_task task) {
  return (size_t)task < ef_task_count();
}

const char *ef_task_name(ef_task task) {
  return is_task(task) ? rows[task].name : "unknown";
}

const char *ef_task_positive(ef_task task) {
  return is_task(task) ? rows[task].positive : "unknown";
}

double ef_task_chance(ef_task task) {
  return is_task(task) ? rows[task].chance : (double)NAN;
}

ef_status ef_task_find(const char *name, ef_task *task, ef_error *error) {
  const char *known[sizeof rows / sizeof rows[0]];
  const size_t n = ef_task_count();
  for (size_t i = 0; i < n; ++i) {
    if (ef__name_equal(name, rows[i].name)) {
      *task = (ef_task)i;
      return EF_OK;
    }
    known[i] = rows[i].name;
  }
  return ef__error_unknown(error, "task", name, known, n);
}

/* Ennis 1993: p = 2 int_0^inf [Phi(-z sqrt 3 + a) + Phi(-z sqrt 3 - a)] phi(z)
 * dz with a = d' sqrt(2/3). Its derivative in a is phi(a/2) (2 Phi(sqrt 3 a/2)
 * - 1), the density of a skew normal, so p = 1 - 4 T(a/2, sqrt 3) with the T
 * function of Owen 1956,
 *   T(h, b) = 1/(2 pi) int_0^b exp(-h^2 (1 + x^2) / 2) / (1 + x^2) dx.
 * where x = tan(angle) leaves int_0^(pi/3) exp(-h^2 / (2 cos^2)) d angle. Gauss
 * and Legendre's 24 points take it to rounding (1e-15 for d' up to 20, against
 * the adaptive rule of GSL). */
double ef__triangle_miss(double d_prime) {
  /* Positive abscissas and weights of the 24-point rule on [-1, 1]
   * (Abramowitz & Stegun 1964, table 25.4). */
  static const double abscissa[12] = {
      0.064056892862605626085, 0.191118867473616309159,
      0.315042679696163374387, 0.433793507626045138487,
      0.545421471388839535658, 0.648093651936975569252,
      0.740124191578554364244, 0.820001985973902921954,
      0.886415527004401034213, 0.938274552002732758524,
      0.974728555971309498198, 0.995187219997021360180};
  static const double weight[12] = {
      0.127938195346752156974, 0.125837456346828296121,
      0.121670472927803391204, 0.115505668053725601353,
      0.107444270115965634783, 0.097618652104113888270,
      0.086190161531953275917, 0.073346481411080305734,
      0.059298584915436780746, 0.044277438817419806169,
      0.028531388628933663181, 0.012341229799987199547};
  const double h = d_prime / SQRT_6;
  const double half = PI / 6;
  double sum = 0;
  for (size_t i = 0; i < 12; ++i) {
    const double near = cos(half * (1 - abscissa[i]));
    const double far = cos(half * (1 + abscissa[i]));
    sum += weight[i] * (exp(-0.5 * h * h / (near * near)) +
                        exp(-0.5 * h * h / (far * far)));
  }
  return 0.5 * sum; /* 6 T: half the rule's interval over pi/3, times 2 */
}

/* Same-different, differencing model: the observer answers "different" when two
 * observations lie further apart than k. */
static double same_different_share(double d_prime, double k) {
  return ef__normal((d_prime - k) / SQRT_2) +
         ef__normal((-d_prime - k) / SQRT_2);
}

static bool is_rate(double p) {
  return p > 0 && p < 1;
}

double ef_task_proportion(ef_task task, double false_alarms, double d_prime) {
  if (!(d_prime >= 0))
    return (double)NAN;
  switch (task) {
  case EF_TASK_YES_NO:
    if (!is_rate(false_alarms))
      return (double)NAN;
    return ef__normal(d_prime + ef__normal_inverse(false_alarms));
  case EF_TASK_SAME_DIFFERENT:
    if (!is_rate(false_alarms))
      return (double)NAN;
    return same_different_share(
        d_prime, -SQRT_2 * ef__normal_inverse(0.5 * false_alarms));
  case EF_TASK_2IFC:
  case EF_TASK_GREATER_LESS:
    return ef__normal(d_prime / SQRT_2);
  case EF_TASK_TRIANGLE:
    return 1 - ef__triangle_miss(d_prime) * 2 / 3;
  }
  return (double)NAN;
}

/* d' >= 0 of a share that grows with d' from `share(0)`, by bisection on the
 * bits that matter: 60 halvings of a bracket. */
static double invert(double (*share)(double d_prime, double fixed),
                     double fixed, double proportion) {
  if (!(proportion >= share(0, fixed)) || !(proportion < 1))
    return (double)NAN;
  double low = 0, high = 1;
  while (share(high, fixed) < proportion) {
    high *= 2;
    if (high > 64)
      return (double)NAN; /* the share is 1 to rounding before */
  }
  while (high - low > 2 * DBL_EPSILON * high) {
    const double middle = 0.5 * (low + high);
    if (share(middle, fixed) < proportion)
      low = middle;
    else
      high = middle;
    if (middle < DBL_MIN)
      break; /* at chance to rounding */
  }
  return 0.5 * (low + high);
}

static double triangle_share(double d_prime, double unused) {
  (void)unused;
  return 1 - ef__triangle_miss(d_prime) * 2 / 3;
}

double ef_task_d_prime(ef_task task, double false_alarms, double proportion) {
  if (!(proportion > 0) || !(proportion < 1))
    return (double)NAN;
  double d_prime = (double)NAN;
  switch (task) {
  case EF_TASK_YES_NO:
    if (!is_rate(false_alarms))
      return (double)NAN;
    d_prime = ef__normal_inverse(proportion) - ef__normal_inverse(false_alarms);
    break;
  case EF_TASK_SAME_DIFFERENT:
    if (!is_rate(false_alarms))
      return (double)NAN;
    if (proportion == false_alarms)
      return 0;
    return invert(same_different_share,
                  -SQRT_2 * ef__normal_inverse(0.5 * false_alarms), proportion);
  case EF_TASK_2IFC:
    d_prime = SQRT_2 * ef__normal_inverse(proportion);
    break;
  case EF_TASK_GREATER_LESS:
    return SQRT_2 * ef__normal_inverse(proportion);
  case EF_TASK_TRIANGLE:
    if (proportion == ef_task_chance(task))
      return 0;
    return invert(triangle_share, 0, proportion);
  }
  return d_prime >= 0 ? d_prime : (double)NAN;
}

/* Largest (H + 1 - F) / 2 over k in same-different: where the densities of the
 * absolute difference cross, cosh(k d' / 2) = exp(d'^2 / 4). */
static double best_same_different(double d_prime, double unused) {
  (void)unused;
  if (d_prime == 0)
    return 0.5;
  /* acosh(exp(s)) = s + ln(1 + sqrt(1 - exp(-2 s))) for any s >= 0 */
  const double s = 0.25 * d_prime * d_prime;
  const double k = 2 / d_prime * (s + log1p(sqrt(-expm1(-2 * s))));
  return 0.5 *
         (1 + same_different_share(d_prime, k) - same_different_share(0, k));
}

double ef_task_best_correct(ef_task task, double d_prime) {
  if (!(d_prime >= 0))
    return (double)NAN;
  if (task == EF_TASK_YES_NO)
    return ef__normal(0.5 * d_prime);
  if (task == EF_TASK_SAME_DIFFERENT)
    return best_same_different(d_prime, 0);
  return ef_task_proportion(task, 0, d_prime);
}

double ef_task_best_d_prime(ef_task task, double correct) {
  if (!(correct > 0) || !(correct < 1))
    return (double)NAN;
  if (task == EF_TASK_YES_NO) {
    const double d_prime = 2 * ef__normal_inverse(correct);
    return d_prime >= 0 ? d_prime : (double)NAN;
  }
  if (task == EF_TASK_SAME_DIFFERENT)
    return correct == 0.5 ? 0 : invert(best_same_different, 0, correct);
  return ef_task_d_prime(task, 0, correct);
}

double ef_independent_best_correct(double d_prime) {
  if (!(d_prime >= 0))
    return (double)NAN;
  const double near = ef__normal(0.5 * d_prime);
  const double far = ef__normal(-0.5 * d_prime);
  return near * near + far * far;
}

double ef_independent_d_prime(double hits, double false_alarms) {
  if (!is_rate(hits) || !is_rate(false_alarms))
    return (double)NAN;
  const double correct = ef__normal(
      0.5 * (ef__normal_inverse(hits) - ef__normal_inverse(false_alarms)));
  if (correct < 0.5)
    return (double)NAN;
  return 2 * ef__normal_inverse(0.5 * (1 + sqrt(2 * correct - 1)));
}

double ef_criterion_d_prime(const ef_criterion *criterion) {
  if (!isnan(criterion->d_prime))
    return criterion->d_prime;
  return ef_task_d_prime(criterion->task, criterion->false_alarms,
                         criterion->proportion);
}

static ef_status criterion_without(const char *which, double d_prime,
                                   ef_error *error) {
  return ef__error_set(
      error, EF_NO_ANSWER,
      "the criterion to convert %s has no d' above 0 (found %g): give a "
      "proportion above chance and below 1; yes-no and same-different also "
      "need the false-alarm rate",
      which, d_prime);
}

ef_status ef_threshold_convert(double threshold, double exponent,
                               const ef_criterion *from, const ef_criterion *to,
                               double *converted, ef_error *error) {
  if (!(threshold > 0) || !isfinite(threshold)) {
    return ef__error_set(error, EF_INVALID,
                         "threshold is %g, expected a number above 0",
                         threshold);
  }
  if (!(exponent > 0) || !isfinite(exponent)) {
    return ef__error_set(error, EF_INVALID,
                         "exponent is %g, expected a number above 0", exponent);
  }
  const double d_from = ef_criterion_d_prime(from);
  if (!(d_from > 0) || !isfinite(d_from))
    return criterion_without("from", d_from, error);
  const double d_to = ef_criterion_d_prime(to);
  if (!(d_to > 0) || !isfinite(d_to))
    return criterion_without("to", d_to, error);
  *converted = threshold * pow(d_to / d_from, 1 / exponent);
  return EF_OK;
}
