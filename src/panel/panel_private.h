/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the files of this folder share. */
#ifndef EVENFIELD_PANEL_PRIVATE_H
#define EVENFIELD_PANEL_PRIVATE_H

#include <evenfield/panel.h>

#include "base/base_private.h"
#include "difference/difference_private.h"

/* ---- Curves with derivatives (psychometric.c) -------------------------- */

/** Position of the four parameters in every array of them. eta = intercept +
 * slope t; GUESS is the criterion k where the model has one. */
enum { EF__INTERCEPT, EF__SLOPE, EF__GUESS, EF__LAPSE, EF__PARAMETERS };

typedef struct ef__model {
  ef_shape shape;
  ef_task task;
  bool lapses_both_ways; /**< p = lapse + (1 - 2 lapse) F: greater-less, where
                              an answer without looking may be either */
} ef__model;

/** Third parameter is the criterion k of the observer, not a share. */
bool ef__model_has_criterion(const ef__model *model);

/** Share p of positive answers, q = 1 - p without cancellation, and how p
 * changes with eta, guess (or k) and lapse. */
typedef struct ef__point {
  double p, q;
  double p_eta, p_guess, p_lapse;
  double p_eta_eta, p_eta_guess, p_guess_guess, p_eta_lapse, p_guess_lapse;
} ef__point;

/** At eta; a blank is eta = -infinity. */
void ef__model_point(const ef__model *model, double eta, bool is_blank,
                     double guess, double lapse, ef__point *out);
/** p and q alone. */
void ef__model_share(const ef__model *model, double eta, bool is_blank,
                     double guess, double lapse, double *p, double *q);
/** eta at a share of positive answers without lapses; NaN when none. */
double ef__model_eta(const ef__model *model, double guess, double proportion);
/** eta where F has this value; for models without a criterion. */
double ef__model_core_eta(const ef__model *model, double f);
/** Guess rate <-> third parameter. */
double ef__model_guess(const ef__model *model, double rate);
double ef__model_guess_rate(const ef__model *model, double guess);
/** Standard deviation of F over its width: 1, pi / sqrt 3, pi / sqrt 6. */
double ef__shape_deviation(ef_shape shape);

/* ---- Answers ready for a fit (responses.c) ----------------------------- */

/** Distinct levels, lowest first, blanks (at most one row) before them. t is
 * centred and scaled: t = (axis value - centre) / scale. */
typedef struct ef__data {
  size_t n;
  bool has_blank; /**< row 0 is one; its t is 0 and means nothing */
  double centre, scale;
  double least_gap; /**< between neighbours of t; 0 below two levels */
  double *t, *shown, *positive; /**< n each, of one block */
  const double *level;          /**< as given, of the same block; NULL for
                                     designs that are no answers */
} ef__data;

/** Adds row (from 1) and array to an error already set; returns `status`. */
ef_status ef__error_row(ef_error *error, ef_status status, size_t row,
                        const char *field);

/** Checks and sorts. `block` receives what to free. */
ef_status ef__data_new(const ef_responses *responses, ef_axis axis,
                       ef__data *out, void **block, ef_error *error);
/** Sets centre, scale and least_gap from t in axis values, and scales t:
 * weighted mean 0, weighted standard deviation 1. */
void ef__data_scale(ef__data *data);
double ef__axis_value(ef_axis axis, double level);
double ef__axis_level(ef_axis axis, double t);

/* ---- Minimiser (newton.c) ---------------------------------------------- */

/** A function of up to four parameters inside limits. */
typedef struct ef__objective {
  size_t m;
  /** The value; also, unless NULL, gradient (m), curvature and a positive
   * semidefinite stand-in for it (the expected information), m x m. */
  double (*evaluate)(const void *ctx, const double *x, double *gradient,
                     double *curvature, double *expected);
  const void *ctx;
  double low[EF__PARAMETERS], high[EF__PARAMETERS]; /**< equal: fixed */
} ef__objective;

typedef struct ef__minimum {
  double x[EF__PARAMETERS];
  double value;
  int iterations;
  bool converged;
} ef__minimum;

/** From `origin` (moved inside the limits) downhill until the Newton step that
 * is left would gain less than `tolerance`, and that step. `converged` is false
 * when it could not. */
void ef__minimise(const ef__objective *objective, const double *origin,
                  double tolerance, ef__minimum *out);

/** Inverse of the m x m positive definite matrix for the rows and columns that
 * are free; zero elsewhere. False when it is singular to rounding. */
bool ef__invert_free(size_t m, const double *matrix, const bool *is_free,
                     double *inverse);

/* ---- Likelihood (likelihood.c) ----------------------------------------- */

/** Model, data and limits; parameters are those of ef__model in the scaled t.
 */
typedef struct ef__likelihood {
  ef__model model;
  const ef__data *data;
  double low[EF__PARAMETERS], high[EF__PARAMETERS];
} ef__likelihood;

/** Minus the logarithm of the likelihood, without binomial coefficients, minus
 * that of free shares: half the deviance. The context of an ef__objective. */
double ef__likelihood_evaluate(const void *ctx, const double *theta,
                               double *gradient, double *curvature,
                               double *expected);
/** The objective over all four parameters. */
ef__objective ef__likelihood_objective(const ef__likelihood *likelihood);
/** k ln(k / (n p)): a level's part of the above for one kind of answer; 0 for
 * k = 0, infinite for p = 0. */
double ef__likelihood_part(double k, double n, double p);

/* ---- Fit (fit.c, start.c, support.c) ----------------------------------- */

/** Model, limits and what is estimated, from the settings. */
ef_status ef__likelihood_setup(const ef_fit_settings *settings,
                               const ef__data *data, ef__likelihood *out,
                               ef_error *error);
bool ef__is_estimated(const ef__likelihood *likelihood, size_t parameter);
size_t ef__parameter_count(const ef__likelihood *likelihood);
/** Proportion at the threshold by settings or task. */
double ef__criterion(const ef_fit_settings *settings);

/** Gain in log likelihood below which the next step is the last. A gain of g
 * means sqrt(2 g) standard errors, which the last step squares: 1e-9 of one. */
#define EF__TOLERANCE 1e-9
/** For fits to simulated answers: 1e-5 standard errors. */
#define EF__TOLERANCE_QUICK 1e-5

/** The largest likelihood from the starts that the data suggest and, unless
 * NULL, from `origin`. Quick: from three starts instead of seven. */
void ef__maximise(const ef__likelihood *likelihood, const double *origin,
                  bool is_quick, double tolerance, ef__minimum *out);

/** What the answers can carry. For EF_SUPPORT_STEP the threshold lies between
 * two rows of the data, or at one. */
typedef struct ef__verdict {
  ef_support support;
  size_t row_low, row_high;
} ef__verdict;
/** Whether there are levels enough, and answers of both kinds. */
ef__verdict ef__support_before(const ef__likelihood *likelihood);
/** Whether the answers depend on the level, and how abruptly. */
ef__verdict ef__support_after(const ef__likelihood *likelihood,
                              const ef__minimum *fit);
/** The refusal in words: EF_NO_ANSWER. EF_OK for EF_SUPPORT_FULL and _STEP. */
ef_status ef__support_error(const ef__likelihood *likelihood,
                            const ef_fit_settings *settings,
                            const ef__verdict *verdict, ef_error *error);

/** Level of a row. */
double ef__row_level(const ef__data *data, ef_axis axis, size_t row);

/* ---- Posterior on a grid (posterior.c) ---------------------------------- */

/** Places of the grid in the order threshold, width, lapse, the last running
 * fastest. */
typedef struct ef__grid {
  size_t n_thresholds, n_widths, n_lapses;
  double *threshold, *width, *lapse; /**< values of each, in t */
} ef__grid;

/** Posterior over it, and p at the levels in hand. */
typedef struct ef__posterior {
  ef__grid grid;
  ef__model model;
  double guess, eta; /**< third parameter, and F^-1 at the threshold */
  size_t n_places, n_levels;
  double *weight; /**< n_places, sum 1 */
  double *share;  /**< n_levels x n_places */
} ef__posterior;

/** Allocates for the grid's counts and sets its values: thresholds and widths
 * evenly and evenly in the logarithm. The prior is flat. */
ef_status ef__posterior_new(ef__posterior *out, size_t n_levels,
                            const double threshold[2], const double width[2],
                            double lapse_max, void **block, ef_error *error);
/** p of every place at t (a blank: is_blank). */
void ef__posterior_share(const ef__posterior *posterior, double t,
                         bool is_blank, double *share);
/** Moves the grid; the prior is flat again. */
void ef__posterior_place(ef__posterior *posterior, const double threshold[2],
                         const double width[2]);
/** Moves it to the places that hold all but a ten-millionth of the weight, when
 * these are less than half of it either way; `scratch` has room for the larger
 * of n_thresholds and n_widths. False when it stays. */
bool ef__posterior_narrow(ef__posterior *posterior, double *scratch);
void ef__posterior_reset(ef__posterior *posterior);
/** One answer at a level in hand. */
void ef__posterior_update(ef__posterior *posterior, size_t level,
                          bool is_positive);
/** Expected entropy of what is aimed at after an answer at that level, in nats.
 */
double ef__posterior_expected(const ef__posterior *posterior, size_t level,
                              ef_next_aim aim);
double ef__posterior_entropy(const ef__posterior *posterior, ef_next_aim aim);
/** Mean and variance of the threshold in t. */
double ef__posterior_mean(const ef__posterior *posterior, double *variance);

/* ---- Up-down (up_down.c) ------------------------------------------------ */

/** A run under way. */
typedef struct ef__run {
  ef_up_down rule;
  double t;                  /**< ln level */
  unsigned n_right, n_wrong; /**< in a row */
  int direction;             /**< of the last change, 0 before the first */
  size_t n_turns;
  double sum; /**< of t at the turns that count */
  size_t n_summed;
  double last[2]; /**< t of the latest two turns that count */
} ef__run;
ef__run ef__run_begin(const ef_up_down *rule, double level);
void ef__run_answer(ef__run *run, bool is_right);
/** Geometric mean of the levels at an even number of turns; NaN below two. */
double ef__run_estimate(const ef__run *run);

/** Where on the curve the answers to the user's questions stand. */
typedef struct ef__reading {
  ef_axis axis;
  double eta_threshold, eta_equality;
  double eta_low, eta_high; /**< F = 1/4 and 3/4 */
  enum { EF__JND_NONE, EF__JND_AT_ETA, EF__JND_RANGE, EF__JND_BY_ALARMS } jnd;
  double eta_jnd;
  double
      zero; /**< t of level 0 on a linear axis; -infinity on a logarithmic one
             */
} ef__reading;
ef__reading ef__reading_new(const ef__likelihood *likelihood,
                            const ef_fit_settings *settings);
/** JND in levels for parameters in the scaled axis. */
double ef__reading_jnd(const ef__reading *reading,
                       const ef__likelihood *likelihood, const double *theta);

/* ---- Simulated answers (simulate.c) ------------------------------------- */

/** Positive answers out of n at share p. */
double ef__draw_binomial(ef__random *random, double n, double p);
/** Positive answers at each level. */
void ef__draw_answers(ef__random *random, const ef__data *data,
                      const double *share, double *positive);

/* ---- Intervals (profile.c, bootstrap.c) --------------------------------- */

/** What is profiled, and in which coordinate. */
typedef struct ef__profile {
  enum {
    EF__PROFILE_ETA,   /**< scaled t where F^-1 is `eta` */
    EF__PROFILE_RANGE, /**< ln of half the range of levels between eta_low and
                            eta_high */
    EF__PROFILE_SLOPE, /**< ln of the scaled slope */
    EF__PROFILE_GUESS, /**< the third parameter */
    EF__PROFILE_LAPSE
  } what;
  double eta, eta_low, eta_high;
} ef__profile;

/** Limits, on either side of `estimate`, where the largest likelihood given the
 * coordinate has fallen by `drop`; infinite where it never does, the bound of
 * the parameter where that comes first. `reach` is a first guess of the
 * distance.
 */
void ef__profile_limits(const ef__likelihood *likelihood,
                        const ef__minimum *fit, const ef__profile *profile,
                        ef_axis axis, double estimate, double reach,
                        double drop, double *low, double *high);

/** Fits to simulated answers; arrays of n_samples, each sorted by the caller.
 * NaN in all but deviance where a sample carries no threshold. */
typedef struct ef__samples {
  size_t n, n_failed;
  double *threshold, *equality; /**< scaled t */
  double *jnd;                  /**< level */
  double *slope;                /**< scaled; infinite for a step */
  double *guess, *lapse;        /**< rates */
  double *deviance;
} ef__samples;
ef_status ef__samples_new(const ef__likelihood *likelihood,
                          const ef__reading *reading, const ef__minimum *fit,
                          size_t n_samples, uint64_t seed, int jobs,
                          ef__samples *out, void **block, ef_error *error);

/** Curve in the user's axis from parameters in the scaled one. */
ef_psychometric ef__curve(const ef__likelihood *likelihood, ef_axis axis,
                          const double *theta);
/** Curve and estimates with standard errors. */
void ef__fit_describe(const ef__likelihood *likelihood,
                      const ef_fit_settings *settings,
                      const ef__minimum *minimum, ef_fit *out);
/** Turns a description at the bound of the slope into that of a step. */
void ef__fit_describe_step(const ef__likelihood *likelihood,
                           const ef__verdict *verdict, ef_fit *out);

/* ---- Experiments that plans simulate (experiment.c) ---------------------- */

/** What all experiments of a row share. */
typedef struct ef__design {
  const ef_plan_settings *settings;
  ef_procedure procedure;
  size_t n_trials;
  size_t n_blanks; /**< at level 0, of n_trials */
  bool has_blanks;
  size_t n_levels; /**< blank included */
  double *level;   /**< lowest first */
  double *ratio;   /**< out: estimate over truth; NaN when failed */
  ef__data data;   /**< levels and trials of constant stimuli */
  ef__likelihood likelihood;
  ef__reading reading;
  ef__posterior posterior; /**< of adaptive runs: grid and shares */
  double *positive;        /**< scratch: n_levels for each chunk */
  double *weight;          /**< scratch: n_places for each chunk */
} ef__design;

/** Level `i` of `n` (at least 2) between the settings' lowest and highest. */
double ef__plan_level(const ef_plan_settings *settings, size_t n, size_t i);
/** The observer whose JND is `factor` times the expected one. */
ef_psychometric ef__plan_observer(const ef_plan_settings *settings,
                                  double factor);
/** Lays out an experiment of n_trials. The three blocks are for free(), also
 * after an error. Settings have been checked. */
ef_status ef__design_make(const ef_plan_settings *settings,
                          ef_procedure procedure, size_t n_trials,
                          ef__design *out, void *block[3], ef_error *error);
/** Simulates all experiments; fills `ratio`. */
void ef__design_run(ef__design *design);

#endif
