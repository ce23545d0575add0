/* SPDX-License-Identifier: GPL-3.0-or-later */
/* From differences to answers. Everything is a function of x = ln(difference /
 * JND): the median observer has ln d' = beta x + ln d'(criterion), the others
 * depart from it by beta times the logarithm of their JND. */
#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"
#include "difference/answers.h"

#include <evenfield/difference.h>

/* z of the upper 2.5 % */
#define Z_975 1.959963984540054

enum {
  LEAST_DRAWS = 100,
  MOST_DRAWS = 10 * 1000 * 1000,
  CHUNK = 4 /* pairs a thread takes: some milliseconds */
};

/* What is told of a pair besides x. */
enum { SHARE = EF__ANSWERS, OUTCOMES };

typedef struct work {
  const ef_jnd_record *jnd;
  const ef_judged *judged;
  const ef_told_apart_settings *settings;
  ef__answers *answers;
  double log_jnd, log_d_prime; /* at the criterion */
  double jnd_sd;               /* of ln JND */
  double *draw; /* n_draws x 3 standard normals: measurement, batch, JND */
  ef_told_apart *out;
  bool *no_memory; /* of each chunk */
} work;

/* ---- One observer's difference to answers ------------------------------ */

static double log_d_prime(const work *w, double x) {
  return w->jnd->exponent * x + w->log_d_prime;
}

/* Outcome at x, and d outcome / d x unless NULL (NaN where there is none). */
static double outcome_at(const work *w, size_t outcome, double x,
                         double *slope) {
  if (outcome < EF__ANSWERS) {
    const double value = ef__answers_share(w->answers, (ef__answer)outcome,
                                           log_d_prime(w, x), slope);
    if (slope != NULL)
      *slope *= w->jnd->exponent;
    return value;
  }
  const double sd = w->jnd->observer_log_sd;
  if (sd == 0) {
    if (slope != NULL)
      *slope = (double)NAN;
    return x > 0;
  }
  if (slope != NULL)
    *slope = ef__phi(x / sd) / sd;
  return ef__normal(x / sd);
}

/* The x at which one observer's difference has this outcome. */
static double place_of(const work *w, size_t outcome, double value) {
  if (outcome == SHARE)
    return w->jnd->observer_log_sd * ef__normal_inverse(value);
  return (ef__answers_place(w->answers, (ef__answer)outcome, value) -
          w->log_d_prime) /
         w->jnd->exponent;
}

/* ---- One pair ---------------------------------------------------------- */

typedef struct pair {
  size_t n; /* observers */
  const double *difference;
  double mean;
  double measurement_sd, batch_sd;
} pair;

static pair pair_at(const work *w, size_t i) {
  const ef_judged *const j = w->judged;
  pair p = {.n = j->n_observers,
            .difference = j->difference + i * j->n_observers,
            .measurement_sd =
                j->measurement_sd != NULL ? j->measurement_sd[i] : 0,
            .batch_sd = j->batch_sd != NULL ? j->batch_sd[i] : 0};
  for (size_t k = 0; k < p.n; ++k)
    p.mean += p.difference[k] / (double)p.n;
  return p;
}

/* x of a difference; -INFINITY for none. */
static double x_of(const work *w, double difference) {
  return difference > 0 ? log(difference) - w->log_jnd : -(double)INFINITY;
}

/* Mean outcome over the observers. */
static double mean_outcome(const work *w, const pair *p, size_t outcome) {
  double sum = 0;
  for (size_t k = 0; k < p->n; ++k)
    sum += outcome_at(w, outcome, x_of(w, p->difference[k]), NULL);
  return sum / (double)p->n;
}

static ef_estimate *outcomes_of(ef_told_apart *out, size_t outcome) {
  ef_estimate *const at[OUTCOMES] = {
      [EF__ANSWER_2IFC] = &out->correct_2ifc,
      [EF__ANSWER_SAME_DIFFERENT] = &out->correct_same_different,
      [EF__ANSWER_TRIANGLE] = &out->correct_triangle,
      [SHARE] = &out->share_of_observers};
  return at[outcome];
}

static ef_estimate certain(double value) {
  return (ef_estimate){.value = value, .se = 0, .low = value, .high = value};
}

/* Best values and, as if nothing were uncertain, their intervals. */
static void tell_values(const work *w, const pair *p, ef_told_apart *out) {
  const double x = x_of(w, p->mean);
  out->jnds = certain(isnan(p->mean) ? p->mean : exp(x));
  out->d_prime =
      certain(isnan(p->mean) ? p->mean : exp(log_d_prime(w, x)));
  for (size_t o = 0; o < OUTCOMES; ++o)
    *outcomes_of(out, o) = certain(
        isnan(p->mean) ? p->mean : mean_outcome(w, p, o));
}

/* Shares of variance, and the variance of x. */
static double tell_budget(const work *w, const pair *p, ef_told_apart *out) {
  const double parts[] = {
      p->measurement_sd > 0 ? p->measurement_sd / p->mean : 0,
      p->batch_sd > 0 ? p->batch_sd / p->mean : 0, w->jnd_sd};
  const double sum = parts[0] * parts[0] + parts[1] * parts[1] +
                     parts[2] * parts[2];
  if (sum > 0) { /* infinite for no difference: shares of what is */
    const double whole = isfinite(sum) ? sum
                                       : p->measurement_sd * p->measurement_sd +
                                             p->batch_sd * p->batch_sd;
    const double unit = isfinite(sum) ? p->mean : 1;
    out->from_measurement =
        p->measurement_sd / unit * (p->measurement_sd / unit) / whole;
    out->from_batch = p->batch_sd / unit * (p->batch_sd / unit) / whole;
    out->from_jnd = isfinite(sum) ? w->jnd_sd * w->jnd_sd / whole : 0;
  }
  return sum;
}

/* ---- First order ------------------------------------------------------- */

/* Standard deviation of an outcome by its slopes. */
static double outcome_sd(const work *w, const pair *p, size_t outcome) {
  double by_shift = 0, by_jnd = 0;
  for (size_t k = 0; k < p->n; ++k) {
    double slope;
    if (p->difference[k] == 0)
      continue; /* the curves are flat there */
    outcome_at(w, outcome, x_of(w, p->difference[k]), &slope);
    by_shift += slope / p->difference[k] / (double)p->n;
    by_jnd += slope / (double)p->n;
  }
  return hypot(by_shift * hypot(p->measurement_sd, p->batch_sd),
               by_jnd * w->jnd_sd);
}

static void unknown_spread(ef_estimate *e) {
  e->se = e->low = e->high = (double)NAN;
}

static void widen_outcome(const work *w, const pair *p, size_t outcome,
                          double sd_of_x, ef_estimate *e) {
  const double own_x = x_of(w, p->mean);
  e->se = outcome_sd(w, p, outcome);
  if (outcome == SHARE && w->jnd->observer_log_sd == 0) {
    unknown_spread(e);
    if (p->n > 1)
      return;
    /* A step: no slope, but the ends of x are on a side each. */
    e->low = own_x - Z_975 * sd_of_x > 0;
    e->high = own_x + Z_975 * sd_of_x > 0;
    return;
  }
  const double x = p->n == 1 ? own_x : place_of(w, outcome, e->value);
  if (!(e->se > 0) || !isfinite(x))
    return; /* flat: chance or certainty */
  double slope, sd = sd_of_x;
  if (p->n > 1) {
    outcome_at(w, outcome, x, &slope);
    sd = e->se / slope;
  }
  e->low = outcome_at(w, outcome, x - Z_975 * sd, NULL);
  e->high = outcome_at(w, outcome, x + Z_975 * sd, NULL);
}

static void first_order(const work *w, const pair *p, double variance,
                        ef_told_apart *out) {
  const double sd = sqrt(variance);
  ef_estimate *const scaled[] = {&out->jnds, &out->d_prime};
  const double power[] = {1, w->jnd->exponent};
  for (size_t i = 0; i < 2; ++i) {
    const double value = scaled[i]->value, reach = Z_975 * power[i] * sd;
    scaled[i]->se = value * power[i] * sd;
    scaled[i]->low = value * exp(-reach);
    scaled[i]->high = value * exp(reach);
  }
  for (size_t o = 0; o < OUTCOMES; ++o)
    widen_outcome(w, p, o, sd, outcomes_of(out, o));
  if (isfinite(variance))
    return;
  unknown_spread(&out->jnds);
  unknown_spread(&out->d_prime);
  for (size_t o = 0; o < OUTCOMES; ++o)
    unknown_spread(outcomes_of(out, o));
}

/* ---- Monte Carlo ------------------------------------------------------- */

/* Of drawn values. */
static double sd_of(size_t n, const double *value) {
  double sum = 0, squares = 0;
  for (size_t i = 0; i < n; ++i)
    sum += value[i];
  const double mean = sum / (double)n;
  for (size_t i = 0; i < n; ++i)
    squares += (value[i] - mean) * (value[i] - mean);
  return sqrt(squares / (double)(n - 1));
}

/* The outcomes of each draw: `value` is (OUTCOMES + 1) x n_draws, the last row
 * the JNDs of the mean difference. */
static void draw_outcomes(const work *w, const pair *p, double *value) {
  const size_t n = w->settings->n_draws;
  for (size_t i = 0; i < n; ++i) {
    const double *const z = w->draw + 3 * i;
    const double shift = p->measurement_sd * z[0] + p->batch_sd * z[1];
    const double drop = w->jnd_sd * z[2];
    double sum[OUTCOMES] = {0};
    for (size_t k = 0; k < p->n; ++k) {
      const double x = x_of(w, p->difference[k] + shift) - drop;
      for (size_t o = 0; o < OUTCOMES; ++o)
        sum[o] += outcome_at(w, o, x, NULL);
    }
    for (size_t o = 0; o < OUTCOMES; ++o)
      value[o * n + i] = sum[o] / (double)p->n;
    value[OUTCOMES * n + i] = exp(x_of(w, p->mean + shift) - drop);
  }
}

/* d' of so many JNDs. */
static double d_prime_of(const work *w, double jnds) {
  return exp(log_d_prime(w, log(jnds)));
}

static void monte_carlo(const work *w, const pair *p, double *value,
                        ef_told_apart *out) {
  const size_t n = w->settings->n_draws;
  draw_outcomes(w, p, value);
  double *const jnds = value + OUTCOMES * n;
  out->jnds.se = sd_of(n, jnds);
  out->jnds.low = ef_quantile(n, jnds, 0.025);
  out->jnds.high = ef_quantile(n, jnds, 0.975);
  out->d_prime.low = d_prime_of(w, out->jnds.low);
  out->d_prime.high = d_prime_of(w, out->jnds.high);
  for (size_t o = 0; o < OUTCOMES; ++o) {
    ef_estimate *const e = outcomes_of(out, o);
    e->se = sd_of(n, value + o * n);
    if (p->n == 1) { /* every outcome grows with the JNDs */
      e->low = outcome_at(w, o, log(out->jnds.low), NULL);
      e->high = outcome_at(w, o, log(out->jnds.high), NULL);
      continue;
    }
    e->low = ef_quantile(n, value + o * n, 0.025);
    e->high = ef_quantile(n, value + o * n, 0.975);
  }
  for (size_t i = 0; i < n; ++i)
    jnds[i] = d_prime_of(w, jnds[i]);
  out->d_prime.se = sd_of(n, jnds);
}

/* ---- Some pairs -------------------------------------------------------- */

static void tell_range(void *context, size_t begin, size_t end) {
  const work *const w = context;
  const bool draws = w->draw != NULL;
  double *const value = draws ? ef__allocate((OUTCOMES + 1) *
                                                 w->settings->n_draws,
                                             sizeof *value)
                              : NULL;
  if (draws && value == NULL) {
    w->no_memory[begin / CHUNK] = true;
    return;
  }
  for (size_t i = begin; i < end; ++i) {
    const pair p = pair_at(w, i);
    ef_told_apart *const out = &w->out[i];
    *out = (ef_told_apart){.from_measurement = 0};
    tell_values(w, &p, out);
    const double variance = tell_budget(w, &p, out);
    if (isnan(p.mean) || !(variance > 0))
      continue;
    if (draws)
      monte_carlo(w, &p, value, out);
    else
      first_order(w, &p, variance, out);
  }
  free(value);
}

static ef_status check_sd(const double *sd, size_t n, const char *what,
                          ef_error *error) {
  for (size_t i = 0; sd != NULL && i < n; ++i) {
    if (sd[i] >= 0 && isfinite(sd[i]))
      continue;
    return ef__error_set(error, EF_INVALID,
                         "the %s of pair %zu is %g, expected a number from 0",
                         what, i + 1, sd[i]);
  }
  return EF_OK;
}

static ef_status check_judged(size_t n, const ef_judged *judged,
                              ef_error *error) {
  if (judged->n_observers < 1)
    return ef__error_set(error, EF_INVALID,
                         "no observer to tell the pairs apart");
  for (size_t i = 0; i < n * judged->n_observers; ++i) {
    const double d = judged->difference[i];
    if (isnan(d) || (d >= 0 && isfinite(d)))
      continue;
    return ef__error_set(error, EF_INVALID,
                         "the difference of pair %zu is %g, expected a number "
                         "from 0",
                         i / judged->n_observers + 1, d);
  }
  const ef_status status = check_sd(judged->measurement_sd, n,
                                    "measurement uncertainty", error);
  return status == EF_OK ? check_sd(judged->batch_sd, n, "batch spread", error)
                         : status;
}

static ef_status check_settings(const ef_jnd_record *jnd,
                                const ef_told_apart_settings *settings,
                                ef_error *error) {
  const ef_status status = ef_jnd_record_check(jnd, error);
  if (status != EF_OK)
    return status;
  if (settings->propagation == EF_PROPAGATE_MONTE_CARLO &&
      (settings->n_draws < LEAST_DRAWS || settings->n_draws > MOST_DRAWS))
    return ef__error_set(error, EF_INVALID,
                         "%zu draws, expected %d to %d", settings->n_draws,
                         LEAST_DRAWS, MOST_DRAWS);
  return EF_OK;
}

/* Standard deviation of ln JND by the interval of the record. */
static double jnd_sd_of(const ef_jnd_record *jnd) {
  return isnan(jnd->low) ? 0 : log(jnd->high / jnd->low) / (2 * Z_975);
}

ef_told_apart_settings ef_told_apart_settings_default(void) {
  return (ef_told_apart_settings){
      .propagation = EF_PROPAGATE_MONTE_CARLO, .seed = 1, .n_draws = 10000};
}

/* ---- What serves all pairs --------------------------------------------- */

struct ef_teller {
  ef_jnd_record jnd;
  ef_told_apart_settings settings;
  work common; /* but for what is judged and the answers */
};

static bool draw_normals(ef_teller *t) {
  const size_t n = t->settings.n_draws;
  if (t->settings.propagation != EF_PROPAGATE_MONTE_CARLO)
    return true;
  double *const draw = ef__allocate(3 * n, sizeof *draw);
  t->common.draw = draw;
  if (draw == NULL)
    return false;
  ef__gsl_ready();
  for (size_t i = 0; i < n; ++i) {
    ef__random stream = ef__random_stream(t->settings.seed, i);
    for (size_t k = 0; k < 3; ++k)
      draw[3 * i + k] = ef__random_normal(&stream);
  }
  return true;
}

ef_teller *ef_teller_new(const ef_jnd_record *jnd,
                         const ef_told_apart_settings *settings,
                         ef_error *error) {
  if (check_settings(jnd, settings, error) != EF_OK)
    return NULL;
  ef_teller *const t = ef__allocate_zeroed(1, sizeof *t);
  if (t != NULL) {
    t->jnd = *jnd;
    t->settings = *settings;
    t->common =
        (work){.jnd = &t->jnd,
               .settings = &t->settings,
               .log_jnd = log(jnd->value),
               .log_d_prime = log(ef_criterion_d_prime(&jnd->criterion)),
               .jnd_sd = jnd_sd_of(jnd)};
    t->common.answers = ef__answers_new(jnd->exponent * jnd->observer_log_sd);
    if (t->common.answers != NULL && draw_normals(t))
      return t;
  }
  ef_teller_free(t);
  ef__error_memory(error, "what is told apart");
  return NULL;
}

void ef_teller_free(ef_teller *teller) {
  if (teller == NULL)
    return;
  ef__answers_free(teller->common.answers);
  free(teller->common.draw);
  free(teller);
}

/* ---- All pairs --------------------------------------------------------- */

ef_status ef_teller_tell(const ef_teller *teller, size_t n,
                         const ef_judged *judged, int jobs, ef_told_apart *out,
                         ef_error *error) {
  const ef_status status = check_judged(n, judged, error);
  if (status != EF_OK)
    return status;
  work w = teller->common;
  const size_t n_chunks = n / CHUNK + 1;
  w.judged = judged;
  w.out = out;
  w.no_memory = ef__allocate_zeroed(n_chunks, sizeof *w.no_memory);
  bool has_memory = w.no_memory != NULL;
  if (has_memory)
    ef__parallel_for(n, CHUNK, jobs, tell_range, &w);
  for (size_t i = 0; i < n_chunks && has_memory; ++i)
    has_memory = !w.no_memory[i];
  free(w.no_memory);
  return has_memory ? EF_OK : ef__error_memory(error, "what is told apart");
}

ef_status ef_told_apart_batch(const ef_jnd_record *jnd, size_t n,
                              const ef_judged *judged,
                              const ef_told_apart_settings *settings, int jobs,
                              ef_told_apart *out, ef_error *error) {
  ef_status status = check_settings(jnd, settings, error);
  if (status == EF_OK)
    status = check_judged(n, judged, error);
  if (status != EF_OK)
    return status;
  ef_teller *const teller = ef_teller_new(jnd, settings, error);
  if (teller == NULL)
    return ef__error_memory(error, "what is told apart");
  status = ef_teller_tell(teller, n, judged, jobs, out, error);
  ef_teller_free(teller);
  return status;
}
