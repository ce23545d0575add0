/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a file leaves open: surface or light, and the device value of full
 * drive. The settings come first, then the file's own lines, then a rule over
 * the first rows with a note that says what was assumed. */
#include "exchange/exchange_private.h"

#include <math.h>
#include <string.h>

#include "base/base_private.h"

static const char *file_name(const ef_reader *reader) {
  return reader->table.records.input->name;
}

/* ---- From settings and remarks ----------------------------------------- */

static ef_status read_device_max(ef_reader *reader, ef_error *error) {
  const ef__remarks *const remarks = &reader->table.remarks;
  const ef__span text = ef__span_of(remarks->device_max);
  double value = 0;
  const bool is_number = ef_number_parse(text.text, text.length, '.', &value) ||
                         ef_number_parse(text.text, text.length, ',', &value);
  if (is_number && value > 0) {
    reader->limits.device_max = value;
    return EF_OK;
  }
  char quoted[EF__QUOTED];
  ef__error_set(error, EF_MALFORMED,
                "found %s behind %s, expected a number above "
                "zero, such as 255",
                ef__quote(text, quoted),
                reader->table.records.cgats != NULL ? "DEVICE_MAX"
                                                    : "'# device_max:'");
  ef__error_place(error, file_name(reader), remarks->device_max_line, 0, NULL);
  return EF_MALFORMED;
}

static void decide_kind(ef_reader *reader) {
  const ef__remarks *const remarks = &reader->table.remarks;
  const ef_kind_choice asked = reader->settings.kind;
  int said = ef__quantity_kind(remarks->quantity);
  const bool is_radiance = ef__unit_is_radiance(remarks->unit) ||
                           ef__unit_is_radiance(remarks->quantity);
  if (said == 0) said = ef__quantity_kind(remarks->unit);
  if (said == 0 && is_radiance) said = -1;
  if (asked == EF_KIND_FUNCTION) {
    reader->limits.kind = EF_LIGHT;
    reader->limits.any_sign = true;
    return;
  }
  if (asked == EF_KIND_AUTO) {
    reader->limits.kind = said < 0 ? EF_LIGHT : EF_SURFACE;
    reader->limits.kind_is_assumed = said == 0;
    return;
  }
  reader->limits.kind = asked == EF_KIND_LIGHT ? EF_LIGHT : EF_SURFACE;
  if (said == 0 || (said < 0) == (asked == EF_KIND_LIGHT)) return;
  ef__note(reader->settings.notes,
           "%s: read as %s as asked, though the file says %s",
           file_name(reader),
           asked == EF_KIND_LIGHT ? "lights" : "surfaces",
           said < 0 ? "light" : "surface");
}

/* Colours are of lights only where somebody says so: nothing in their numbers
 * tells. */
static void decide_colour_kind(ef_reader *reader) {
  const ef_kind_choice asked = reader->settings.kind;
  const bool says_light =
      ef__quantity_kind(reader->table.remarks.quantity) < 0;
  reader->limits.kind =
      asked == EF_KIND_LIGHT || (asked == EF_KIND_AUTO && says_light)
          ? EF_LIGHT
          : EF_SURFACE;
}

/* Only where the unit line says so: dark samples in percent would pass for
 * ratios, bright ones for lights, and a quantity line may speak of inks. */
static void decide_percent(ef_reader *reader) {
  reader->limits.is_percent =
      reader->limits.kind == EF_SURFACE &&
      ef__unit_is_percent(reader->table.remarks.unit);
}

ef_status ef__decide_from_remarks(ef_reader *reader, ef_error *error) {
  const double asked = reader->settings.device_max;
  const ef_content content = reader->layout.content;
  if (content == EF_CONTENT_SPECTRA) {
    decide_kind(reader);
    decide_percent(reader);
  }
  if (content == EF_CONTENT_XYZ || content == EF_CONTENT_XYY) {
    decide_colour_kind(reader);
  }
  reader->limits.device_max = 1;
  if (reader->layout.n_device == 0) return EF_OK;
  if (asked > 0) {
    reader->limits.device_max = asked;
    return EF_OK;
  }
  if (reader->table.remarks.device_max[0] != '\0') {
    return read_device_max(reader, error);
  }
  reader->limits.device_max_is_assumed = true;
  return EF_OK;
}

/* ---- From values ------------------------------------------------------- */

static const char *rows_text(const ef_reader *reader) {
  return reader->source_ended ? "its rows" : "the first rows";
}

/* Like the check of surfaces, a little noise below zero allowed. */
static void assume_kind(ef_reader *reader, ef__range value) {
  const bool is_surface = value.lowest >= -0.02 && value.highest <= 2;
  char low[EF_NUMBER_TEXT];
  char high[EF_NUMBER_TEXT];
  ef_number_format(value.lowest, low);
  ef_number_format(value.highest, high);
  reader->limits.kind = is_surface ? EF_SURFACE : EF_LIGHT;
  if (is_surface) {
    ef__note(reader->settings.notes,
             "%s: read as surfaces (ratios): no '# quantity:' line says what "
             "the values are, and those of %s lie in %s to %s; for lights add "
             "'# quantity: light'",
             file_name(reader), rows_text(reader), low, high);
    return;
  }
  ef__note(reader->settings.notes,
           "%s: read as lights: no '# quantity:' line says what the values "
           "are, and those of %s lie in %s to %s; for reflectances in percent "
           "add '# quantity: reflectance' and '# unit: percent'",
           file_name(reader), rows_text(reader), low, high);
}

static void assume_device_max(ef_reader *reader, ef__range device) {
  const char *const *const letter = reader->layout.device_letter;
  const bool is_ink = letter[0][0] == 'C';
  const bool is_fraction = device.highest <= 1;
  const char *const most = is_fraction ? "1" : is_ink ? "100" : "255";
  reader->limits.device_max = is_fraction ? 1 : is_ink ? 100 : 255;
  ef__note(reader->settings.notes,
           "%s: %s,%s,%s read as 0 to %s: %s value of %s is above 1, and no "
           "'# device_max:' line says otherwise",
           file_name(reader), letter[0], letter[1], letter[2], most,
           is_fraction ? "no" : "a", rows_text(reader));
}

static void note_relative(const ef_reader *reader) {
  const ef__remarks *const remarks = &reader->table.remarks;
  if (reader->limits.kind != EF_LIGHT || reader->head.absolute) return;
  if (remarks->unit[0] == '\0') return;
  char quoted[EF__QUOTED];
  ef__note(reader->settings.notes,
           "%s: values are relative: the unit %s is not W sr^-1 m^-2 nm^-1",
           file_name(reader), ef__quote(ef__span_of(remarks->unit), quoted));
}

static bool is_absolute(const ef_reader *reader) {
  const ef__remarks *const remarks = &reader->table.remarks;
  switch (reader->layout.content) {
  case EF_CONTENT_SPECTRA:
    return reader->limits.kind == EF_LIGHT &&
           (ef__unit_is_radiance(remarks->unit) ||
            ef__unit_is_radiance(remarks->quantity));
  case EF_CONTENT_XYZ:
  case EF_CONTENT_XYY:
    return ef__unit_is_luminance(remarks->unit) ||
           ef__unit_is_luminance(remarks->quantity);
  case EF_CONTENT_LAB:
  case EF_CONTENT_DEVICE: break;
  }
  return false;
}

void ef__decide_from_values(ef_reader *reader, size_t n_rows, ef__range value,
                            ef__range device) {
  const bool is_spectra = reader->layout.content == EF_CONTENT_SPECTRA;
  if (n_rows > 0 && reader->limits.kind_is_assumed) assume_kind(reader, value);
  if (n_rows > 0 && reader->limits.device_max_is_assumed) {
    assume_device_max(reader, device);
  }
  reader->head.absolute = is_absolute(reader);
  if (is_spectra) note_relative(reader);
}
