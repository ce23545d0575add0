/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Cautions: flashes, saturated red, blue light. Figures against published
 * limits, never a clearance. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "stimulus/stimulus_private.h"

const char *ef_caution_deferral(void) {
  return "these figures are no clearance: before anyone looks at this "
         "stimulus, "
         "follow the local safety code, have it assessed by a licensed person, "
         "and obtain the approval of the ethics board";
}

/* ---- Flashes ------------------------------------------------------------- */

/* WCAG 2.0 to 2.2, SC 2.3.1 */
static const double least_change = 0.10, darker_below = 0.80;
static const double red_share = 0.8, red_change_uv = 0.2; /* 2.2 */
static const double most_sr = 0.006;
/* ITU-R BT.1702 */
static const double least_change_cd_m2 = 20, darker_below_cd_m2 = 160;
static const double least_michelson = 1.0 / 17;
static const double most_share = 0.25, long_s = 5;
enum { MOST_FLASHES = 3 }; /* in any second, of both */

/* Times of changes, of which the last second is looked at. */
typedef struct changes {
  double *time_s;
  size_t n, first; /* first: of the last second */
  size_t most;     /* in any second */
} changes;

static void add_change(changes *c, double time_s) {
  c->time_s[c->n++] = time_s;
  while (c->time_s[c->first] < time_s - 1)
    ++c->first;
  if (c->n - c->first > c->most)
    c->most = c->n - c->first;
}

/* Which changes of luminance count: of at least `least` where the darker one is
 * below `below`, else of at least that Michelson contrast. */
typedef struct rule {
  double scale; /* of relative luminance */
  double least, below, michelson;
} rule;

static rule general_rule(void) {
  return (rule){1, least_change, darker_below, HUGE_VAL};
}

static rule television_rule(double white_cd_m2) {
  return (rule){white_cd_m2, least_change_cd_m2, darker_below_cd_m2,
                least_michelson};
}

static bool counts(const rule *r, double dark, double light) {
  if (dark < r->below)
    return light - dark >= r->least;
  return light - dark >= r->michelson * (light + dark);
}

/* Changes between one extreme and the next; returns the most flashes, pairs of
 * opposing changes, in any second. */
static size_t count_flashes(const ef_flash_input *in, rule r, double *time_s) {
  changes c = {.time_s = time_s};
  double low = r.scale * in->xyz[1], high = low;
  int direction = 0;
  for (size_t k = 0; k < in->n; ++k) {
    const double now = r.scale * in->xyz[3 * k + 1];
    const double at_s = (double)k / in->frame_rate_hz;
    high = fmax(high, now);
    low = fmin(low, now);
    if (direction >= 0 && now < high && counts(&r, now, high)) {
      direction = -1;
    } else if (direction <= 0 && low < now && counts(&r, low, now)) {
      direction = 1;
    } else {
      continue;
    }
    add_change(&c, at_s);
    low = high = now;
  }
  return c.most / 2;
}

/* u', v' and R / (R + G + B) of linear sRGB. */
typedef struct shade {
  double u, v;
  bool is_red;
} shade;

static shade shade_of(const double *xyz, const double to_rgb[9]) {
  double rgb[3];
  const ef_uv uv = ef_xyz_to_uv((ef_xyz){xyz[0], xyz[1], xyz[2]});
  ef__mat3_apply(to_rgb, xyz, rgb);
  const double sum = rgb[0] + rgb[1] + rgb[2];
  return (shade){uv.u_prime, uv.v_prime, sum > 0 && rgb[0] >= red_share * sum};
}

static size_t count_red(const ef_flash_input *in, const double to_rgb[9],
                        double *time_s) {
  changes c = {.time_s = time_s};
  const size_t second = (size_t)ceil(in->frame_rate_hz);
  size_t last = 0; /* frame of the last change */
  for (size_t k = 1; k < in->n; ++k) {
    const shade now = shade_of(in->xyz + 3 * k, to_rgb);
    size_t j = k > last + second ? k - second : last;
    for (; j < k; ++j) {
      const shade then = shade_of(in->xyz + 3 * j, to_rgb);
      if ((now.is_red || then.is_red) &&
          hypot(now.u - then.u, now.v - then.v) > red_change_uv)
        break;
    }
    if (j == k)
      continue;
    add_change(&c, (double)k / in->frame_rate_hz);
    last = k;
  }
  return c.most / 2;
}

static ef_status check_flash(const ef_flash_input *in, ef_error *error) {
  if (in->n < 1 || !(in->frame_rate_hz > 0) || !isfinite(in->frame_rate_hz)) {
    return ef__error_set(error, EF_INVALID,
                         "%zu frames at %g Hz; expected at least 1, and a rate "
                         "above 0",
                         in->n, in->frame_rate_hz);
  }
  for (size_t k = 0; k < 3 * in->n; ++k) {
    if (!isfinite(in->xyz[k])) {
      return ef__error_set(error, EF_INVALID, "frame %zu has no finite colour",
                           k / 3 + 1);
    }
  }
  return EF_OK;
}

ef_status ef_flash_count(const ef_flash_input *in, ef_flash *out,
                         ef_error *error) {
  double matrix[9], to_rgb[9];
  ef_status status = check_flash(in, error);
  const ef_encoding *const srgb = ef_encoding_find("srgb", error);
  if (status == EF_OK && srgb == NULL)
    status = EF_UNKNOWN_NAME;
  if (status == EF_OK)
    status = ef_encoding_matrix(srgb, matrix, error);
  if (status != EF_OK)
    return status;
  ef__mat3_inverse(matrix, to_rgb);
  double *const time_s = ef__allocate(in->n, sizeof *time_s);
  if (time_s == NULL)
    return ef__error_memory(error, "flashes");
  *out = (ef_flash){.solid_angle_sr = in->solid_angle_sr,
                    .share_of_frame = in->share_of_frame,
                    .in_ten_deg_sr = in->in_ten_deg_sr > 0 ? in->in_ten_deg_sr
                                                           : in->solid_angle_sr,
                    .is_fine = in->is_fine};
  out->n_general = count_flashes(in, general_rule(), time_s);
  out->has_luminance = isfinite(in->white_cd_m2);
  if (out->has_luminance) {
    out->n_television =
        count_flashes(in, television_rule(in->white_cd_m2), time_s);
  }
  out->n_red = count_red(in, to_rgb, time_s);
  free(time_s);
  const bool is_wide = !(out->in_ten_deg_sr <= most_sr) && !out->is_fine;
  const double duration_s = (double)in->n / in->frame_rate_hz;
  out->is_long = duration_s > long_s &&
                 out->n_general + out->n_television + out->n_red > 0;
  out->exceeds_general = out->n_general > MOST_FLASHES && is_wide;
  out->exceeds_television =
      out->n_television > MOST_FLASHES && !(in->share_of_frame <= most_share);
  out->exceeds_red = out->n_red > MOST_FLASHES && is_wide;
  return EF_OK;
}

/* ---- Frames -------------------------------------------------------------- */

/* Colours of the place with the full window, Y of the white 1. */
static void fill_colours(const ef_frames *frames, const ef_setup *setup,
                         double *xyz) {
  for (size_t k = 0; k < ef_frames_count(frames); ++k) {
    double amount[EF_MAX_DRIVES];
    ef__frames_peak(frames, k, amount);
    const ef_xyz at = ef_setup_xyz(setup, amount, NULL);
    xyz[3 * k] = at.X / 100;
    xyz[3 * k + 1] = at.Y / 100;
    xyz[3 * k + 2] = at.Z / 100;
  }
}

static bool has_carrier(const ef_frame_settings *s) {
  return s->pattern == EF_PATTERN_GRATING || s->pattern == EF_PATTERN_GABOR;
}

/* Stripes, half a cycle each, finer than 0.1 degree: light and dark balance. */
static bool is_fine(const ef_frame_settings *s) {
  const double finest_deg = 0.1;
  return has_carrier(s) && 0.5 / s->cycles_per_deg < finest_deg;
}

ef_status ef_frames_flash(const ef_frames *frames, ef_flash *out,
                          ef_error *error) {
  const ef_device *const device = ef__frames_device(frames);
  const size_t count = ef_frames_count(frames);
  ef_error failure = {.status = EF_NO_MEMORY};
  ef_observer *const observer = ef_observer_new("cie-1931", &failure);
  ef_setup *const setup =
      observer != NULL ? ef_setup_new(device, observer, NULL, NULL, &failure)
                       : NULL;
  double *const xyz = ef__allocate(3 * count, sizeof *xyz);
  ef_status status = failure.status;
  if (xyz == NULL) {
    status = ef__error_memory(&failure, "flashes");
  } else if (setup != NULL) {
    fill_colours(frames, setup, xyz);
    const ef_frame_area area = ef_frames_area(frames);
    const ef_flash_input input = {
        .n = count,
        .frame_rate_hz = ef_frames_settings(frames)->frame_rate_hz,
        .xyz = xyz,
        .white_cd_m2 = ef_setup_luminance_cd_m2(setup),
        .solid_angle_sr = area.solid_angle_sr,
        .share_of_frame = area.share_of_frame,
        .in_ten_deg_sr = area.in_ten_deg_sr,
        .is_fine = is_fine(ef_frames_settings(frames))};
    status = ef_flash_count(&input, out, &failure);
  }
  free(xyz);
  ef_setup_free(setup);
  ef_observer_free(observer);
  if (status != EF_OK && error != NULL)
    *error = failure;
  return status;
}

/* ---- Stripes ------------------------------------------------------------- */

/* How far the pattern reaches along its stripes' direction, where its window is
 * at least one half. */
static double reach_deg(const ef_frame_settings *s) {
  const double turn = s->orientation_deg * 0.017453292519943295;
  const double half_at_sigmas = 2.3548200450309493; /* 2 sqrt(2 ln 2) */
  const double wide_deg =
      2 * ef_pixels_to_degrees((double)s->width_px / 2, s->distance_mm,
                               s->pixels_per_mm);
  const double high_deg =
      2 * ef_pixels_to_degrees((double)s->height_px / 2, s->distance_mm,
                               s->pixels_per_mm);
  double reach = fabs(cos(turn)) * wide_deg + fabs(sin(turn)) * high_deg;
  if (s->size_deg > 0)
    reach = fmin(reach, s->size_deg);
  if (s->pattern == EF_PATTERN_GABOR)
    reach = fmin(reach, half_at_sigmas * s->sigma_deg);
  return reach;
}

/* Luminances of the two extremes. */
static void set_luminances(const ef_frames *frames, ef_stripes *out) {
  double high[EF_MAX_DRIVES], low[EF_MAX_DRIVES];
  ef__frames_extremes(frames, high, low);
  const ef_stimulator *const stimulator = ef__frames_stimulator(frames);
  const double a = ef_stimulator_luminance_cd_m2(stimulator, high);
  const double b = ef_stimulator_luminance_cd_m2(stimulator, low);
  const rule r = television_rule(1);
  out->has_luminance = isfinite(a) && isfinite(b);
  out->light_cd_m2 = fmax(a, b);
  out->dark_cd_m2 = fmin(a, b);
  out->is_discernible =
      out->has_luminance && counts(&r, out->dark_cd_m2, out->light_cd_m2);
}

ef_status ef_frames_stripes(const ef_frames *frames, ef_stripes *out,
                            ef_error *error) {
  const double most_pairs = 5, least_light_cd_m2 = 50;
  const double most_share_standing = 0.40;
  const ef_frame_settings *const s = ef_frames_settings(frames);
  (void)error;
  const double none = (double)NAN;
  *out = (ef_stripes){.light_cd_m2 = none, .dark_cd_m2 = none};
  if (!has_carrier(s))
    return EF_OK;
  out->pairs = s->cycles_per_deg * reach_deg(s);
  out->share_of_frame = ef_frames_area(frames).share_of_frame;
  out->flickers =
      s->waveform.duration_s > 0 && s->waveform.kind != EF_WAVEFORM_STEADY;
  set_luminances(frames, out);
  const double most = out->flickers ? most_share : most_share_standing;
  out->exceeds = out->pairs > most_pairs && out->is_discernible &&
                 out->light_cd_m2 >= least_light_cd_m2 &&
                 out->share_of_frame > most;
  return EF_OK;
}

/* ---- Blue light ---------------------------------------------------------- */

/* Weights of B(lambda) at 1 nm from 300 to 700 nm, linear between the 5 nm
 * rows of the table, folded for the samples. */
static ef_weights *blue_weights(const ef_grid *grid, ef_error *error) {
  enum { FIRST_NM = 300, LAST_NM = 700, SAMPLES = LAST_NM - FIRST_NM + 1 };
  double b[SAMPLES];
  const double step_nm = 1;
  const ef_table *const table = ef_table_find("retinal-hazard", error);
  if (table == NULL)
    return NULL;
  const ef_grid from = ef_table_grid(table);
  ef_fold_settings settings = ef_fold_settings_default();
  settings.kind = EF_LIGHT;
  settings.working = (ef_grid){SAMPLES, FIRST_NM, step_nm, NULL};
  const double *const column =
      table->value + ef_table_column(table, "B") * table->n_rows;
  if (ef_resample(&from, 1, column, &settings.working, EF_INTERPOLATE_LINEAR,
                  EF_EXTEND_ZERO, b, error) != EF_OK)
    return NULL;
  return ef_weights_fold(grid, 1, b, NULL, &step_nm, &settings, error);
}

ef_status ef_blue_light_measure(const ef_grid *grid, const double *radiance,
                                double angular_subtense_rad, double exposure_s,
                                ef_blue_light *out, ef_error *error) {
  const double small_rad = 0.011, quarter_pi = 0.78539816339744831;
  if (!(angular_subtense_rad > 0) || !(exposure_s >= 0)) {
    return ef__error_set(error, EF_INVALID,
                         "a source of %g rad seen for %g s; expected more than "
                         "0, and 0 or more",
                         angular_subtense_rad, exposure_s);
  }
  ef_error failure = {.status = EF_OK};
  ef_weights *const weights = blue_weights(grid, &failure);
  if (weights == NULL) {
    if (error != NULL)
      *error = failure;
    return failure.status;
  }
  ef_blue_light found = {.exposure_s = exposure_s};
  const ef_status status =
      ef_weights_apply(weights, 1, radiance, 1, &found.radiance_w_m2_sr, error);
  ef_weights_free(weights);
  if (status != EF_OK)
    return status;
  found.is_small = angular_subtense_rad < small_rad;
  found.irradiance_w_m2 = found.radiance_w_m2_sr * quarter_pi *
                          angular_subtense_rad * angular_subtense_rad;
  /* IEC 62471: L_B t <= 1e6 J m-2 sr-1 up to 1e4 s, then L_B <= 100; for small
   * sources E_B t <= 100 J m-2 up to 100 s, then E_B <= 1. */
  const double level =
      found.is_small ? found.irradiance_w_m2 : found.radiance_w_m2_sr / 100;
  const double dose = found.is_small ? 100 : 1e4;
  found.limit_s = level > 1 ? dose / level : HUGE_VAL;
  found.exceeds = exposure_s > found.limit_s;
  *out = found;
  return EF_OK;
}

/* ---- In words ------------------------------------------------------------ */

static size_t flash_words(const ef_flash *f, char (*text)[EF_CAUTION_TEXT]) {
  size_t n = 0;
  const char *const fine =
      f->is_fine ? "; stripes finer than 0.1 degree, which WCAG leaves out"
                 : "";
  const char *const lasting =
      f->is_long ? "; flashing for more than 5 s may be a risk even where each "
                   "second is within the limits"
                 : "";
  if (f->n_general > MOST_FLASHES || f->n_television > MOST_FLASHES) {
    const size_t most =
        f->n_general > f->n_television ? f->n_general : f->n_television;
    snprintf(text[n++], EF_CAUTION_TEXT,
             "flashes: %zu in a second over %.3g sr of a field of 10 degrees "
             "and %.3g %% of the frame; WCAG 2.3.1 allows 3 over more than "
             "0.006 sr, ITU-R BT.1702 over more than 25 %%%s%s%s",
             most, f->in_ten_deg_sr, 100 * f->share_of_frame,
             f->exceeds_general || f->exceeds_television ? ": exceeded" : "",
             fine, lasting);
  } else if (f->is_long) {
    snprintf(text[n++], EF_CAUTION_TEXT,
             "flashes: up to %zu in a second, within the limits of WCAG 2.3.1 "
             "and ITU-R BT.1702%s",
             f->n_general > f->n_television ? f->n_general : f->n_television,
             lasting);
  }
  if (f->n_red > 0) {
    snprintf(text[n++], EF_CAUTION_TEXT,
             "saturated red: %zu flashes in a second; WCAG 2.3.1 allows 3%s",
             f->n_red, f->exceeds_red ? ": exceeded" : "");
  }
  return n;
}

static size_t stripe_words(const ef_stripes *s, char (*text)[EF_CAUTION_TEXT]) {
  const double pairs_told = 5;
  if (!(s->pairs > pairs_told) || (s->has_luminance && !s->is_discernible))
    return 0;
  const double most_percent = s->flickers ? 25 : 40;
  if (!s->has_luminance) {
    snprintf(text[0], EF_CAUTION_TEXT,
             "stripes: %.3g light-dark pairs over %.3g %% of the frame, of "
             "luminances that are not known; guidance for television allows "
             "bright ones over %g %%",
             s->pairs, 100 * s->share_of_frame, most_percent);
    return 1;
  }
  snprintf(text[0], EF_CAUTION_TEXT,
           "stripes: %.3g light-dark pairs of %.3g and %.3g cd/m2 over %.3g %% "
           "of the frame%s; guidance for television allows more than 5 pairs "
           "of 50 cd/m2 or more over %g %%%s",
           s->pairs, s->light_cd_m2, s->dark_cd_m2, 100 * s->share_of_frame,
           s->flickers ? ", flickering" : "", most_percent,
           s->exceeds ? ": exceeded" : "");
  return 1;
}

static void blue_words(const ef_blue_light *b, char *text) {
  if (isfinite(b->limit_s)) {
    snprintf(text, EF_CAUTION_TEXT,
             "blue light: weighted radiance %.4g W m-2 sr-1, exposure limit of "
             "IEC 62471 after %.4g s%s",
             b->radiance_w_m2_sr, b->limit_s, b->exceeds ? ": exceeded" : "");
    return;
  }
  snprintf(text, EF_CAUTION_TEXT,
           "blue light: weighted radiance %.4g W m-2 sr-1, below the exposure "
           "limit of IEC 62471 for any time",
           b->radiance_w_m2_sr);
}

size_t ef_cautions(const ef_flash *flash, const ef_stripes *stripes,
                   const ef_blue_light *blue,
                   char text[EF_MOST_CAUTIONS][EF_CAUTION_TEXT]) {
  size_t n = 0;
  if (flash != NULL)
    n += flash_words(flash, text + n);
  if (stripes != NULL)
    n += stripe_words(stripes, text + n);
  if (blue != NULL)
    blue_words(blue, text[n++]);
  snprintf(text[n++], EF_CAUTION_TEXT, "%s", ef_caution_deferral());
  return n;
}
