/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_isolate.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "words.h"

const char *isolate_receptor_words(size_t receptor) {
  static const char *const words[EF_N_RECEPTORS] = {"L", "M", "S", "rods",
                                                    "melanopsin"};
  return words[receptor];
}

/* A sign and a number. */
enum { PERCENT_ROOM = EF_NUMBER_TEXT + 1 };

/* Three digits of a contrast in percent, as many decimals as 1e-6 takes at
 * most; `sign` 1 for a plus before what is above zero, else 0. */
static void write_percent(double contrast, size_t sign,
                          char out[PERCENT_ROOM]) {
  const double percent = 100.0 * contrast, nothing = 5e-7;
  int decimals = words_decimals(percent, 3);
  /* 99.96 is rounded to 100, which has three digits before its point. */
  if (decimals > 0 && round(fabs(percent) * pow(10.0, decimals)) >= 1000.0)
    --decimals;
  const bool is_there = fabs(percent) >= nothing;
  char digits[EF_NUMBER_TEXT] = "";
  if (isnan(percent))
    snprintf(digits, sizeof digits, "-");
  else if (!is_there)
    snprintf(digits, sizeof digits, "0");
  else
    ef_number_format_fixed(percent, decimals > 6 ? 6 : decimals, digits);
  const size_t before = is_there && percent > 0.0 ? sign : 0;
  out[0] = '+';
  memcpy(out + before, digits, sizeof digits);
}

static void add_percent(text *t, double contrast) {
  char number[PERCENT_ROOM];
  write_percent(contrast, 1, number);
  text_format(t, "%s %%", number);
}

void isolate_add_size(text *t, double size) {
  char number[PERCENT_ROOM];
  write_percent(size, 0, number);
  text_format(t, "%s %%", number);
}

static void add_figure(text *t, double value, int digits) {
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(value, words_decimals(value, digits), number);
  text_add(t, number);
}

/* ---- The answer -------------------------------------------------------- */

static size_t count_role(const ef_isolation *way, ef_receptor_role role) {
  size_t n = 0;
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k)
    n += way->role[k] == role;
  return n;
}

/* Between the parts of a list of n. */
static const char *between(size_t i, size_t n) {
  return i == 0 ? "" : i + 1 == n ? " and " : ", ";
}

static void add_names(text *t, const ef_isolation *way, ef_receptor_role role) {
  const size_t n = count_role(way, role);
  size_t i = 0;
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k) {
    if (way->role[k] == role)
      text_format(t, "%s%s", between(i++, n), isolate_receptor_words(k));
  }
}

static bool is_largest(const ef_isolation *way) {
  const double rounding = 1e-9;
  return way->along >= way->largest * (1.0 - rounding);
}

static void add_changes(text *t, const isolate_result *r) {
  const ef_isolation *way = &r->way;
  const size_t n = count_role(way, EF_RECEPTOR_CHANGED);
  size_t i = 0;
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k) {
    if (way->role[k] != EF_RECEPTOR_CHANGED)
      continue;
    if (i == 0) {
      text_format(t, "%s changes by %s", isolate_receptor_words(k),
                  is_largest(way) ? "up to " : "");
    } else {
      text_format(t, "%s%s by ", between(i, n), isolate_receptor_words(k));
    }
    if (n == 1 && way->contrast[k] > 0.0)
      isolate_add_size(t, way->contrast[k]);
    else
      add_percent(t, way->contrast[k]);
    ++i;
  }
  if (way->modulation_kind == EF_SYMMETRIC)
    text_add(t, n == 1 ? " either way" : ", and the other way round");
}

static void add_silence(text *t, const isolate_scene *s,
                        const isolate_result *r) {
  const ef_isolation *way = &r->way;
  const size_t n = count_role(way, EF_RECEPTOR_SILENT);
  if (n == 0)
    return;
  text_add(t,
           count_role(way, EF_RECEPTOR_CHANGED) == 1 ? " while " : ", while ");
  if (!s->options->robust) {
    add_names(t, way, EF_RECEPTOR_SILENT);
    text_add(t, n == 1 ? " stays silent" : " stay silent");
    return;
  }
  size_t i = 0;
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k) {
    if (way->role[k] != EF_RECEPTOR_SILENT)
      continue;
    text_format(t, "%s%s %s", between(i, n), isolate_receptor_words(k),
                i == 0 ? "changes by " : "by ");
    add_percent(t, way->contrast[k]);
    ++i;
  }
}

static void add_answer(text *out, const isolate_scene *s,
                       const isolate_result *r) {
  const ef_isolation *way = &r->way;
  text t = {0};
  add_changes(&t, r);
  add_silence(&t, s, r);
  text_add(&t, "; luminance changes by ");
  add_percent(&t, way->luminance_change);
  text_add(&t, ".");
  text_paragraph(out, &t, 0);
  if (!is_largest(way)) {
    text_add(&t, "The display could go ");
    add_figure(&t, way->largest / way->along, 3);
    text_add(&t, " times as far.");
    text_paragraph(out, &t, 0);
  }
  if (count_role(way, EF_RECEPTOR_IGNORED) > 0) {
    text_add(&t, "Not looked after: ");
    const size_t n = count_role(way, EF_RECEPTOR_IGNORED);
    size_t i = 0;
    for (size_t k = 0; k < EF_N_RECEPTORS; ++k) {
      if (way->role[k] != EF_RECEPTOR_IGNORED)
        continue;
      text_format(&t, "%s%s %s", between(i, n), isolate_receptor_words(k),
                  i > 0         ? "by "
                  : k == EF_ROD ? "change by "
                                : "changes by ");
      add_percent(&t, way->contrast[k]);
      ++i;
    }
    text_add(&t, ".");
    text_paragraph(out, &t, 0);
  }
}

/* The largest of something over the silent receptors. */
static size_t worst_silent(const isolate_result *r) {
  size_t worst = EF_N_RECEPTORS;
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k) {
    if (r->way.role[k] == EF_RECEPTOR_SILENT &&
        (worst == EF_N_RECEPTORS || r->spread[k].p95 > r->spread[worst].p95))
      worst = k;
  }
  return worst;
}

static void add_people_answer(text *out, const isolate_scene *s,
                              const isolate_result *r) {
  const size_t worst = worst_silent(r);
  if (s->people.population == NULL || worst == EF_N_RECEPTORS)
    return;
  text t = {0};
  text_add(&t, "Of ");
  people_add_who(&t, &s->people);
  text_format(&t, ", one in twenty gets ");
  isolate_add_size(&t, r->spread[worst].p95);
  text_format(&t, " or more in %s, which should be silent (%s).",
              isolate_receptor_words(worst),
              s->options->robust ? "the least there is for all of them together"
                                 : "--robust looks for less");
  text_paragraph(out, &t, 0);
}

static void add_codes_answer(text *out, const isolate_result *r) {
  const ef_coded *c = &r->coded;
  text t = {0};
  const isolate_show *show = &r->show;
  if (show->has_dither && count_role(&r->way, EF_RECEPTOR_SILENT) > 0) {
    text_format(&t,
                "Dithered in %d-bit codes, what should be silent gets at most ",
                c->bits);
    isolate_add_size(&t, show->dither.residual);
    text_add(&t, " on average over 8 x 8 pixels and 16 frames.");
    text_paragraph(out, &t, 0);
    return;
  }
  if (c->below_resolution && !show->has_dither &&
      !isnan(c->smallest_contrast)) {
    text_format(&t,
                "%d-bit codes cannot show that contrast: the smallest step "
                "along the direction is ",
                c->bits);
    add_figure(&t, c->smallest_contrast / r->way.along, 3);
    text_add(&t, " times as large. More bits or dithering can.");
    text_paragraph(out, &t, 0);
    return;
  }
  if (count_role(&r->way, EF_RECEPTOR_SILENT) == 0)
    return;
  text_format(&t, "Shown in %d-bit codes, what should be silent gets at most ",
              c->bits);
  isolate_add_size(&t, c->residual);
  text_add(&t, " (");
  isolate_add_size(&t, c->rounded_residual);
  text_add(&t, " with plainly rounded codes).");
  text_paragraph(out, &t, 0);
}

/* ---- Tables ------------------------------------------------------------ */

static void add_primaries(text *out, const isolate_scene *s,
                          const isolate_result *r) {
  const ef_isolation *way = &r->way;
  const bool both = way->modulation_kind == EF_SYMMETRIC;
  double high[EF_MAX_DRIVES], low[EF_MAX_DRIVES];
  double at[EF_MAX_DRIVES], at_high[EF_MAX_DRIVES], at_low[EF_MAX_DRIVES];
  isolate_extreme(way, 1.0, high);
  isolate_extreme(way, -1.0, low);
  isolate_drives(s, way->background, at);
  isolate_drives(s, high, at_high);
  isolate_drives(s, low, at_low);
  text_table t = table_new();
  char codes[40];
  text head = {0};
  text_format(&head, "Codes, %d bits", s->options->bits);
  table_column(&t, "Primary", "", true);
  table_column(&t, "Amount of light, %", "background", false);
  table_column(&t, NULL, "change", false);
  table_column(&t, "Drive, %", "background", false);
  table_column(&t, NULL, both ? "high" : "pulse", false);
  if (both)
    table_column(&t, NULL, "low", false);
  ef_number_format_fixed((double)s->options->bits, 0, codes);
  table_column(&t, head.bytes != NULL ? head.bytes : "Codes", "background",
               false);
  table_column(&t, NULL, both ? "high" : "pulse", false);
  if (both)
    table_column(&t, NULL, "low", false);
  for (size_t i = 0; i < way->n_primaries; ++i) {
    char change[EF_NUMBER_TEXT];
    ef_number_format_fixed(100.0 * way->modulation[i], 3, change);
    table_cell(&t, ef_device_drive_name(s->display.device, i));
    table_number(&t, 100.0 * way->background[i], 3);
    table_format(&t, "%s%s", way->modulation[i] > 0.0 ? "+" : "", change);
    table_number(&t, 100.0 * at[i], 3);
    table_number(&t, 100.0 * at_high[i], 3);
    if (both)
      table_number(&t, 100.0 * at_low[i], 3);
    table_format(&t, "%u", (unsigned)r->coded.background[i]);
    table_format(&t, "%u", (unsigned)r->coded.high[i]);
    if (both)
      table_format(&t, "%u", (unsigned)r->coded.low[i]);
  }
  text_add(out, "\n");
  table_finish(&t, out);
  text_free(&head);
}

static void percent_cell(text_table *t, double contrast) {
  char number[PERCENT_ROOM];
  write_percent(contrast, 1, number);
  table_cell(t, number);
}

static void size_cell(text_table *t, double size) {
  char number[PERCENT_ROOM];
  write_percent(size, 0, number);
  table_cell(t, number);
}

static void add_receptors(text *out, const isolate_scene *s,
                          const isolate_result *r) {
  const ef_isolation *way = &r->way;
  const bool both = way->modulation_kind == EF_SYMMETRIC;
  const bool has_people = s->people.population != NULL;
  static const char *const roles[] = {"ignored", "silent", "changes"};
  text_table t = table_new();
  table_column(&t, "Receptor", "", true);
  table_column(&t, "Wanted", "", true);
  table_column(&t, "Contrast, %", "exact", false);
  table_column(&t, NULL, both ? "codes high" : "codes", false);
  if (both)
    table_column(&t, NULL, "codes low", false);
  if (has_people) {
    table_column(&t, "People off by, %", "r.m.s.", false);
    table_column(&t, NULL, "1 in 20", false);
    table_column(&t, NULL, "worst", false);
  }
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k) {
    table_cell(&t, isolate_receptor_words(k));
    table_cell(&t, roles[way->role[k]]);
    percent_cell(&t, way->contrast[k]);
    percent_cell(&t, r->coded.contrast_high[k]);
    if (both)
      percent_cell(&t, r->coded.contrast_low[k]);
    if (has_people) {
      size_cell(&t, r->spread[k].rms);
      size_cell(&t, r->spread[k].p95);
      size_cell(&t, r->spread[k].worst);
    }
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

/* ---- Figures ----------------------------------------------------------- */

static void add_limits(text *t, const isolate_scene *s,
                       const ef_isolation *way) {
  const ef_device *device = s->display.device;
  size_t n = 0;
  for (size_t i = 0; i < way->n_primaries; ++i) {
    for (int high = 0; high < 2; ++high) {
      const uint32_t held = high ? way->held_high : way->held_low;
      if (held >> i & 1u) {
        text_format(t, "%s%s", n++ == 0 ? "" : ", ",
                    ef_device_limit_name(device, i, high == 1));
      }
    }
  }
}

/* "L by +39.7 % and M by -91.8 %". */
static void add_unit(text *t, const ef_isolation *way) {
  const size_t n = count_role(way, EF_RECEPTOR_CHANGED);
  size_t i = 0;
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k) {
    if (way->role[k] != EF_RECEPTOR_CHANGED)
      continue;
    text_format(t, "%s%s by ", between(i++, n), isolate_receptor_words(k));
    add_percent(t, way->direction[k]);
  }
}

static void add_reach(text *out, const isolate_scene *s,
                      const isolate_result *r) {
  const ef_isolation *way = &r->way;
  text t = {0};
  add_figure(&t, way->largest, 4);
  text_format(&t, " along the direction (%s)", s->direction_text);
  if (way->held_low != 0 || way->held_high != 0) {
    text_add(&t, ", held by ");
    add_limits(&t, s, way);
  }
  text_add(&t, "; 1 along it changes ");
  add_unit(&t, way);
  text_label(out, "Largest", &t);
  isolate_add_size(&t, way->pooled_contrast);
  text_add(&t, ", the root of the summed squares of the contrasts of L, M "
               "and S");
  text_label(out, "Pooled", &t);
  add_figure(&t, way->condition_number, 4);
  text_format(&t,
              " for %zu receptors by %zu primaries: errors of the spectra "
              "grow by up to this factor in the modulation",
              way->n_controlled, way->n_primaries);
  text_label(out, "Condition", &t);
}

static void add_steps(text *out, const isolate_scene *s,
                      const isolate_result *r) {
  const ef_coded *c = &r->coded;
  text t = {0};
  if (isnan(c->smallest_contrast)) {
    text_add(&t, "none within 12 codes of the background leads along the "
                 "direction with a tenth of it at most going elsewhere");
  } else {
    add_figure(&t, c->smallest_contrast, 3);
    text_add(&t, " along the direction, codes ");
    for (size_t i = 0; i < r->way.n_primaries; ++i)
      text_format(&t, "%s%u", i == 0 ? "" : " ", (unsigned)c->smallest[i]);
    char steps[EF_NUMBER_TEXT];
    ef_number_format_fixed(floor(r->way.along / c->smallest_contrast), 0,
                           steps);
    text_format(&t,
                "; the modulation is %s such steps (a step counts when a "
                "tenth of it at most goes elsewhere)",
                steps);
  }
  (void)s;
  text_label(out, "Least step", &t);
}

/* What the rods get may be seen: it is not nothing, and they are not
 * saturated. */
static bool rods_take_part(const isolate_result *r) {
  const double saturated_td = 5000.0, nothing = 1e-3;
  return r->eye.scotopic_td < saturated_td &&
         fabs(r->way.contrast[EF_ROD]) > nothing;
}

static void add_eye(text *out, const isolate_scene *s,
                    const isolate_result *r) {
  text t = {0};
  char size[EF_NUMBER_TEXT];
  if (!r->has_eye) {
    text_add(&t, "not known: the spectra are relative, not in W sr-1 m-2 "
                 "nm-1, so that there are no luminances, trolands, irradiances "
                 "or hazards");
    text_label(out, "Background", &t);
    return;
  }
  const ef_retinal *e = &r->eye;
  add_figure(&t, e->luminance_cd_m2, 4);
  text_add(&t, " cd/m2; pupil ");
  add_figure(&t, e->pupil_diameter_mm, 3);
  text_format(&t, " mm (%s); ", ef_pupil_name(s->pupil.formula));
  add_figure(&t, e->photopic_td, 4);
  text_add(&t, " photopic and ");
  add_figure(&t, e->scotopic_td, 4);
  text_add(&t, " scotopic trolands");
  if (rods_take_part(r)) {
    text_add(&t, ". Rods still take part here: they saturate at 2000 to "
                 "5000 (Aguilar & Stiles 1954, from memory)");
  }
  text_label(out, "Background", &t);
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k) {
    text_format(&t, "%s%s ", k == 0 ? "" : ", ",
                ef_receptor_symbol((ef_receptor)k));
    add_figure(&t, 1000.0 * e->irradiance_w_m2[k], 3);
  }
  text_add(&t, " mW/m2; melanopic equivalent daylight (D65) ");
  add_figure(&t, e->equivalent_d65_lx[EF_MELANOPSIN], 3);
  ef_number_format_fixed(r->field_deg, words_decimals(r->field_deg, 3), size);
  text_format(&t,
              " lx; alpha-opic irradiances (CIE S 026) at the cornea of a "
              "disc of %s degrees",
              size);
  text_label(out, "Irradiance", &t);
}

static void add_cautions(text *out, const isolate_result *r) {
  text_add(out, "\nCautions:\n");
  for (size_t i = 0; i < r->n_cautions; ++i) {
    text t = {0};
    const char first = r->caution[i][0];
    const bool is_small = first >= 'a' && first <= 'z';
    text_format(&t, "%c%s.", is_small ? first - 'a' + 'A' : first,
                r->caution[i] + 1);
    if (out->report != NULL && !t.failed) {
      ef_error ignored; /* `failed` remembers it */
      text_flush(out, &ignored);
      ef_report_caution(out->report, t.bytes);
      text_free(&t);
      continue;
    }
    text_add(out, "  ");
    text_paragraph(out, &t, 4);
  }
}

void isolate_text_add(text *out, const isolate_scene *s,
                      const isolate_result *r) {
  add_answer(out, s, r);
  add_codes_answer(out, r);
  add_people_answer(out, s, r);
  if (s->demo_display) {
    text_wrap(out,
              "No display was named, so this is the built-in demo: the vision "
              "laboratory's stimulator (demo:lab-display).",
              0);
  }
  add_primaries(out, s, r);
  add_receptors(out, s, r);
  text_add(out, "\nHow far and how finely:\n");
  add_reach(out, s, r);
  add_steps(out, s, r);
  if (r->show.frames != NULL)
    render_isolate_frames(out, s, r);
  text_add(out, "\nAt the eye:\n");
  add_eye(out, s, r);
  add_cautions(out, r);
  render_isolate_basis(out, s, r);
}

ef_status isolate_text_write(const isolate_scene *s, const isolate_result *r,
                             ef_output *output, ef_error *error) {
  text out = {0};
  isolate_text_add(&out, s, r);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}
