/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Psychometric curves, with the derivatives that a fit needs. */
#include "panel/panel_private.h"

#include <math.h>

#define LN_10 2.30258509299404568402
#define SQRT_2 1.4142135623730950488
#define SQRT_6 2.4494897427831780982
#define PI 3.14159265358979323846
#define INVERSE_SQRT_PI 0.56418958354775628695

static const char *const shape_names[] = {
    [EF_SHAPE_GAUSSIAN] = "gaussian",
    [EF_SHAPE_LOGISTIC] = "logistic",
    [EF_SHAPE_WEIBULL] = "weibull",
    [EF_SHAPE_DETECTION] = "detection",
};
enum { SHAPES = sizeof shape_names / sizeof shape_names[0] };

const char *ef_shape_name(ef_shape shape) {
  return (size_t)shape < SHAPES ? shape_names[shape] : "unknown";
}

ef_status ef_shape_find(const char *name, ef_shape *shape, ef_error *error) {
  for (size_t i = 0; i < SHAPES; ++i) {
    if (ef__name_equal(name, shape_names[i])) {
      *shape = (ef_shape)i;
      return EF_OK;
    }
  }
  return ef__error_unknown(error, "model", name, shape_names, SHAPES);
}

ef_axis ef_shape_axis(ef_shape shape) {
  return shape == EF_SHAPE_WEIBULL || shape == EF_SHAPE_DETECTION
             ? EF_AXIS_LOG
             : EF_AXIS_LINEAR;
}

double ef__axis_value(ef_axis axis, double level) {
  return axis == EF_AXIS_LOG ? log10(level) : level;
}

double ef__axis_level(ef_axis axis, double t) {
  return axis == EF_AXIS_LOG ? exp(LN_10 * t) : t;
}

/* ---- F and its derivatives ---------------------------------------------- */

/* F, 1 - F, F' and F'' at eta. */
typedef struct core {
  double f, rest, slope, bend;
} core;

/* Beyond these eta F or 1 - F leaves the range of doubles. */
static double clamp(double eta, double low, double high) {
  return eta < low ? low : eta > high ? high : eta;
}

static core gaussian(double eta) {
  eta = clamp(eta, -37, 37);
  const double tail = 0.5 * erfc(fabs(eta) / SQRT_2);
  const double density = ef__phi(eta);
  return (core){.f = eta < 0 ? tail : 1 - tail,
                .rest = eta < 0 ? 1 - tail : tail,
                .slope = density,
                .bend = -eta * density};
}

static core logistic(double eta) {
  eta = clamp(eta, -700, 700);
  const double small = exp(-fabs(eta));
  const double near = 1 / (1 + small), far = small / (1 + small);
  const double f = eta < 0 ? far : near;
  const double rest = eta < 0 ? near : far;
  return (core){f, rest, near * far, near * far * (rest - f)};
}

static core weibull(double eta) {
  eta = clamp(eta, -700, 6.5);
  const double power = exp(eta);
  const double rest = exp(-power);
  return (core){-expm1(-power), rest, power * rest, power * rest * (1 - power)};
}

/* d' = e^eta; F = (p - chance) / (1 - chance). */
static core detection_2ifc(double eta) {
  const double d = exp(clamp(eta, -700, 3.9)); /* erfc(25) is 1e-273 */
  const double slope = INVERSE_SQRT_PI * d * exp(-0.25 * d * d);
  return (core){erf(0.5 * d), erfc(0.5 * d), slope, slope * (1 - 0.5 * d * d)};
}

/* d p / d d' = sqrt(2/3) phi(h) erf(h sqrt(3/2)), h = d' / sqrt 6 (task.c). */
static core detection_triangle(double eta) {
  const double d = exp(clamp(eta, -350, 4.4)); /* exp(-d^2 / 12) is 1e-240 */
  const double h = d / SQRT_6;
  const double rest = ef__triangle_miss(d);
  const double bump = erf(h * sqrt(1.5));
  const double density = 1.5 * sqrt(2.0 / 3) * ef__phi(h);
  const double by_d = density * bump;
  /* d/dh erf(h sqrt(3/2)) = 2 sqrt(3) phi(h sqrt 3) */
  const double by_dd =
      density / SQRT_6 * (2 * sqrt(3.0) * ef__phi(h * sqrt(3.0)) - h * bump);
  /* Below, 1 - rest would cancel: F = d'^2 sqrt(3) / (4 pi) at small d'. */
  const double f = d < 1e-4 ? d * d * sqrt(3.0) / (4 * PI) : 1 - rest;
  return (core){f, rest, d * by_d, d * by_d + d * d * by_dd};
}

bool ef__model_has_criterion(const ef__model *model) {
  return model->shape == EF_SHAPE_DETECTION &&
         (model->task == EF_TASK_YES_NO ||
          model->task == EF_TASK_SAME_DIFFERENT);
}

static core core_at(const ef__model *model, double eta) {
  switch (model->shape) {
  case EF_SHAPE_GAUSSIAN:
    return gaussian(eta);
  case EF_SHAPE_LOGISTIC:
    return logistic(eta);
  case EF_SHAPE_WEIBULL:
    return weibull(eta);
  case EF_SHAPE_DETECTION:
    break;
  }
  return model->task == EF_TASK_TRIANGLE ? detection_triangle(eta)
                                         : detection_2ifc(eta);
}

/* ---- With a criterion --------------------------------------------------- */

/* Share of positive answers H at sensitivity d and criterion k, 1 - H, and
 * derivatives by d and k. */
typedef struct decision {
  double h, rest, d, k, dd, dk, kk;
} decision;

static decision decide_yes_no(double d, double k) {
  const double density = ef__phi(d - k);
  const double bend = -(d - k) * density;
  return (decision){ef__normal(d - k),
                    ef__normal(k - d),
                    density,
                    -density,
                    bend,
                    -bend,
                    bend};
}

static decision decide_same_different(double d, double k) {
  const double a = (d - k) / SQRT_2, b = (-d - k) / SQRT_2;
  const double phi_a = ef__phi(a), phi_b = ef__phi(b);
  const double both = -0.5 * (a * phi_a + b * phi_b);
  return (decision){.h = ef__normal(a) + ef__normal(b),
                    .rest = ef__normal(-a) - ef__normal(b),
                    .d = (phi_a - phi_b) / SQRT_2,
                    .k = -(phi_a + phi_b) / SQRT_2,
                    .dd = both,
                    .dk = 0.5 * (a * phi_a - b * phi_b),
                    .kk = both};
}

static decision decide(const ef__model *model, double d, double k) {
  return model->task == EF_TASK_YES_NO ? decide_yes_no(d, k)
                                       : decide_same_different(d, k);
}

/* d' beyond which nothing changes, for either criterion task. */
static double bounded_d_prime(double eta) {
  return exp(clamp(eta, -700, 3.9));
}

/* With g = H(0, k) and R = 1 - F = (1 - H) / (1 - g): p = H - lapse F. */
static void criterion_point(const ef__model *model, double eta, bool is_blank,
                            double k, double lapse, ef__point *out) {
  const decision g = decide(model, 0, k);
  const double d = is_blank ? 0 : bounded_d_prime(eta);
  const decision at = is_blank ? g : decide(model, d, k);
  const double r = at.rest / g.rest;
  const double h_eta = d * at.d, h_eta_eta = d * at.d + d * d * at.dd;
  const double h_eta_k = d * at.dk;
  const double r_eta = -h_eta / g.rest;
  const double r_k = (-at.k + r * g.k) / g.rest;
  const double r_eta_eta = -h_eta_eta / g.rest;
  const double r_eta_k = (-h_eta_k + r_eta * g.k) / g.rest;
  const double r_kk = (-at.kk + r * g.kk + 2 * r_k * g.k) / g.rest;
  *out = (ef__point){.p = at.h - lapse * (1 - r),
                     .q = at.rest + lapse * (1 - r),
                     .p_eta = h_eta + lapse * r_eta,
                     .p_guess = at.k + lapse * r_k,
                     .p_lapse = r - 1,
                     .p_eta_eta = h_eta_eta + lapse * r_eta_eta,
                     .p_eta_guess = h_eta_k + lapse * r_eta_k,
                     .p_guess_guess = at.kk + lapse * r_kk,
                     .p_eta_lapse = r_eta,
                     .p_guess_lapse = r_k};
}

void ef__model_point(const ef__model *model, double eta, bool is_blank,
                     double guess, double lapse, ef__point *out) {
  if (ef__model_has_criterion(model)) {
    criterion_point(model, eta, is_blank, guess, lapse, out);
    return;
  }
  const core c = is_blank ? (core){.rest = 1} : core_at(model, eta);
  const double both = model->lapses_both_ways ? 1 : 0;
  const double low = guess + both * lapse;
  const double span = 1 - low - lapse;
  *out = (ef__point){.p = low + span * c.f,
                     .q = lapse + span * c.rest,
                     .p_eta = span * c.slope,
                     .p_guess = c.rest,
                     .p_lapse = both * c.rest - c.f,
                     .p_eta_eta = span * c.bend,
                     .p_eta_guess = -c.slope,
                     .p_eta_lapse = -(1 + both) * c.slope};
}

/* F and 1 - F alone: half the work where a search only looks. */
static core share_at(const ef__model *model, double eta) {
  if (model->shape != EF_SHAPE_GAUSSIAN)
    return core_at(model, eta);
  eta = clamp(eta, -37, 37);
  const double tail = 0.5 * erfc(fabs(eta) / SQRT_2);
  return (core){.f = eta < 0 ? tail : 1 - tail,
                .rest = eta < 0 ? 1 - tail : tail};
}

void ef__model_share(const ef__model *model, double eta, bool is_blank,
                     double guess, double lapse, double *p, double *q) {
  if (ef__model_has_criterion(model)) {
    ef__point point;
    criterion_point(model, eta, is_blank, guess, lapse, &point);
    *p = point.p;
    *q = point.q;
    return;
  }
  const core c = is_blank ? (core){.rest = 1} : share_at(model, eta);
  const double low = guess + (model->lapses_both_ways ? lapse : 0);
  const double span = 1 - low - lapse;
  *p = low + span * c.f;
  *q = lapse + span * c.rest;
}

/* ---- Inverse ------------------------------------------------------------- */

double ef__model_core_eta(const ef__model *model, double f) {
  if (!(f > 0) || !(f < 1))
    return (double)NAN;
  switch (model->shape) {
  case EF_SHAPE_GAUSSIAN:
    return ef__normal_inverse(f);
  case EF_SHAPE_LOGISTIC:
    return log(f) - log1p(-f);
  case EF_SHAPE_WEIBULL:
    return log(-log1p(-f));
  case EF_SHAPE_DETECTION:
    break;
  }
  const double chance = ef_task_chance(model->task);
  return log(ef_task_d_prime(model->task, 0, chance + (1 - chance) * f));
}

double ef__model_guess(const ef__model *model, double rate) {
  if (!ef__model_has_criterion(model))
    return rate;
  return model->task == EF_TASK_YES_NO ? -ef__normal_inverse(rate)
                                       : -SQRT_2 * ef__normal_inverse(rate / 2);
}

double ef__model_guess_rate(const ef__model *model, double guess) {
  return ef__model_has_criterion(model) ? decide(model, 0, guess).h : guess;
}

double ef__model_eta(const ef__model *model, double guess, double proportion) {
  if (ef__model_has_criterion(model)) {
    const double rate = ef__model_guess_rate(model, guess);
    const double d = ef_task_d_prime(model->task, rate, proportion);
    return d > 0 ? log(d) : (double)NAN;
  }
  /* The lower end of greater-less is lapses, which thresholds leave out. */
  if (model->task == EF_TASK_GREATER_LESS)
    return ef__model_core_eta(model, proportion);
  return ef__model_core_eta(model, (proportion - guess) / (1 - guess));
}

double ef__shape_deviation(ef_shape shape) {
  switch (shape) {
  case EF_SHAPE_GAUSSIAN:
    return 1;
  case EF_SHAPE_LOGISTIC:
    return PI / sqrt(3);
  case EF_SHAPE_WEIBULL:
    return PI / SQRT_6;
  case EF_SHAPE_DETECTION:
    break;
  }
  return (double)NAN;
}

/* ---- Public -------------------------------------------------------------- */

double ef_psychometric_value(const ef_psychometric *curve, double level) {
  if (isnan(level) || (curve->axis == EF_AXIS_LOG && level < 0))
    return (double)NAN;
  ef__gsl_ready();
  const ef__model model = {curve->shape, curve->task, false};
  const bool is_blank = curve->axis == EF_AXIS_LOG && level == 0;
  const double t = is_blank ? 0 : ef__axis_value(curve->axis, level);
  double p, q;
  ef__model_share(&model, (t - curve->location) / curve->width, is_blank,
                  ef__model_guess(&model, curve->guess), curve->lapse, &p, &q);
  return p;
}

double ef_psychometric_level(const ef_psychometric *curve, double proportion) {
  ef__gsl_ready();
  const ef__model model = {curve->shape, curve->task, false};
  const double eta =
      ef__model_eta(&model, ef__model_guess(&model, curve->guess), proportion);
  return ef__axis_level(curve->axis, curve->location + curve->width * eta);
}

double ef_psychometric_slope(const ef_psychometric *curve, double level) {
  const bool is_log = curve->axis == EF_AXIS_LOG;
  if (isnan(level) || (is_log && level < 0))
    return (double)NAN;
  if (is_log && level == 0)
    return 0; /* beyond the end of the axis */
  ef__gsl_ready();
  const ef__model model = {curve->shape, curve->task, false};
  ef__point point;
  ef__model_point(
      &model,
      (ef__axis_value(curve->axis, level) - curve->location) / curve->width,
      false, ef__model_guess(&model, curve->guess), curve->lapse, &point);
  const double by_t = point.p_eta / curve->width;
  return is_log ? by_t / (LN_10 * level) : by_t;
}
