/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_isolate.h"

#include <math.h>

/* By receptor: "L", "M", "S", "rod", "mel". */
static void record_receptors(record *out, const char *key,
                             const double *value) {
  record_begin(out, key);
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k)
    record_number(out, ef_receptor_symbol((ef_receptor)k), value[k]);
  record_end(out);
}

/* By primary. */
static void record_primaries(record *out, const isolate_scene *s,
                             const char *key, const double *value) {
  const char *names[EF_MAX_DRIVES];
  const size_t n = ef_device_n_drives(s->display.device);
  for (size_t i = 0; i < n; ++i)
    names[i] = ef_device_drive_name(s->display.device, i);
  record_numbers(out, key, n, names, value);
}

static void record_codes(record *out, const isolate_scene *s, const char *key,
                         const uint32_t *code) {
  double value[EF_MAX_DRIVES];
  for (size_t i = 0; i < EF_MAX_DRIVES; ++i)
    value[i] = (double)code[i];
  record_primaries(out, s, key, value);
}

static void record_way(record *out, const isolate_scene *s,
                       const ef_isolation *way) {
  static const char *const roles[] = {"ignored", "silent", "changed"};
  double amount[EF_MAX_DRIVES], drive[EF_MAX_DRIVES];
  record_begin(out, "role");
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k)
    record_text(out, ef_receptor_symbol((ef_receptor)k), roles[way->role[k]]);
  record_end(out);
  record_text(out, "modulation_kind",
              way->modulation_kind == EF_PULSE ? "pulse" : "symmetric");
  record_primaries(out, s, "background", way->background);
  isolate_drives(s, way->background, drive);
  record_primaries(out, s, "background_drive", drive);
  record_primaries(out, s, "modulation", way->modulation);
  isolate_extreme(way, 1.0, amount);
  isolate_drives(s, amount, drive);
  record_primaries(out, s, "high_drive", drive);
  if (way->modulation_kind == EF_SYMMETRIC)
    isolate_extreme(way, -1.0, amount);
  else
    isolate_extreme(way, 0.0, amount);
  isolate_drives(s, amount, drive);
  record_primaries(out, s, "low_drive", drive);
  record_receptors(out, "excitation", way->excitation);
  record_receptors(out, "contrast", way->contrast);
  record_number(out, "along", way->along);
  record_number(out, "max_contrast", way->largest);
  record_number(out, "pooled_contrast", way->pooled_contrast);
  record_number(out, "luminance_change", way->luminance_change);
  record_number(out, "luminance_cd_m2", way->luminance_cd_m2);
  record_number(out, "condition_number", way->condition_number);
  record_number(out, "rank", (double)way->rank);
}

static void record_coded(record *out, const isolate_scene *s,
                         const ef_coded *c) {
  double worse[EF_N_RECEPTORS];
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k) {
    worse[k] = fabs(c->contrast_low[k]) > fabs(c->contrast_high[k])
                   ? c->contrast_low[k]
                   : c->contrast_high[k];
  }
  record_number(out, "bits", (double)c->bits);
  record_codes(out, s, "background_codes", c->background);
  record_codes(out, s, "codes", c->high);
  record_codes(out, s, "codes_low", c->low);
  record_receptors(out, "contrast_codes", c->contrast_high);
  record_receptors(out, "contrast_codes_low", c->contrast_low);
  /* Of every receptor what is farther from zero; of the silent ones together.
   */
  record_begin(out, "residual");
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k)
    record_number(out, ef_receptor_symbol((ef_receptor)k), worse[k]);
  record_number(out, "largest_silent", c->residual);
  record_number(out, "largest_silent_rounded", c->rounded_residual);
  record_end(out);
  record_number(out, "smallest_contrast", c->smallest_contrast);
  record_codes(out, s, "smallest_codes", c->smallest);
  record_boolean(out, "below_resolution", c->below_resolution);
}

static void record_people(record *out, const isolate_scene *s,
                          const isolate_result *r) {
  const ef_population_settings *p = &s->people.settings;
  if (s->people.population == NULL)
    return;
  record_begin(out, "population");
  record_number(out, "count", (double)p->count);
  record_number(out, "seed", (double)p->seed);
  record_number(out, "field_deg", p->mean.field_deg);
  if (s->people.age_file != NULL) {
    record_text(out, "ages", s->people.age_file);
  } else {
    record_number(out, "age_min_years", p->age_min_years);
    record_number(out, "age_max_years", p->age_max_years);
  }
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k) {
    record_begin(out, ef_receptor_symbol((ef_receptor)k));
    record_number(out, "intended", r->spread[k].intended);
    record_number(out, "mean", r->spread[k].mean);
    record_number(out, "rms", r->spread[k].rms);
    record_number(out, "p95", r->spread[k].p95);
    record_number(out, "worst", r->spread[k].worst);
    record_end(out);
  }
  record_end(out);
}

static void record_eye(record *out, const isolate_scene *s,
                       const isolate_result *r) {
  const double none = (double)NAN;
  ef_retinal e = r->eye;
  ef_blue_light b = r->blue;
  if (!r->has_eye) {
    e.pupil_diameter_mm = e.photopic_td = e.scotopic_td = none;
    for (size_t k = 0; k < EF_N_RECEPTORS; ++k)
      e.irradiance_w_m2[k] = e.equivalent_d65_lx[k] = none;
    b.radiance_w_m2_sr = b.limit_s = none;
  }
  record_text(out, "pupil", ef_pupil_name(s->pupil.formula));
  record_number(out, "pupil_mm", e.pupil_diameter_mm);
  record_number(out, "photopic_td", e.photopic_td);
  record_number(out, "scotopic_td", e.scotopic_td);
  record_number(out, "size_deg", r->field_deg);
  record_receptors(out, "irradiance_w_m2", e.irradiance_w_m2);
  record_receptors(out, "equivalent_d65_lx", e.equivalent_d65_lx);
  record_number(out, "blue_light_w_m2_sr", b.radiance_w_m2_sr);
  record_number(out, "blue_light_limit_s", b.limit_s);
  record_number(out, "exposure_s", s->exposure_s);
}

/* What is shown when, and how often it flashes. */
static void record_show(record *out, const isolate_show *show) {
  const ef_flash *flash = &show->flash;
  const double none = (double)NAN;
  record_begin(out, "shown");
  record_number(out, "n_frames", (double)ef_frames_count(show->frames));
  record_number(out, "frame_rate_hz", show->settings.frame_rate_hz);
  record_text(out, "waveform", ef_pattern_name(show->settings.pattern));
  record_number(out, "solid_angle_sr", show->area.solid_angle_sr);
  record_number(out, "in_ten_deg_sr", show->area.in_ten_deg_sr);
  record_number(out, "share_of_frame", show->area.share_of_frame);
  record_number(out, "flashes_general", (double)flash->n_general);
  record_number(out, "flashes_television",
                flash->has_luminance ? (double)flash->n_television : none);
  record_number(out, "flashes_red", (double)flash->n_red);
  record_number(out, "stripe_pairs", show->stripes.pairs);
  record_end(out);
  if (!show->has_dither)
    return;
  record_begin(out, "dither");
  record_receptors(out, "contrast", show->dither.contrast);
  record_receptors(out, "noise", show->dither.noise);
  record_number(out, "residual", show->dither.residual);
  record_number(out, "residual_rounded", show->dither.rounded_residual);
  record_end(out);
}

void isolate_record(record *out, const isolate_scene *s,
                    const isolate_result *r) {
  record_text(out, "direction", s->direction_text);
  record_text(out, "display", s->display.source);
  record_text(out, "observer", ef_observer_name(s->observer));
  static const char *const cones[] = {"L", "M", "S"};
  record_numbers(out, "luminance_weights", 3, cones,
                 ef_stimulator_luminance_weights(s->stimulator));
  record_boolean(out, "robust", s->options->robust);
  record_way(out, s, &r->way);
  record_coded(out, s, &r->coded);
  record_people(out, s, r);
  record_eye(out, s, r);
  if (r->show.frames != NULL)
    record_show(out, &r->show);
  const char *caution[EF_MOST_CAUTIONS];
  for (size_t i = 0; i < r->n_cautions; ++i)
    caution[i] = r->caution[i];
  record_texts(out, "cautions", r->n_cautions, caution);
}

static void write_record(record *out, const isolate_scene *s,
                         const isolate_result *r) {
  record_begin(out, NULL);
  isolate_record(out, s, r);
  record_end(out);
}

ef_status isolate_data_write(const isolate_scene *s, const isolate_result *r,
                             ef_output *output, bool is_csv, ef_error *error) {
  if (!is_csv) {
    ef_json *json = ef_json_new(output, error);
    if (json == NULL)
      return error->status;
    record out = record_of_json(json);
    write_record(&out, s, r);
    return ef_json_finish(json, error);
  }
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  record head = record_of_csv(csv, true);
  write_record(&head, s, r);
  record row = record_of_csv(csv, false);
  write_record(&row, s, r);
  return ef_csv_finish(csv, error);
}
