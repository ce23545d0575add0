/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_profile.h"

#include <math.h>

#include "message.h"
#include "record.h"
#include "render_profile_text.h"

/* ---- One row ------------------------------------------------------------- */

static void record_colour(record *r, const char *key, ef_xyz xyz,
                          ef_xyz white) {
  record_begin(r, key);
  record_xyz(r, xyz);
  record_lab(r, ef_xyz_to_lab(xyz, white));
  record_end(r);
}

static void record_row(record *r, const profile_fit *f, size_t i) {
  const fit_row *row = &f->row[i];
  const char *names[EF_MAX_DRIVES];
  profile_channel_names(&f->info, names);
  record_begin(r, NULL);
  record_text(r, "name", f->rows.name[i]);
  record_number(r, "line",
                f->from_model ? (double)NAN : (double)f->rows.line[i]);
  record_numbers(r, "device", f->rows.n_device, names,
                 f->rows.device + i * f->rows.n_device);
  record_colour(r, "measured", row->measured, row->white);
  record_colour(r, "profile", row->predicted, row->white);
  record_number(r, "difference", row->difference);
  record_number(r, "jnds", row->difference / f->measure.jnd);
  record_number(r, "lightness_part", row->components.lightness);
  record_number(r, "chroma_part", row->components.chroma);
  record_number(r, "hue_part", row->components.hue);
  record_boolean(r, "within_tolerance",
                 !(row->difference > f->measure.tolerance));
  record_end(r);
}

/* ---- CSV ----------------------------------------------------------------- */

static void write_rows(const profile_fit *f, ef_csv *csv) {
  record header = record_of_csv(csv, true);
  record_row(&header, f, 0);
  for (size_t i = 0; i < f->rows.n; ++i) {
    record r = record_of_csv(csv, false);
    record_row(&r, f, i);
  }
}

static void write_tags(const profile_fit *f, ef_csv *csv) {
  static const char *const keys[] = {
      "profile",          "description", "class",       "space",
      "connection_space", "version",     "missing_tags"};
  char version[40];
  snprintf(version, sizeof version, "%d.%d", f->info.major, f->info.minor);
  const char *const values[] = {
      f->path,        f->info.description, f->info.device_class,
      f->info.space,  f->info.pcs,         version,
      f->info.missing};
  for (size_t i = 0; i < sizeof keys / sizeof keys[0]; ++i)
    ef_csv_text(csv, keys[i]);
  ef_csv_end_row(csv);
  for (size_t i = 0; i < sizeof keys / sizeof keys[0]; ++i)
    ef_csv_text(csv, values[i]);
  ef_csv_end_row(csv);
}

static ef_status as_csv(const profile_fit *f, ef_output *output,
                        ef_error *error) {
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  if (f->row != NULL)
    write_rows(f, csv);
  else
    write_tags(f, csv);
  return ef_csv_finish(csv, error);
}

/* ---- JSON ---------------------------------------------------------------- */

static void write_profile(const profile_fit *f, ef_json *j) {
  const ef_profile_info *info = &f->info;
  char version[40];
  snprintf(version, sizeof version, "%d.%d", info->major, info->minor);
  ef_json_begin_object(j, "profile");
  ef_json_text(j, "path", f->path);
  ef_json_text(j, "description", info->description);
  ef_json_text(j, "class", info->device_class);
  ef_json_text(j, "space", info->space);
  ef_json_text(j, "connection_space", info->pcs);
  ef_json_text(j, "version", version);
  ef_json_boolean(j, "is_matrix", info->is_matrix);
  ef_json_begin_array(j, "intents");
  for (int i = EF_INTENT_PERCEPTUAL; i <= EF_INTENT_ABSOLUTE; ++i) {
    if (info->has_intent[i])
      ef_json_text(j, NULL, ef_intent_name((ef_intent)i));
  }
  ef_json_end_array(j);
  ef_json_text(j, "missing_tags", info->missing);
  ef_json_begin_object(j, "media_white");
  ef_json_number(j, "X", info->media_white.X);
  ef_json_number(j, "Y", info->media_white.Y);
  ef_json_number(j, "Z", info->media_white.Z);
  ef_json_end_object(j);
  if (f->is_made)
    ef_json_integer(j, "bytes", (int64_t)f->n_bytes);
  ef_json_end_object(j);
}

static void write_fit(const profile_fit *f, ef_json *j) {
  ef_json_text(j, "measurements", f->from_model ? "model" : f->source);
  ef_json_text(j, "intent", ef_intent_name(f->settings.intent));
  ef_json_boolean(j, "scales_black", f->settings.black_point_compensation);
  ef_json_text(j, "metric", ef_metric_name(f->measure.metric));
  ef_json_number(j, "jnd", f->measure.jnd);
  ef_json_begin_object(j, "summary");
  ef_json_integer(j, "colours", (int64_t)f->tally.n);
  ef_json_number(j, "mean_difference", f->tally.mean);
  ef_json_number(j, "p95_difference", f->tally.p95);
  ef_json_number(j, "worst_difference", f->tally.worst);
  ef_json_text(j, "worst_name", f->rows.name[f->tally.worst_at]);
  ef_json_number(j, "tolerance", f->measure.tolerance);
  ef_json_integer(j, "beyond_tolerance", (int64_t)f->n_beyond);
  ef_json_end_object(j);
  ef_json_begin_array(j, "colours");
  for (size_t i = 0; i < f->rows.n; ++i) {
    record r = record_of_json(j);
    record_row(&r, f, i);
  }
  ef_json_end_array(j);
}

static ef_status as_json(const profile_fit *f, ef_output *output,
                         ef_error *error) {
  ef_json *j = ef_json_new(output, error);
  if (j == NULL)
    return error->status;
  ef_json_begin_object(j, NULL);
  write_profile(f, j);
  if (f->row != NULL)
    write_fit(f, j);
  if (f->options->check)
    ef_json_boolean(j, "check_holds", !profile_fit_fails(f));
  ef_json_end_object(j);
  return ef_json_finish(j, error);
}

ef_status render_profile_fit(const profile_fit *f, ef_output *output,
                             ef_error *error) {
  switch (f->options->format) {
  case FORMAT_CSV:
    return as_csv(f, output, error);
  case FORMAT_JSON:
    return as_json(f, output, error);
  default:
    return render_profile_text(f, output, error);
  }
}
