/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Colour rendering indices of CIE 13.3-1995: how far fourteen test samples
 * move when the light takes the place of its reference, in the CIE 1964
 * W*U*V* space after a von Kries adaptation. All sums are over 5 nm. */
#include <evenfield/colour.h>

#include "base/base_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { N_SAMPLES = 14, N_GENERAL = 8 };
enum { FIRST_NM = 360, STEP_NM = 5, N_POINTS = (830 - FIRST_NM) / STEP_NM + 1 };

static const double daylight_from_k = 5000;   /* CIE 13.3-1995 */
static const double daylight_to_k = 25000;    /* end of CIE daylight */
static const double tolerance_uv = 5.4e-3;    /* CIE 13.3-1995 */
static const double scale = 4.6;              /* CIE 13.3-1995 */

/* A colour in CIE 1960 u, v with Y = 100 for the light itself. */
typedef struct uvy {
  double u, v, Y;
} uvy;

/* The light and the test samples in it. */
typedef struct lit {
  uvy light;
  uvy sample[N_SAMPLES];
} lit;

static ef_grid five_nm(void) {
  return (ef_grid){.count = N_POINTS, .start_nm = FIRST_NM, .step_nm = STEP_NM};
}

static double step_before(const ef_grid *grid, size_t i) {
  return ef_grid_wavelength(grid, i) - ef_grid_wavelength(grid, i - 1);
}

/* True when no two neighbours are further apart than the 5 nm of the method. */
static bool is_fine(const ef_grid *grid) {
  for (size_t i = 1; i < grid->count; ++i) {
    if (step_before(grid, i) > STEP_NM) return false;
  }
  return grid->count > 1;
}

/* Gathers a finely sampled light into 5 nm bands: each sample's power is
 * divided between the two points beside it in the ratio of the distances, so
 * that no line falls between the points. A 5 nm grid stays what it was. */
static void gather(const ef_grid *grid, const double *power, double *banded) {
  for (size_t j = 0; j < N_POINTS; ++j) banded[j] = 0;
  for (size_t i = 0; i < grid->count; ++i) {
    const double before = step_before(grid, i > 0 ? i : 1);
    const double after = step_before(grid, i + 1 < grid->count ? i + 1 : i);
    const double band = 0.5 * (before + after) / STEP_NM;
    const double place =
        (ef_grid_wavelength(grid, i) - FIRST_NM) / (double)STEP_NM;
    const double below = floor(place);
    const double share = place - below;
    if (below >= 0 && below < N_POINTS) {
      banded[(size_t)below] += (1 - share) * band * power[i];
    }
    if (below >= -1 && below < N_POINTS - 1) {
      banded[(size_t)(below + 1)] += share * band * power[i];
    }
  }
}

static ef_status to_five_nm(const ef_grid *grid, const double *power,
                            double *banded, ef_error *error) {
  const ef_status status = ef_grid_check(grid, error);
  if (status != EF_OK) return status;
  for (size_t i = 0; i < grid->count; ++i) {
    if (isfinite(power[i])) continue;
    return ef__error_set(error, EF_INVALID,
                         "the light's value %zu is not a finite number", i + 1);
  }
  const ef_grid simple = ef_grid_simplify(grid);
  if (is_fine(&simple)) {
    gather(&simple, power, banded);
    return EF_OK;
  }
  const ef_grid to = five_nm();
  return ef_resample(&simple, 1, power, &to, EF_INTERPOLATE_AUTO,
                     EF_EXTEND_ZERO, banded, error);
}

/* XYZ of `power` on the 5 nm points, times `factor` at each unless NULL. */
static ef_xyz tristimulus(const double *power, const double *factor) {
  const ef_table *const table = ef_table_find("cie-1931", NULL);
  const double *const x_bar = table->value + table->n_rows;
  const double *const y_bar = x_bar + table->n_rows;
  const double *const z_bar = y_bar + table->n_rows;
  ef_xyz sum = {0, 0, 0};
  for (size_t j = 0; j < N_POINTS; ++j) {
    const size_t row = j * STEP_NM; /* both begin at 360 nm */
    const double weight = factor != NULL ? power[j] * factor[j] : power[j];
    sum.X += weight * x_bar[row];
    sum.Y += weight * y_bar[row];
    sum.Z += weight * z_bar[row];
  }
  return sum;
}

static uvy to_uvy(ef_xyz xyz, double scale_y) {
  const ef_uv uv = ef_xyz_to_uv(xyz);
  return (uvy){uv.u_prime, 2 * uv.v_prime / 3, xyz.Y * scale_y};
}

static lit light_samples(const double *power) {
  const ef_table *const table = ef_table_find("cie-tcs", NULL);
  const ef_xyz light = tristimulus(power, NULL);
  const double scale_y = 100 / light.Y;
  lit out = {.light = to_uvy(light, scale_y)};
  for (size_t i = 0; i < N_SAMPLES; ++i) {
    const double *const factor = table->value + (i + 1) * table->n_rows;
    out.sample[i] = to_uvy(tristimulus(power, factor), scale_y);
  }
  return out;
}

/* The two functions of the adaptation, CIE 13.3-1995. */
static double c_of(uvy a) { return (4 - a.u - 10 * a.v) / a.v; }
static double d_of(uvy a) {
  return (1.708 * a.v + 0.404 - 1.481 * a.u) / a.v;
}

/* Sample under the test light, adapted to the reference (CIE 13.3-1995). */
static uvy adapt(uvy sample, uvy test, uvy reference) {
  const double c = c_of(reference) / c_of(test) * c_of(sample);
  const double d = d_of(reference) / d_of(test) * d_of(sample);
  const double divisor = 16.518 + 1.481 * c - d;
  return (uvy){(10.872 + 0.404 * c - 4 * d) / divisor, 5.520 / divisor,
               sample.Y};
}

/* Distance in W*U*V*, the CIE 1964 uniform space. */
static double distance(uvy a, uvy b, uvy reference) {
  const double W_a = 25 * cbrt(a.Y) - 17, W_b = 25 * cbrt(b.Y) - 17;
  const double dU =
      13 * W_a * (a.u - reference.u) - 13 * W_b * (b.u - reference.u);
  const double dV =
      13 * W_a * (a.v - reference.v) - 13 * W_b * (b.v - reference.v);
  return sqrt((W_a - W_b) * (W_a - W_b) + dU * dU + dV * dV);
}

static ef_status sample_reference(double cct_k, double *power,
                                  ef_error *error) {
  char name[16 + EF_NUMBER_TEXT];
  strcpy(name, cct_k < daylight_from_k ? "planck:" : "daylight:");
  ef_number_format(cct_k, name + strlen(name));
  ef_illuminant *const reference = ef_illuminant_new(name, error);
  if (reference == NULL) return EF_NO_MEMORY;
  const ef_grid grid = five_nm();
  const ef_status status =
      ef_illuminant_sample(reference, &grid, power, error);
  ef_illuminant_free(reference);
  return status;
}

static void compare(const lit *test, const lit *reference, ef_rendering *out) {
  out->delta_c = hypot(test->light.u - reference->light.u,
                       test->light.v - reference->light.v);
  out->tolerable = out->delta_c < tolerance_uv;
  double sum = 0;
  for (size_t i = 0; i < N_SAMPLES; ++i) {
    const uvy adapted =
        adapt(test->sample[i], test->light, reference->light);
    const double shift =
        distance(reference->sample[i], adapted, reference->light);
    out->R[i] = 100 - scale * shift;
    if (i < N_GENERAL) sum += out->R[i];
  }
  out->Ra = sum / N_GENERAL;
}

ef_status ef_rendering_index(const ef_grid *grid, const double *power,
                             ef_rendering *out, ef_error *error) {
  double test_power[N_POINTS], reference_power[N_POINTS];
  ef_status status = to_five_nm(grid, power, test_power, error);
  if (status != EF_OK) return status;
  const ef_xyy white = ef_xyz_to_xyy(tristimulus(test_power, NULL));
  if (!(white.Y > 0) || !isfinite(white.Y)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "the light is dark, so it renders no colour");
  }
  const ef_cct cct = ef_xy_to_cct((ef_xy){white.x, white.y});
  if (!cct.defined || cct.cct_k > daylight_to_k) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "the light (x %.4f, y %.4f) is too far from black "
                         "bodies and daylight between 1000 and 25000 K to have "
                         "a reference",
                         white.x, white.y);
  }
  status = sample_reference(cct.cct_k, reference_power, error);
  if (status != EF_OK) return status;
  const lit test = light_samples(test_power);
  const lit reference = light_samples(reference_power);
  out->cct_k = cct.cct_k;
  out->reference_is_daylight = cct.cct_k >= daylight_from_k;
  compare(&test, &reference, out);
  return EF_OK;
}
