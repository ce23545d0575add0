/* SPDX-License-Identifier: GPL-3.0-or-later */
/* --display: lights that add. */
#include "device.h"

#include <stdlib.h>
#include <string.h>

#include "match.h"
#include "message.h"
#include "render_display.h"

/* The kiosk as its software sees it is known for the CIE 1931 observer only;
 * its spectra serve all others, with the same curves. */
static command_options with_demo(const device_basis *b, bool is_demo) {
  command_options o = *b->options;
  if (!is_demo)
    return o;
  const bool needs_spectra =
      b->needs_spectra ||
      strcmp(ef_observer_name(b->observer), "cie-1931") != 0;
  o.display =
      needs_spectra ? "demo:kiosk-primaries" : "demo:kiosk-measurements";
  if (needs_spectra && o.tone == NULL)
    o.tone = "demo:kiosk-measurements";
  return o;
}

static ef_status load(const device_basis *b, chosen_device *out,
                      ef_error *error) {
  const command_options options = with_demo(b, out->is_demo);
  display *own = calloc(1, sizeof *own);
  out->own = own;
  if (own == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for a display");
  out->source = options.display;
  out->bits = options.match_bits >= 0 ? options.match_bits : DISPLAY_BITS;
  const ef_status status =
      display_load(&options, b->metric, b->notes, own, error);
  out->device = own->device;
  own->device = NULL;
  return status;
}

static void free_own(chosen_device *d) {
  if (d->own != NULL)
    display_free(d->own);
  free(d->own);
}

static void describe(text *out, const match_scene *s) {
  display own = *(const display *)s->device.own;
  own.device = s->device.device;
  const render_display r = {s->options, &own, s->metric, s->luminance_cd_m2};
  render_display_basis(out, &r);
}

/* ---- As data ----------------------------------------------------------- */

static void write_xyz(ef_json *j, const char *key, ef_xyz xyz) {
  ef_json_begin_object(j, key);
  ef_json_number(j, "X", xyz.X);
  ef_json_number(j, "Y", xyz.Y);
  ef_json_number(j, "Z", xyz.Z);
  ef_json_end_object(j);
}

/* Colour of one primary at full drive, the others at zero. */
static void write_full_drive(ef_json *j, const match_scene *s, size_t i) {
  double amount[EF_MAX_DRIVES] = {0.0};
  amount[i] = 1.0;
  const ef_xyz xyz = ef_setup_xyz(s->setup, amount, NULL);
  const ef_xyy c = ef_xyz_to_xyy(xyz);
  ef_json_begin_object(j, "full_drive");
  ef_json_number(j, "X", xyz.X);
  ef_json_number(j, "Y", xyz.Y);
  ef_json_number(j, "Z", xyz.Z);
  ef_json_number(j, "x", c.x);
  ef_json_number(j, "y", c.y);
  ef_json_end_object(j);
}

static void write_additivity(ef_json *j, const display *d) {
  if (d->additivity.known) {
    ef_json_begin_object(j, "white_against_sum");
    ef_json_number(j, "difference", d->additivity_difference);
    ef_json_number(j, "luminance_ratio", d->additivity.luminance_ratio);
    ef_json_end_object(j);
  }
  residuals_write(j, "mixtures_against_model", &d->residuals);
}

static void write(ef_json *j, const match_scene *s) {
  const display *d = s->device.own;
  const ef_device *device = s->device.device;
  ef_json_text(j, "known_from", display_origin_text(d->origin));
  ef_json_number(j, "luminance_cd_m2", s->luminance_cd_m2);
  write_xyz(j, "white", ef_setup_white(s->setup));
  write_xyz(j, "black", ef_setup_black(s->setup));
  ef_json_begin_array(j, "primaries");
  for (size_t i = 0; i < ef_device_n_drives(device); ++i) {
    ef_json_begin_object(j, NULL);
    ef_json_text(j, "name", ef_device_drive_name(device, i));
    write_full_drive(j, s, i);
    ef_json_text(j, "tone_curve", ef_device_curve_about(device, i));
    ef_json_end_object(j);
  }
  ef_json_end_array(j);
  write_additivity(j, d);
}

const device_kind device_display = {
    .key = "display",
    .option = "display",
    .illuminant = "D65",
    .demo_story = "on a ticket kiosk's display",
    .demo_device = "the demo's ticket kiosk",
    .words = {.noun = "display",
              .title = "Display",
              .shows = "show",
              .shown = "shown",
              .amounts = "Amount shown, %",
              .channel = "primary",
              .channels = "primaries",
              .spectra = "the spectra of its primaries",
              .none = "black",
              .all = "white"},
    .load = load,
    .free = free_own,
    .describe = describe,
    .write = write};
