/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tone curves: the closed forms of the standards, and measured ramps with
 * monotone interpolation; and the inverse of both. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <float.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_interp.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { ABOUT_SIZE = 96 };

struct ef_tone_curve {
  char about[ABOUT_SIZE];
  ef__parametric form; /* used when n_points is 0 */
  size_t n_points;
  void *block; /* of the two arrays */
  double *drive;
  double *level; /* from 0 to 1 */
  gsl_interp *interpolation;
};

/* ---- Closed forms ------------------------------------------------------ */

typedef struct named_form {
  const char *name;
  const char *about;
  ef__parametric form;
} named_form;

static const named_form forms[] = {
    {"linear", "linear", {1.0, 0.0, 1.0, 0.0}},
    /* IEC 61966-2-1:1999, 5.2, equations (5) and (6). */
    {"iec61966-2-1",
     "IEC 61966-2-1 (power 2.4 with a linear toe)",
     {2.4, 0.055, 1.0 / 12.92, 0.04045}},
    /* ISO 22028-2, nonlinear encoding: 16 E up to E = 16^(1.8 / -0.8) = 2^-9,
     * that is up to a drive of 2^-5. From memory. */
    {"romm",
     "ISO 22028-2 (power 1.8 with a linear toe)",
     {1.8, 0.0, 1.0 / 16.0, 0.03125}},
};
enum { N_FORMS = sizeof forms / sizeof forms[0] };

static const double least_power = 0.1;
static const double greatest_power = 10.0;

static double form_amount(const ef__parametric *form, double drive,
                          double *slope) {
  double amount, derivative;
  if (drive <= form->joint && form->joint > 0.0) {
    amount = form->slope * drive;
    derivative = form->slope;
  } else {
    const double base = (drive + form->offset) / (1.0 + form->offset);
    amount = pow(base, form->gamma);
    derivative =
        form->gamma * pow(base, form->gamma - 1.0) / (1.0 + form->offset);
  }
  if (slope != NULL)
    *slope = derivative;
  return amount;
}

static double form_drive(const ef__parametric *form, double amount) {
  if (form->joint > 0.0 && amount <= form->slope * form->joint)
    return amount / form->slope;
  const double drive =
      pow(amount, 1.0 / form->gamma) * (1.0 + form->offset) - form->offset;
  /* The rounded constants of a standard may leave a small gap at the joint. */
  return fmax(drive, form->joint);
}

/* ---- Construction ------------------------------------------------------ */

static ef_tone_curve *new_form(const ef__parametric *form, const char *about,
                               ef_error *error) {
  ef_tone_curve *curve = ef__allocate_zeroed(1, sizeof *curve);
  if (curve == NULL) {
    ef__error_memory(error, "a tone curve");
    return NULL;
  }
  curve->form = *form;
  snprintf(curve->about, sizeof curve->about, "%s", about);
  return curve;
}

static bool starts_with_power(const char *name) {
  static const char prefix[] = "power:";
  char head[sizeof prefix];
  snprintf(head, sizeof head, "%s", name);
  return ef__name_equal(head, prefix);
}

static ef_tone_curve *new_power(const char *name, ef_error *error) {
  const char *text = strchr(name, ':') + 1;
  double gamma = 0.0;
  if (!ef_number_parse(text, strlen(text), '.', &gamma) ||
      !(gamma >= least_power && gamma <= greatest_power)) {
    ef__error_set(error, EF_INVALID,
                  "tone curve '%s': the power must be a number from 0.1 to 10, "
                  "as in power:2.2",
                  name);
    return NULL;
  }
  char number[EF_NUMBER_TEXT];
  char about[ABOUT_SIZE];
  ef_number_format(gamma, number);
  snprintf(about, sizeof about, "power %s", number);
  const ef__parametric form = {gamma, 0.0, 1.0, 0.0};
  return new_form(&form, about, error);
}

ef_tone_curve *ef_tone_curve_new(const char *name, ef_error *error) {
  if (name == NULL) {
    ef__error_set(error, EF_INVALID, "a tone curve needs a name");
    return NULL;
  }
  for (size_t i = 0; i < N_FORMS; i++)
    if (ef__name_equal(name, forms[i].name))
      return new_form(&forms[i].form, forms[i].about, error);
  if (starts_with_power(name))
    return new_power(name, error);
  const char *known[N_FORMS + 1];
  for (size_t i = 0; i < N_FORMS; i++)
    known[i] = forms[i].name;
  known[N_FORMS] = "power:2.2";
  ef__error_unknown(error, "tone curve", name, known, N_FORMS + 1);
  return NULL;
}

/* Finds the first point that breaks the contract of a ramp. */
static ef_status check_ramp(size_t n, const double *drive, const double *level,
                            ef_error *error) {
  if (n < 2 || drive == NULL || level == NULL)
    return ef__error_set(error, EF_INVALID,
                         "a tone ramp needs at least 2 points, found %zu", n);
  for (size_t i = 0; i < n; i++) {
    if (!isfinite(drive[i]) || !isfinite(level[i]))
      return ef__error_set(error, EF_INVALID,
                           "point %zu of the tone ramp is not finite", i + 1);
    if (i > 0 && !(drive[i] > drive[i - 1]))
      return ef__error_set(error, EF_INVALID,
                           "point %zu of the tone ramp: drive %g does not rise "
                           "above %g before it",
                           i + 1, drive[i], drive[i - 1]);
    if (i > 0 && !(level[i] > level[i - 1]))
      return ef__error_set(error, EF_INVALID,
                           "point %zu of the tone ramp: level %g does not rise "
                           "above %g before it",
                           i + 1, level[i], level[i - 1]);
  }
  if (drive[0] != 0.0 || drive[n - 1] != 1.0)
    return ef__error_set(error, EF_INVALID,
                         "point %zu of the tone ramp: drive %g, expected %d "
                         "(a ramp runs from 0 to 1)",
                         drive[0] != 0.0 ? (size_t)1 : n,
                         drive[0] != 0.0 ? drive[0] : drive[n - 1],
                         drive[0] != 0.0 ? 0 : 1);
  return EF_OK;
}

/* Copies the points, levels scaled to run from 0 to 1. */
static bool copy_points(ef_tone_curve *curve, size_t n, const double *drive,
                        const double *level) {
  const ef__part parts[] = {{&curve->drive, n, sizeof(double)},
                            {&curve->level, n, sizeof(double)}};
  curve->block = ef__allocate_block(2, parts);
  if (curve->block == NULL)
    return false;
  const double range = level[n - 1] - level[0];
  for (size_t i = 0; i < n; i++) {
    curve->drive[i] = drive[i];
    curve->level[i] = (level[i] - level[0]) / range;
  }
  curve->n_points = n;
  return true;
}

ef_tone_curve *ef_tone_curve_from_ramp(size_t n, const double *drive,
                                       const double *level, ef_error *error) {
  if (check_ramp(n, drive, level, error) != EF_OK)
    return NULL;
  char about[ABOUT_SIZE];
  snprintf(about, sizeof about, "measured ramp of %zu points", n);
  ef_tone_curve *curve = new_form(&forms[0].form, about, error);
  if (curve == NULL)
    return NULL;
  if (!copy_points(curve, n, drive, level)) {
    ef__error_memory(error, "a tone ramp");
    ef_tone_curve_free(curve);
    return NULL;
  }
  for (size_t i = 1; i < n; i++) {
    if (!(curve->level[i] > curve->level[i - 1])) {
      ef__error_set(error, EF_INVALID,
                    "point %zu of the tone ramp: level %g rises by less than "
                    "the arithmetic can tell from nothing",
                    i + 1, level[i]);
      ef_tone_curve_free(curve);
      return NULL;
    }
  }
  if (n == 2)
    return curve; /* a straight line; the spline needs three points */
  ef__gsl_ready();
  curve->interpolation = gsl_interp_alloc(gsl_interp_steffen, n);
  if (curve->interpolation == NULL) {
    ef__error_memory(error, "a tone ramp");
    ef_tone_curve_free(curve);
    return NULL;
  }
  const int code =
      gsl_interp_init(curve->interpolation, curve->drive, curve->level, n);
  if (ef__gsl_status(code, "interpolating a tone ramp", error) != EF_OK) {
    ef_tone_curve_free(curve);
    return NULL;
  }
  return curve;
}

void ef__tone_curve_describe(ef_tone_curve *curve, const char *about) {
  snprintf(curve->about, sizeof curve->about, "%s", about);
}

ef_tone_curve *ef_tone_curve_copy(const ef_tone_curve *curve, ef_error *error) {
  if (curve->n_points > 0) {
    ef_tone_curve *copy = ef_tone_curve_from_ramp(curve->n_points, curve->drive,
                                                  curve->level, error);
    if (copy != NULL)
      ef__tone_curve_describe(copy, curve->about);
    return copy;
  }
  return new_form(&curve->form, curve->about, error);
}

void ef_tone_curve_free(ef_tone_curve *curve) {
  if (curve == NULL)
    return;
  if (curve->interpolation != NULL)
    gsl_interp_free(curve->interpolation);
  free(curve->block);
  free(curve);
}

const char *ef_tone_curve_about(const ef_tone_curve *curve) {
  return curve->about;
}

bool ef__tone_curve_parametric(const ef_tone_curve *curve,
                               ef__parametric *out) {
  if (curve->n_points > 0)
    return false;
  *out = curve->form;
  return true;
}

/* ---- Evaluation -------------------------------------------------------- */

static double ramp_amount(const ef_tone_curve *curve, double drive,
                          double *slope) {
  if (curve->interpolation == NULL) {
    if (slope != NULL)
      *slope = 1.0;
    return drive;
  }
  /* `drive` lies in the range of the points and the accelerator is left out,
   * so that threads may share a curve; neither call can then fail. */
  if (slope != NULL)
    *slope = gsl_interp_eval_deriv(curve->interpolation, curve->drive,
                                   curve->level, drive, NULL);
  if (drive == 1.0)
    return 1.0; /* the last cubic gets there but for rounding */
  return fmin(gsl_interp_eval(curve->interpolation, curve->drive, curve->level,
                              drive, NULL),
              1.0);
}

/* Newton's steps on the interval of the ramp that holds the amount, halved
 * where they leave it: the piece is monotone, so the root stays enclosed. */
static double ramp_drive(const ef_tone_curve *curve, double amount) {
  const size_t i =
      gsl_interp_bsearch(curve->level, amount, 0, curve->n_points - 1);
  double low = curve->drive[i], high = curve->drive[i + 1];
  const double share =
      (amount - curve->level[i]) / (curve->level[i + 1] - curve->level[i]);
  double drive = low + share * (high - low);
  /* Halving alone reaches one unit in the last place in 53 steps. */
  for (int step = 0; step < 2 * DBL_MANT_DIG; step++) {
    double slope;
    const double error = ramp_amount(curve, drive, &slope) - amount;
    if (error == 0.0)
      return drive;
    if (error > 0.0)
      high = drive;
    else
      low = drive;
    double next = drive - error / slope;
    if (!(next > low && next < high))
      next = low + 0.5 * (high - low);
    if (next == drive || fabs(next - drive) <= DBL_EPSILON * drive)
      return next;
    drive = next;
  }
  return drive;
}

static double clamp_unit(double value) {
  return value < 0.0 ? 0.0 : value > 1.0 ? 1.0 : value;
}

double ef_tone_curve_amount(const ef_tone_curve *curve, double drive,
                            double *slope) {
  if (isnan(drive)) {
    if (slope != NULL)
      *slope = drive;
    return drive;
  }
  const double clamped = clamp_unit(drive);
  return curve->n_points > 0 ? ramp_amount(curve, clamped, slope)
                             : form_amount(&curve->form, clamped, slope);
}

double ef_tone_curve_drive(const ef_tone_curve *curve, double amount) {
  if (isnan(amount))
    return amount;
  const double clamped = clamp_unit(amount);
  if (clamped == 1.0)
    return 1.0;
  return curve->n_points > 0 ? ramp_drive(curve, clamped)
                             : form_drive(&curve->form, clamped);
}
