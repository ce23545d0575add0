/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What reaches the retina: pupil, trolands, alpha-opic irradiance. */
#include <math.h>
#include <stdlib.h>

#include "stimulus/stimulus_private.h"

#define PI 3.14159265358979323846

static const char *const names[] = {"given", "moon-spencer", "stanley-davies",
                                    "watson-yellott"};
enum { N_FORMULAS = sizeof names / sizeof names[0] };

const char *ef_pupil_name(ef_pupil_formula formula) {
  return names[formula];
}

ef_status ef_pupil_find(const char *name, ef_pupil_formula *out,
                        ef_error *error) {
  for (size_t k = 0; k < N_FORMULAS; ++k) {
    if (!ef__name_equal(name, names[k]))
      continue;
    *out = (ef_pupil_formula)k;
    return EF_OK;
  }
  return ef__error_unknown(error, "pupil formula", name, names, N_FORMULAS);
}

const char *ef_pupil_source(ef_pupil_formula formula) {
  switch (formula) {
  case EF_PUPIL_MOON_SPENCER:
    return "Moon & Spencer, J. Opt. Soc. Am. 34 (1944) 319-329";
  case EF_PUPIL_STANLEY_DAVIES:
    return "Stanley & Davies, Ophthalmic Physiol. Opt. 15 (1995) 601-603";
  case EF_PUPIL_WATSON_YELLOTT:
    return "Watson & Yellott, J. Vision 12(10) (2012) 12";
  case EF_PUPIL_GIVEN:
    break;
  }
  return "given";
}

ef_pupil ef_pupil_default(void) {
  return (ef_pupil){.formula = EF_PUPIL_WATSON_YELLOTT,
                    .diameter_mm = 3,
                    .age_years = 32,
                    .field_deg2 = 3.14159265358979323846, /* 2 degrees across */
                    .both_eyes = true};
}

/* Corneal flux density (cd m^-2 deg^2) of 846 halves the range on the scale
 * of the 0.41th power. */
static double stanley_davies(double flux) {
  const double f = pow(flux / 846, 0.41);
  return 7.75 - 5.75 * f / (f + 2);
}

static ef_status check_pupil(const ef_pupil *pupil, double luminance_cd_m2,
                             ef_error *error) {
  if (!(luminance_cd_m2 > 0) || !isfinite(luminance_cd_m2)) {
    return ef__error_set(error, EF_INVALID,
                         "a luminance of %g cd/m2 for the pupil; expected more "
                         "than 0",
                         luminance_cd_m2);
  }
  if (pupil->formula == EF_PUPIL_GIVEN &&
      !(pupil->diameter_mm >= 1 && pupil->diameter_mm <= 10)) {
    return ef__error_set(error, EF_INVALID,
                         "a pupil of %g mm; expected 1 to 10",
                         pupil->diameter_mm);
  }
  if (pupil->formula >= EF_PUPIL_STANLEY_DAVIES &&
      !(pupil->field_deg2 > 0 && isfinite(pupil->field_deg2))) {
    return ef__error_set(error, EF_INVALID,
                         "an adapting field of %g square degrees; expected "
                         "more than 0",
                         pupil->field_deg2);
  }
  if (pupil->formula == EF_PUPIL_WATSON_YELLOTT &&
      !(pupil->age_years >= 20 && pupil->age_years <= 83)) {
    return ef__error_set(error, EF_INVALID,
                         "an age of %g years; the pupil formula takes 20 to 83",
                         pupil->age_years);
  }
  return EF_OK;
}

ef_status ef_pupil_diameter(const ef_pupil *pupil, double luminance_cd_m2,
                            double *diameter_mm, ef_error *error) {
  const ef_status status = check_pupil(pupil, luminance_cd_m2, error);
  if (status != EF_OK)
    return status;
  /* One eye that sees light acts like a tenth of it. */
  const double flux =
      luminance_cd_m2 * pupil->field_deg2 * (pupil->both_eyes ? 1 : 0.1);
  switch (pupil->formula) {
  case EF_PUPIL_MOON_SPENCER:
    *diameter_mm = 4.9 - 3 * tanh(0.4 * log10(luminance_cd_m2));
    return EF_OK;
  case EF_PUPIL_STANLEY_DAVIES:
    *diameter_mm = stanley_davies(luminance_cd_m2 * pupil->field_deg2);
    return EF_OK;
  case EF_PUPIL_WATSON_YELLOTT: {
    const double d = stanley_davies(flux);
    *diameter_mm = d + (pupil->age_years - 28.58) * (0.02132 - 0.009562 * d);
    return EF_OK;
  }
  case EF_PUPIL_GIVEN:
    break;
  }
  *diameter_mm = pupil->diameter_mm;
  return EF_OK;
}

/* ---- The light ----------------------------------------------------------- */

/* Alpha-opic radiances of a light of the stimulator. */
static ef_status take_alpha_opic(const ef_stimulator *stimulator,
                                 const double *amount, const ef_notes *notes,
                                 ef_alpha_opic *out, ef_error *error) {
  const size_t width = stimulator->grid.count;
  double channel[EF_ALPHA_OPIC_CHANNELS];
  ef_viewing viewing = ef_viewing_default(NULL);
  double *const light = ef__allocate(width, sizeof *light);
  ef_error failure = {.status = EF_OK};
  if (light == NULL)
    return ef__error_memory(error, "retinal quantities");
  for (size_t k = 0; k < width; ++k) {
    light[k] = stimulator->spectrum[k];
    for (size_t i = 0; i < stimulator->n; ++i)
      light[k] += amount[i] * stimulator->spectrum[(1 + i) * width + k];
  }
  ef_weights *const weights =
      ef_alpha_opic_weights(&stimulator->grid, &viewing, notes, &failure);
  ef_status status = failure.status;
  if (weights != NULL)
    status = ef_weights_apply(weights, 1, light, 1, channel, &failure);
  if (status == EF_OK) {
    *out = ef_alpha_opic_from(channel);
  } else if (error != NULL) {
    *error = failure;
  }
  ef_weights_free(weights);
  free(light);
  return status;
}

ef_status ef_retinal_measure(const ef_stimulator *stimulator,
                             const double *amount, const ef_pupil *pupil,
                             double field_diameter_deg, const ef_notes *notes,
                             ef_retinal *out, ef_error *error) {
  if (!ef_device_absolute(stimulator->device)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "the spectra of '%s' have no absolute unit, so what "
                         "reaches the eye is not known; measure W sr-1 m-2 "
                         "nm-1",
                         ef_device_name(stimulator->device));
  }
  if (!(field_diameter_deg > 0 && field_diameter_deg <= 180)) {
    return ef__error_set(error, EF_INVALID,
                         "a field of %g degrees; expected more than 0 and at "
                         "most 180",
                         field_diameter_deg);
  }
  ef_retinal found = {0};
  found.luminance_cd_m2 = ef_stimulator_luminance_cd_m2(stimulator, amount);
  ef_status status = ef_pupil_diameter(pupil, found.luminance_cd_m2,
                                       &found.pupil_diameter_mm, error);
  if (status == EF_OK)
    status = take_alpha_opic(stimulator, amount, notes, &found.radiance, error);
  if (status != EF_OK)
    return status;
  const double radius = found.pupil_diameter_mm / 2;
  found.pupil_area_mm2 = PI * radius * radius;
  found.photopic_td = found.luminance_cd_m2 * found.pupil_area_mm2;
  found.scotopic_td = found.radiance.scotopic * found.pupil_area_mm2;
  /* Integral of the cosine over the disc. */
  const double sine = sin(field_diameter_deg / 2 * PI / 180);
  const double projected_sr = PI * sine * sine;
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    found.irradiance_w_m2[r] = found.radiance.quantity[r] * projected_sr;
    found.equivalent_d65_lx[r] =
        found.radiance.equivalent_d65[r] * projected_sr;
  }
  *out = found;
  return EF_OK;
}
