/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "isolate.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "source.h"

enum { PEOPLE_OF_ROBUST = 500 };

/* ---- Loading ----------------------------------------------------------- */

/* Numbers in the direction are contrasts that are meant. */
static bool has_numbers(const char *direction, ef_direction_kind kind) {
  return kind == EF_DIRECTION_DKL || kind == EF_DIRECTION_MB ||
         (kind == EF_DIRECTION_CONTRAST && strchr(direction, '=') != NULL);
}

static ef_status set_direction(isolate_scene *s, ef_error *error) {
  const command_options *o = s->options;
  s->direction_text = o->change != NULL ? o->change : "S";
  ef_status status =
      ef_direction_parse(s->direction_text, &s->direction, error);
  if (status != EF_OK) {
    error->status = EF_UNKNOWN_NAME;
    return message_option(error, "change", "");
  }
  const char *option = "silence";
  if (o->silence != NULL) {
    status = ef_direction_set_role(&s->direction, o->silence,
                                   EF_RECEPTOR_SILENT, error);
  }
  if (status == EF_OK && o->ignore != NULL) {
    option = "ignore";
    status = ef_direction_set_role(&s->direction, o->ignore,
                                   EF_RECEPTOR_IGNORED, error);
  }
  if (status != EF_OK) {
    error->status = EF_UNKNOWN_NAME;
    return message_option(error, option, "");
  }
  s->settings = ef_isolate_settings_default();
  s->settings.modulation = (ef_modulation)o->modulation;
  s->settings.contrast = o->contrast;
  if (isnan(o->contrast) && has_numbers(s->direction_text, s->direction.kind))
    s->settings.contrast = 1.0;
  return EF_OK;
}

static ef_status set_display(isolate_scene *s, const ef_notes *notes,
                             ef_error *error) {
  command_options chosen = *s->options;
  s->demo_display = chosen.display == NULL;
  if (s->demo_display)
    chosen.display = "demo:lab-display";
  s->metric = ef_metric_new("ciede2000", error);
  if (s->metric == NULL)
    return error->status;
  return display_load(&chosen, s->metric, notes, &s->display, error);
}

static ef_status set_stimulator(isolate_scene *s, const ef_notes *notes,
                                ef_error *error) {
  const command_options *o = s->options;
  const char *name = o->observer != NULL ? o->observer : "cie-2015-2";
  s->observer = source_observer_named(o, name, "--observer", notes, error);
  if (s->observer == NULL)
    return error->status;
  double weight[3];
  s->own_weights = o->luminance_weights != NULL;
  if (s->own_weights) {
    const ef_status status =
        isolate_weights(o->luminance_weights, weight, error);
    if (status != EF_OK)
      return status;
  }
  s->stimulator =
      ef_stimulator_new(s->display.device, s->observer,
                        s->own_weights ? weight : NULL, notes, error);
  if (s->stimulator != NULL)
    return EF_OK;
  return message_place(error, s->display.source);
}

static ef_status set_people(isolate_scene *s, const ef_notes *notes,
                            ef_error *error) {
  const command_options *o = s->options;
  if (isnan(o->population) && !o->robust)
    return EF_OK;
  return people_load(&s->people, o, PEOPLE_OF_ROBUST, s->observer, notes,
                     error);
}

ef_status isolate_scene_load(isolate_scene *s, const command_options *options,
                             const ef_notes *notes, ef_error *error) {
  const double day_s = 28800.0;
  *s = (isolate_scene){.options = options};
  s->size_deg = isolate_size_deg(options);
  s->exposure_s = isnan(options->exposure_s) ? day_s : options->exposure_s;
  ef_status status = set_direction(s, error);
  if (status == EF_OK)
    status = set_display(s, notes, error);
  if (status == EF_OK) {
    status =
        isolate_background(options, s->display.device, &s->settings, error);
  }
  if (status == EF_OK)
    status = set_stimulator(s, notes, error);
  if (status == EF_OK)
    status = isolate_pupil(options->pupil, s->observer, &s->pupil, error);
  if (status == EF_OK)
    status = set_people(s, notes, error);
  return status;
}

void isolate_scene_free(isolate_scene *s) {
  people_free(&s->people);
  ef_stimulator_free(s->stimulator);
  ef_observer_free(s->observer);
  display_free(&s->display);
  ef_metric_free(s->metric);
}

/* ---- Computing --------------------------------------------------------- */

void isolate_drives(const isolate_scene *s, const double *amount,
                    double *drive) {
  const ef_device *device = s->display.device;
  for (size_t i = 0; i < ef_device_n_drives(device); ++i)
    drive[i] = ef_device_drive(device, i, amount[i]);
}

void isolate_extreme(const ef_isolation *way, double sign, double *amount) {
  for (size_t i = 0; i < way->n_primaries; ++i) {
    amount[i] =
        fmin(1.0, fmax(0.0, way->background[i] + sign * way->modulation[i]));
  }
}

static ef_status find_way(const isolate_scene *s, const ef_notes *notes,
                          ef_isolation *way, ef_error *error) {
  const ef_status status =
      s->options->robust
          ? ef_isolate_robust(s->stimulator, &s->direction, &s->settings,
                              s->people.population, s->options->jobs, way,
                              notes, error)
          : ef_isolate(s->stimulator, &s->direction, &s->settings, way, error);
  /* The options' own ranges are checked: what is left is a background that
   * does not excite a receptor, and nothing that is to be silent. */
  if (status == EF_INVALID)
    error->status = EF_NO_ANSWER;
  return status == EF_OK ? EF_OK : error->status;
}

/* Blue light of one state of the display. */
static ef_status measure_blue(const isolate_scene *s, double field_deg,
                              const double *amount, ef_blue_light *out,
                              ef_error *error) {
  const double rad_per_deg = 0.017453292519943295;
  const ef_device *device = s->display.device;
  const ef_grid *grid = ef_device_grid(device);
  double drive[EF_MAX_DRIVES];
  double *radiance = malloc(grid->count * sizeof *radiance);
  if (radiance == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for a spectrum");
  isolate_drives(s, amount, drive);
  ef_status status = ef_device_spectrum(device, drive, radiance, NULL, error);
  if (status == EF_OK) {
    status = ef_blue_light_measure(grid, radiance, field_deg * rad_per_deg,
                                   s->exposure_s, out, error);
  }
  free(radiance);
  return status;
}

/* Diameter of the disc with that solid angle. */
static double disc_deg(double solid_angle_sr) {
  const double two_pi = 6.283185307179586, deg_per_rad = 57.29577951308232;
  return 2.0 * deg_per_rad * acos(1.0 - solid_angle_sr / two_pi);
}

/* What changes: the disc, or the form where it fills the frame or is cut by
 * its sides. */
static void set_field(const isolate_scene *s, isolate_result *r) {
  const bool is_whole =
      r->show.frames != NULL &&
      (r->show.settings.pattern == EF_PATTERN_UNIFORM || !(s->size_deg > 0.0));
  r->field_deg =
      is_whole ? disc_deg(r->show.area.frame_solid_angle_sr) : s->size_deg;
}

/* CIE 015: the 2 degree functions for fields up to 4 degrees, the 10 degree
 * ones beyond. Said where a size was asked for. */
static void tell_field(const isolate_scene *s, const isolate_result *r,
                       const ef_notes *notes) {
  const double border_deg = 4.0;
  const double eye_deg = ef_observer_field_deg(s->observer);
  if (isnan(s->options->size_deg) && r->show.frames == NULL)
    return;
  if ((r->field_deg > border_deg) == (eye_deg > border_deg))
    return;
  message_note(notes,
               "what changes is %.3g degrees wide, and the cones of %s are "
               "those of %g degrees: --observer %s or model:field=DEG fits "
               "better",
               r->field_deg, ef_observer_name(s->observer), eye_deg,
               r->field_deg > border_deg ? "cie-2015-10" : "cie-2015-2");
}

/* The whole frame has the background's light; without one only the disc is
 * known. */
static double adapting_deg2(const isolate_result *r) {
  const double quarter_pi = 0.78539816339744831;
  const double wide_deg = r->show.frames != NULL
                              ? disc_deg(r->show.area.frame_solid_angle_sr)
                              : r->field_deg;
  return quarter_pi * wide_deg * wide_deg;
}

static ef_status look(const isolate_scene *s, const ef_notes *notes,
                      isolate_result *r, ef_error *error) {
  r->has_eye = ef_device_absolute(s->display.device);
  if (!r->has_eye)
    return EF_OK;
  ef_pupil pupil = s->pupil;
  pupil.field_deg2 = adapting_deg2(r);
  ef_status status =
      ef_retinal_measure(s->stimulator, r->way.background, &pupil, r->field_deg,
                         notes, &r->eye, error);
  for (int sign = -1; sign <= 1 && status == EF_OK; ++sign) {
    double amount[EF_MAX_DRIVES];
    ef_blue_light blue;
    if (sign < 0 && r->way.modulation_kind == EF_PULSE)
      continue;
    isolate_extreme(&r->way, (double)sign, amount);
    status = measure_blue(s, r->field_deg, amount, &blue, error);
    if (status == EF_OK && !(blue.radiance_w_m2_sr <= r->blue.radiance_w_m2_sr))
      r->blue = blue;
  }
  return status;
}

ef_status isolate_compute(const isolate_scene *s, const ef_notes *notes,
                          isolate_result *out, ef_error *error) {
  ef_status status = find_way(s, notes, &out->way, error);
  if (status != EF_OK)
    return status;
  ef_codes_settings codes = ef_codes_settings_default();
  codes.bits = s->options->bits;
  status =
      ef_isolation_codes(s->stimulator, &out->way, &codes, &out->coded, error);
  if (status == EF_OK && s->people.population != NULL) {
    status =
        ef_isolation_spread(s->stimulator, &out->way, s->people.population,
                            s->options->jobs, out->spread, NULL, notes, error);
  }
  if (status == EF_OK)
    status = isolate_show_new(&out->show, s, &out->way, notes, error);
  if (status != EF_OK)
    return status;
  set_field(s, out);
  tell_field(s, out, notes);
  status = look(s, notes, out, error);
  if (status == EF_OK) {
    out->n_cautions =
        ef_cautions(out->show.frames != NULL ? &out->show.flash : NULL,
                    out->show.frames != NULL ? &out->show.stripes : NULL,
                    out->has_eye ? &out->blue : NULL, out->caution);
  }
  return status;
}

void isolate_result_free(isolate_result *r) {
  isolate_show_free(&r->show);
}
