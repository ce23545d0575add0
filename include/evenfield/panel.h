/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Visual panels: what people answered, turned into thresholds and
 * just-noticeable differences with their intervals; how many trials a question
 * takes; which pair to show next; the panel's own JND in a difference formula.
 * Tasks and what d' means in each are those of evenfield/difference.h.
 *
 * Answers come in as plain arrays: at each level, how many were shown and how
 * many answers were positive ("yes", "different", right, "greater"). Nothing
 * here reads files or prints. Every random procedure takes a seed, and draws
 * for item i from stream i of the seed: results do not depend on `jobs`. */
#ifndef EVENFIELD_PANEL_H
#define EVENFIELD_PANEL_H

#include <evenfield/base.h>
#include <evenfield/difference.h>

#ifdef __cplusplus
extern "C" {
#endif

/* ---- Answers ----------------------------------------------------------- */

/** Answers level by level. Rows may stand in any order; rows of equal level
 * count as one. Errors name the row, counted from 1, as `line` and the array as
 * `field`: "level", "n" (shown) or "k" (positive). */
typedef struct ef_responses {
  size_t n_rows;
  const double *level;
  const size_t *shown;
  const size_t *positive;
} ef_responses;

/** Counts single trials by level, lowest level first; the three outputs have
 * room for n_trials each. Returns the number of levels. Levels must be numbers
 * (NaN is not). */
EF_API size_t ef_responses_collect(size_t n_trials, const double *level,
                                   const bool *is_positive, double *out_level,
                                   size_t *out_shown, size_t *out_positive);

/* ---- Sensitivity and bias ---------------------------------------------- */

/** Sensitivity apart from the criterion, from counts with and without signal.
 * Rates are log-linear corrected, (k + 1/2) / (n + 1) (Hautus 1995), so that
 * none is 0 or 1. Standard errors by the delta method (Gourevitch & Galanter
 * 1967), 95 % intervals from them. */
typedef struct ef_sensitivity {
  double hit_rate, false_alarm_rate;
  ef_estimate d_prime;
  ef_estimate
      criterion; /**< yes-no: c = -(z(H) + z(F)) / 2, above 0: inclined
                      to "no"; same-different: k of the differencing
                      model, in standard deviations of one observation */
} ef_sensitivity;

/** Yes-no: `shown` trials with signal, `blanks` without; EF_MALFORMED when more
 * are positive than shown; EF_NO_ANSWER without trials of one kind. */
EF_API ef_status ef_sensitivity_yes_no(size_t shown, size_t yes, size_t blanks,
                                       size_t blank_yes, ef_sensitivity *out,
                                       ef_error *error);
/** Same-different, differencing model: different pairs and same pairs. Where
 * hits do not exceed false alarms d' is 0 and its standard error NaN. */
EF_API ef_status ef_sensitivity_same_different(size_t pairs, size_t different,
                                               size_t same_pairs,
                                               size_t same_different,
                                               ef_sensitivity *out,
                                               ef_error *error);

/** Leaning to one of two places (left or right, first or second) whatever is
 * shown there. */
typedef struct ef_place_bias {
  double share;        /**< of answers that named the first place */
  double expected;     /**< share of trials with the signal there */
  ef_estimate bias;    /**< in standard deviations: above 0 leans to the first;
                            0: none */
  ef_estimate d_prime; /**< of 2IFC with the bias taken out */
  double p_value;      /**< of no bias, two-sided */
} ef_place_bias;

/** Trials with the signal in the first place and in the second, and how many of
 * each were answered right. One row a level; rows are combined by weight, so
 * that levels of different difficulty may be pooled; `d_prime` is that of the
 * combined rows. EF_NO_ANSWER when no row has trials of both kinds. */
EF_API ef_status ef_place_bias_measure(size_t n_rows, const size_t *first,
                                       const size_t *first_right,
                                       const size_t *second,
                                       const size_t *second_right,
                                       ef_place_bias *out, ef_error *error);

/** Settings of an observer who matches by hand (method of adjustment). */
typedef struct ef_adjustment {
  size_t n;
  ef_estimate equality; /**< mean setting: point of subjective equality */
  ef_estimate error;    /**< constant error: mean minus standard */
  ef_estimate spread; /**< standard deviation of a setting, chi-square limits */
  double jnd;         /**< 0.6745 spread, the probable error: half the settings
                           lie within it (common practice, no source) */
} ef_adjustment;

/** EF_NO_ANSWER below two settings or when all are equal (the spread). */
EF_API ef_status ef_adjustment_summary(size_t n, const double *setting,
                                       double standard, ef_adjustment *out,
                                       ef_error *error);

/* ---- Psychometric curves ----------------------------------------------- */

typedef enum ef_shape {
  EF_SHAPE_GAUSSIAN, /**< cumulative normal: width is its standard deviation */
  EF_SHAPE_LOGISTIC, /**< 1 / (1 + exp(-(t - location) / width)) */
  EF_SHAPE_WEIBULL,  /**< 1 - exp(-exp((t - location) / width)): with t = log10
                          level the Weibull function of the level, exponent
                          1 / (width ln 10); on a linear axis the same function
                          of levels that are logarithms already */
  EF_SHAPE_DETECTION /**< ln d' = (t - location) / width with t = log10 level:
                          d' is 1 at the location and grows with the power
                          1 / (width ln 10) of the level; the task turns d' into
                          answers. Logarithmic axis only; not greater-less */
} ef_shape;

/** "gaussian", "logistic", "weibull", "detection". Static. */
EF_API const char *ef_shape_name(ef_shape shape);
EF_API ef_status ef_shape_find(const char *name, ef_shape *shape,
                               ef_error *error);

/** What t of a curve is. */
typedef enum ef_axis {
  EF_AXIS_LINEAR, /**< the level */
  EF_AXIS_LOG     /**< log10 of the level; a level of 0 is a blank, to which the
                       answer is positive at the guess rate */
} ef_axis;

/** Share of positive answers = guess + (1 - guess - lapse) F(t). */
typedef struct ef_psychometric {
  ef_shape shape;
  ef_axis axis;
  ef_task task;    /**< matters to EF_SHAPE_DETECTION */
  double location; /**< in t: log10 of a level on a logarithmic axis */
  double width;    /**< in t, above 0 */
  double guess;    /**< lower asymptote */
  double lapse; /**< 1 - upper asymptote: share of misses where nothing is left
                     to miss, by answers given without looking */
} ef_psychometric;

/** Expected share of positive answers at a level; NaN for a negative level on a
 * logarithmic axis. */
EF_API double ef_psychometric_value(const ef_psychometric *curve, double level);
/** Level at which an observer without lapses would give this share of positive
 * answers, guess + (1 - guess) F, or F in greater-less: lapses are no matter of
 * perception, so thresholds leave them out. NaN unless F lies between 0 and 1.
 */
EF_API double ef_psychometric_level(const ef_psychometric *curve,
                                    double proportion);
/** d share / d level. */
EF_API double ef_psychometric_slope(const ef_psychometric *curve, double level);

/* ---- Fit --------------------------------------------------------------- */

typedef struct ef_fit_settings {
  ef_task task;
  ef_shape shape;
  ef_axis axis;
  double guess;     /**< NaN: 1/2 or 1/3 by the task; greater-less: the lapse
                         rate, as an answer without looking may be either;
                         yes-no and same-different: estimated when a blank (level
                         0 on a logarithmic axis) was shown, else 0 */
  double lapse;     /**< NaN: estimated between 0 and lapse_max */
  double lapse_max; /**< below 1 - guess */
  double width;     /**< NaN: estimated */
  double criterion; /**< where the threshold is taken; NaN: 0.75 in 2IFC, 2/3 in
                         triangle: proportion right, lapses left out; else 1/2:
                         share of F, lapses and guesses left out.
                         EF_SHAPE_DETECTION with yes-no and same-different:
                         d' = 1 always */
  const ef_notes *notes;
} ef_fit_settings;

/** Gaussian on a linear axis (greater-less, yes-no, same-different, 2ifc,
 * triangle alike); lapse estimated up to 0.06 (Wichmann & Hill 2001); the rest
 * NaN, no notes. */
EF_API ef_fit_settings ef_fit_settings_default(ef_task task);
/** The axis a shape is made for: logarithmic for Weibull and detection. */
EF_API ef_axis ef_shape_axis(ef_shape shape);

/** What the answers can carry. */
typedef enum ef_support {
  EF_SUPPORT_FULL,
  EF_SUPPORT_FEW_LEVELS,    /**< fewer levels than parameters */
  EF_SUPPORT_ALL_POSITIVE,  /**< every answer: threshold below the levels */
  EF_SUPPORT_NONE_POSITIVE, /**< no answer: threshold above the levels */
  EF_SUPPORT_FLAT,          /**< one share for all levels does as well (within
                                 95 %): every threshold is possible */
  EF_SUPPORT_FALLING,       /**< fewer positive answers at higher levels */
  EF_SUPPORT_STEP,          /**< separation: an answer, but without a slope. The
                                 likelihood grows with the slope for ever: answers
                                 change all at once between `bracket_low` and
                                 `bracket_high` (or at one level). The threshold is
                                 halfway, sigma 0, standard errors NaN; intervals
                                 hold */
  EF_SUPPORT_STALLED        /**< the search for the maximum did not end */
} ef_support;

/** A fitted curve. Thresholds and widths are in units of the level; on a
 * logarithmic axis `sigma` is in log10 units. `low` and `high` of the estimates
 * stay NaN until ef_fit_intervals fills them. */
typedef struct ef_fit {
  ef_psychometric curve;
  ef_support support;
  double bracket_low, bracket_high; /**< EF_SUPPORT_STEP: the threshold lies
                                         between (or at) these levels */
  double intercept, slope;          /**< F^-1 = intercept + slope t */
  double se_intercept, se_slope;
  /** Of intercept, slope, guess (criterion k of yes-no and same-different with
   * EF_SHAPE_DETECTION), lapse, row-major, from the expected information; zero
   * for what is fixed or lies at its limit. */
  double covariance[16];
  double criterion;      /**< of the settings or task; NaN when at d' = 1 */
  ef_estimate threshold; /**< level at the criterion */
  ef_estimate equality;  /**< greater-less: level answered "greater" half the
                              time (PSE); else NaN */
  ef_estimate jnd;       /**< level at d' = EF_JND_D_PRIME: 75 % right in
                              2IFC; greater-less: half of the level at 75 %
                              minus the level at 25 %; NaN for yes-no and
                              same-different when no blank was shown */
  ef_estimate sigma;     /**< standard deviation of F in t; NaN for
                              EF_SHAPE_DETECTION */
  ef_estimate exponent;  /**< EF_SHAPE_DETECTION: power of the level, else NaN
                          */
  ef_estimate guess,
      lapse; /**< standard error NaN when fixed or at its limit */
  bool guess_estimated, lapse_estimated;
  bool lapse_at_limit; /**< at lapse_max: fit may want more lapses */
  bool extrapolated;   /**< threshold outside the levels shown */
  size_t n_levels, n_trials, n_parameters;
  double log_likelihood;    /**< with the binomial coefficients */
  double deviance, pearson; /**< against a free share at each level */
  size_t degrees;           /**< of freedom: levels minus parameters */
  int iterations;
} ef_fit;

/** Maximum likelihood: Newton with the exact gradient and curvature from
 * several starts, parameters within their limits. EF_MALFORMED for answers that
 * cannot be; EF_NO_ANSWER, with `out->support` set and the numbers as far as
 * they go, when they carry no threshold: the message says what is missing. What
 * the user should know beside an answer goes to the notes. */
EF_API ef_status ef_fit_responses(const ef_responses *responses,
                                  const ef_fit_settings *settings, ef_fit *out,
                                  ef_error *error);

/** Share of `positive` of `shown` answers and its 95 % score interval (Wilson,
 * J. Am. Stat. Assoc. 22 (1927) 209-212), which never leaves 0 to 1; its
 * standard error is that of the share. NaN for none shown or more positive than
 * shown. */
EF_API ef_estimate ef_share_estimate(size_t shown, size_t positive);

/* ---- Intervals and goodness of fit ------------------------------------- */

typedef enum ef_interval_method {
  EF_INTERVAL_PROFILE,  /**< profile likelihood */
  EF_INTERVAL_BOOTSTRAP /**< bias-corrected percentiles of fits to simulated
                             answers; plain ones when lapses are fitted */
} ef_interval_method;

typedef struct ef_interval_settings {
  ef_interval_method method;
  double level; /**< 0.95 */
  size_t
      n_samples; /**< simulated experiments, for the bootstrap and the p-value
                      of the deviance; 0: no simulation, p by chi-square */
  uint64_t seed;
  bool widen; /**< widen intervals where answers vary more than chance */
  int jobs;   /**< threads, 0: all cores */
} ef_interval_settings;
/** Profile likelihood, 95 %, 2000 samples, seed 1, widened, all cores. */
EF_API ef_interval_settings ef_interval_settings_default(void);

typedef struct ef_goodness {
  double p_value; /**< of a deviance as large as this if the curve holds:
                       (1 + number of simulated ones at least as large) /
                       (n_samples + 1); NaN without degrees of freedom */
  double
      dispersion; /**< Pearson's chi-square over its degrees of freedom: 1 for
                       answers that vary by chance alone; NaN without any */
  bool is_overdispersed; /**< p below 0.05 and dispersion above 1 */
  double widened_by;     /**< factor on the distance to the limits, 1 for none:
                              sqrt(dispersion) t / z */
  size_t n_samples, n_failed; /**< simulated experiments; without a threshold */
} ef_goodness;

/** Fills `low` and `high` of the estimates of `fit`, which is that of the same
 * responses and settings. A profile has no limits for the JND of yes-no and
 * same-different but with EF_SHAPE_DETECTION (NaN); the bootstrap has. Samples
 * without a threshold count half as below and half as above every level. */
EF_API ef_status ef_fit_intervals(const ef_responses *responses,
                                  const ef_fit_settings *settings,
                                  const ef_interval_settings *intervals,
                                  ef_fit *fit, ef_goodness *out,
                                  ef_error *error);

/* ---- Groups ------------------------------------------------------------ */

typedef enum ef_group_method {
  EF_GROUP_RESTRICTED, /**< restricted maximum likelihood (REML) */
  EF_GROUP_LIKELIHOOD  /**< maximum likelihood: the spread comes out too small
                            for few observers */
} ef_group_method;

/** Several observers. Thresholds of people are taken as log-normal: ln
 * threshold of one is normal about the group's with standard deviation
 * `spread`, and known to its own standard error. */
typedef struct ef_group {
  size_t n, n_left_out;  /**< observers in the summary, and without a finite
                              threshold above 0 and standard error */
  ef_estimate mean;      /**< geometric mean; interval by Student's t (Hartung &
                              Knapp 2001) */
  double mean_ln, se_ln; /**< its logarithm and that one's standard error for a
                              known spread */
  ef_estimate spread; /**< of ln threshold across people; profile interval, se
                           NaN */
  double next_low, next_high; /**< where the next observer is expected */
  double q, q_p_value; /**< Cochran's Q of no spread at all, chi-square with n -
                            1 degrees of freedom */
} ef_group;

/** n thresholds and their standard errors. EF_NO_ANSWER for fewer than two that
 * can be used. */
EF_API ef_status ef_group_summary(size_t n, const double *threshold,
                                  const double *se, ef_group_method method,
                                  double level, const ef_notes *notes,
                                  ef_group *out, ef_error *error);

/* ---- What to show next ------------------------------------------------- */

/** What the next answer should tell most about. */
typedef enum ef_next_aim {
  EF_NEXT_THRESHOLD, /**< the threshold alone, the width and lapses left open */
  EF_NEXT_BOTH       /**< threshold and width together */
} ef_next_aim;

/** The answers so far and a prior become a posterior over a grid of threshold,
 * width and lapse rate: flat in t, in the logarithm of the width, and in the
 * lapse rate. NaN limits are set from the levels: the threshold from half their
 * range (ten times, for a single one) below the lowest to as much above the
 * highest, the width from 1/30 of the range to the whole. The grid closes in on
 * a posterior that fills less than half of it. */
typedef struct ef_next_settings {
  ef_task task;
  ef_shape shape;
  ef_axis axis;
  double guess; /**< NaN: by the task; for yes-no and same-different from the
                     blanks among the answers, (k + 1/2) / (n + 1), else 0.02
                     */
  double criterion;                     /**< as in ef_fit_settings */
  double threshold_low, threshold_high; /**< levels */
  double width_low, width_high;         /**< in t */
  double lapse_max;
  size_t n_thresholds, n_widths, n_lapses; /**< of the grid, each at least 1 */
  ef_next_aim aim;
  double level;     /**< of the intervals */
  double precision; /**< done when half the threshold's interval is at most this
                         times the JND (the threshold where there is no JND); 0:
                         never */
  size_t most_trials; /**< done after these; 0: no end */
  const ef_notes *notes;
} ef_next_settings;
/** Gaussian on a linear axis, Weibull on a logarithmic one for 2ifc and
 * triangle; 81 x 21 x 4 places; lapses up to 0.06; the threshold; 95 %,
 * precision 0.1. */
EF_API ef_next_settings ef_next_settings_default(ef_task task);

typedef struct ef_next {
  size_t choice;         /**< of the levels in hand: shows most */
  double gain_bits;      /**< expected loss of entropy by an answer there */
  ef_estimate threshold; /**< mean, standard deviation, interval */
  ef_estimate jnd;       /**< NaN for yes-no and same-different but with
                              EF_SHAPE_DETECTION */
  ef_estimate width;     /**< in t */
  double lapse;          /**< mean */
  double entropy_bits; /**< of what is aimed at, in places of the first grid */
  double edge_share;   /**< of the posterior on the grid's outermost thresholds;
                            above 0.05 is noted: levels or limits are wrong */
  size_t n_trials;
  bool is_precise, is_done;
} ef_next;

/** Which of `n_levels` levels in hand to show next, from all answers so far
 * (none: n_rows 0) and nothing else: the same answers give the same choice.
 * `gain` (n_levels, may be NULL) receives the expected loss of entropy at each
 * in bits; of equal ones the first is chosen. */
EF_API ef_status ef_next_choose(const ef_responses *answers, size_t n_levels,
                                const double *level,
                                const ef_next_settings *settings, ef_next *out,
                                double *gain, ef_error *error);

/** What ef_next_choose knows of the threshold, to be drawn: `threshold`, as many
 * as the settings' n_thresholds, rising and equally spread in t, and how likely
 * each is: `density` per unit of the level, which times the cells of half a step
 * to either side in t adds up to 1. NaN for a single threshold. Notes are left
 * to ef_next_choose. */
EF_API ef_status ef_next_posterior(const ef_responses *answers, size_t n_levels,
                                   const double *level,
                                   const ef_next_settings *settings,
                                   double *threshold, double *density,
                                   ef_error *error);

/* ---- Plan -------------------------------------------------------------- */

/** An up-down rule (Levitt, J. Acoust. Soc. Am. 49 (1971) 467): the level falls
 * by `step_down` after `n_down` right answers in a row and rises by `step_up`
 * after `n_up` wrong ones in a row; a change starts both counts anew. */
typedef struct ef_up_down {
  unsigned n_down, n_up;
  double step_down, step_up; /**< factors of the level, above 1 */
  double step_first; /**< either way until `n_turns_left_out` turns are over */
  size_t n_turns_left_out; /**< of the estimate */
} ef_up_down;
/** 2 down, 1 up, by factors of 1.25, at first 1.6; 2 turns left out. */
EF_API ef_up_down ef_up_down_default(void);

/** Share of right answers at which the rule comes to rest: 0.5^(1 / n_down) for
 * n_up 1 and equal steps (70.7 % for 2, 79.4 % for 3, 84.1 % for 4). NaN for a
 * rule that is none. */
EF_API double ef_up_down_target(const ef_up_down *rule);

/** A way to find a threshold. */
typedef enum ef_procedure {
  EF_PROCEDURE_CONSTANT, /**< the same levels for all, maximum-likelihood fit */
  EF_PROCEDURE_UP_DOWN,  /**< one run, mean of the levels at its turns; 2ifc and
                              triangle only */
  EF_PROCEDURE_ADAPTIVE  /**< each level chosen by the least expected entropy,
                              posterior mean */
} ef_procedure;
EF_API const char *ef_procedure_name(ef_procedure procedure);

/** A panel to be planned, and the people it will meet. */
typedef struct ef_plan_settings {
  ef_task task;
  ef_shape shape; /**< of the observers and of the fit */
  ef_axis axis;
  double jnd;          /**< expected */
  double equality;     /**< greater-less: expected point of equality */
  double exponent;     /**< of d' (detection, Weibull) */
  double lapse;        /**< of the observers; a fit allows up to 0.06, an
                            adaptive choice up to twice the rate */
  double false_alarms; /**< of yes-no and same-different */
  double uncertainty;  /**< standard deviation of ln JND before the experiment:
                            where the levels are set in relation to the truth */
  double spread;       /**< standard deviation of ln JND across people */
  size_t n_levels;     /**< of constant stimuli */
  size_t n_in_hand;    /**< levels to choose from adaptively, equally spread */
  double lowest, highest; /**< level, in expected JND: of the difference;
                               greater-less: from the point of equality */
  ef_up_down rule;        /**< begins at the highest level */
  double other_jnd;     /**< power: JND to be told from the expected one; NaN */
  size_t n_experiments; /**< simulated for each row */
  uint64_t seed;
  int jobs;
} ef_plan_settings;
/** Detection on a logarithmic axis (greater-less: Gaussian on a linear one),
 * exponent 1, lapses 1 %, false alarms 0.1, uncertainty 0.3, spread 0.3, 7
 * levels, 15 in hand; levels from 0.4 to 3 JND (2ifc, yes-no), 0.7 to 5
 * (triangle, same-different), -2.5 to 2.5 (greater-less), where the answers
 * change; the default up-down rule, 1000 experiments, seed 1. */
EF_API ef_plan_settings ef_plan_settings_default(ef_task task, double jnd);

/** What experiments of one size by one procedure come to. Ratios are estimate
 * over truth: of the JND; for an up-down run of the level at its target. */
typedef struct ef_plan_row {
  ef_procedure procedure;
  size_t n_trials;                /**< of one observer, blanks included */
  size_t n_experiments, n_failed; /**< without a threshold */
  double median;                  /**< ratio */
  double low, high;  /**< ratios that hold the middle 95 %; failures half at
                          either end */
  double half_width; /**< (high - low) / 2: the precision */
  double sd_ln;      /**< of the ln ratio, from its middle 68 % */
  double power;      /**< share of experiments whose estimate lies outside the
                          middle 95 % of what the other JND would give; NaN
                          without one */
} ef_plan_row;

/** Simulates experiments of `n_trials` by one procedure. In yes-no and
 * same-different a quarter of them are blanks, and adaptive runs take the false
 * alarms as known. */
EF_API ef_status ef_plan_simulate(const ef_plan_settings *settings,
                                  ef_procedure procedure, size_t n_trials,
                                  ef_plan_row *out, ef_error *error);
/** The fewest trials of one observer whose half_width is at most `precision`,
 * to about one part in ten. EF_NO_ANSWER above `most_trials`; `out` is then the
 * row at that number. */
EF_API ef_status ef_plan_search(const ef_plan_settings *settings,
                                ef_procedure procedure, double precision,
                                size_t most_trials, ef_plan_row *out,
                                ef_error *error);
/** Observers needed for a group's JND within a factor of 1 + precision at 95 %,
 * when ln JND varies by `spread` across people and each is known to `sd_ln`:
 * t(n - 1) sqrt((spread^2 + sd_ln^2) / n) <= ln(1 + precision). 0 above 100000.
 */
EF_API size_t ef_plan_observers(double spread, double sd_ln, double precision);
/** Power of such a group to tell its JND from another, `ratio` times as large
 * or small: of the two-sided t-test of ln JND at 5 % with n - 1 degrees of
 * freedom. NaN below two observers. */
EF_API double ef_plan_power(double spread, double sd_ln, size_t n_observers,
                            double ratio);
/** The `n` levels (at least 2) that a plan shows: rising, equally spread on the
 * axis between the settings' lowest and highest. */
EF_API void ef_plan_levels(const ef_plan_settings *settings, size_t n,
                           double *level);

/* ---- The panel's JND in a difference formula ---------------------------- */

typedef struct ef_calibration_settings {
  ef_task task;    /**< all but greater-less */
  double exponent; /**< of d' = ((difference / JND)^exponent) EF_JND_D_PRIME;
                        NaN: estimated from all answers together */
  double lapse;    /**< NaN: estimated up to lapse_max */
  double lapse_max;
  ef_interval_settings intervals;
  size_t least_observers; /**< for the JND to be the group's; else pooled */
  const ef_notes *notes;
} ef_calibration_settings;
/** Exponent 1, lapses up to 0.06, default intervals, 3 observers, no notes. */
EF_API ef_calibration_settings ef_calibration_settings_default(ef_task task);

/** One observer's part. */
typedef struct ef_observer_jnd {
  size_t n_trials;
  ef_support support;
  ef_estimate jnd; /**< NaN without a threshold; interval by profile */
} ef_observer_jnd;

typedef struct ef_calibration {
  ef_estimate jnd; /**< the panel's, in units of the formula, at 75 % right in
                        2IFC whatever the task: of the group, or pooled */
  bool is_pooled;  /**< pooled: its interval knows no differences of people */
  ef_fit pooled;   /**< one curve for all answers */
  ef_goodness goodness; /**< of the pooled curve */
  ef_group group;       /**< n 0 when fewer than two observers have a JND */
  size_t n_observers;   /**< with a JND of their own */
  double exponent;      /**< used for every observer */
} ef_calibration;

/** JND of a formula from all trials: `difference` of the pair shown, `observer`
 * 0 to n_observers - 1, `shown` and `positive` answers, a row each (single
 * trials: shown 1). Pairs without a difference (same pairs, blanks) have
 * difference 0; same-different and yes-no need them. Every observer is fitted
 * with the exponent and lapse rate of the pooled curve; the group is their
 * random-effects summary. `each` has room for n_observers. */
EF_API ef_status ef_calibrate(size_t n_rows, const double *difference,
                              const size_t *observer, const size_t *shown,
                              const size_t *positive, size_t n_observers,
                              const ef_calibration_settings *settings,
                              ef_calibration *out, ef_observer_jnd *each,
                              ef_error *error);

/** As a record that predictions start from (evenfield/difference.h): criterion
 * 75 % right in 2IFC, median over observers, spread over them (pooled: 0, one
 * observer). `metric` and `source` are cut to the record's room. */
EF_API void ef_calibration_record(const ef_calibration *calibration,
                                  const char *metric, const char *source,
                                  ef_jnd_record *out);

/** Standardised residual sum of squares between computed and seen differences
 * in percent, 0 when they are proportional (Garcia, Huertas, Melgosa & Cui, J.
 * Opt. Soc. Am. A 24 (2007) 1823): 100 sqrt(sum (E - f V)^2 / sum (f V)^2) with
 * f = sum E^2 / sum E V. EF_NO_ANSWER for fewer than two pairs, or when either
 * side is all 0. */
EF_API ef_status ef_stress(size_t n, const double *computed, const double *seen,
                           double *stress, ef_error *error);
/** F-test of two formulas on the same n pairs: F = (a / b)^2 with n - 1 degrees
 * of freedom on either side; two-sided p-value. F above 1: `a` is the worse. */
EF_API void ef_stress_compare(size_t n, double a, double b, double *f,
                              double *p_value);

/** How well a formula orders the panel's pairs. */
typedef struct ef_formula_score {
  double stress;         /**< against the d' of each pair, in percent */
  double f, p_value;     /**< against the best; of the best 1 and 1 */
  double log_likelihood; /**< of all answers under its own JND; NaN without */
  double jnd, exponent;  /**< maximum likelihood; NaN without a threshold */
} ef_formula_score;

/** Scores n_formulas on n_pairs: `difference` is n_formulas x n_pairs. The seen
 * difference of a pair is the d' of its answers, rate log-linear corrected and
 * at least chance; pairs with difference 0 in every formula give the false
 * alarms of yes-no and same-different and are left out of STRESS. `best` is the
 * index of the least STRESS. */
EF_API ef_status ef_formulas_score(size_t n_pairs, size_t n_formulas,
                                   const double *difference,
                                   const size_t *shown, const size_t *positive,
                                   const ef_calibration_settings *settings,
                                   ef_formula_score *out, size_t *best,
                                   ef_error *error);

/* ---- Flicker photometry ------------------------------------------------- */

/** Personal luminance weights from settings of least flicker. */
typedef struct ef_flicker {
  size_t n;
  ef_estimate l_share; /**< l / (l + m) of luminance = l L + m M */
  ef_estimate ratio;   /**< l / m; infinite at l_share 1 */
  double residual;     /**< standard deviation of a setting, in ln luminance */
} ef_flicker;

/** At setting i the two alternating lights, with cone excitations (L, M) first
 * and second, looked equally bright: l L + m M is the same for both. Least
 * squares of ln luminance over all settings, the intervals by Student's t on
 * the share (95 %). The ratio l : m belongs to the cone fundamentals that L and
 * M were computed with. EF_MALFORMED for excitations not above 0; EF_NO_ANSWER
 * below two settings, when no ratio of l to m can be told from another, or when
 * the best one lies at an end. */
EF_API ef_status ef_flicker_weights(size_t n, const double *first_l,
                                    const double *first_m,
                                    const double *second_l,
                                    const double *second_m, ef_flicker *out,
                                    ef_error *error);

#ifdef __cplusplus
}
#endif

#endif
