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

#ifdef __cplusplus
}
#endif

#endif
