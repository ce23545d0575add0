/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_profile_text.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "text.h"
#include "words.h"

/* A person reads so many rows: those that are off most. */
enum { MOST_ROWS = 10 };

/* ---- The answer ---------------------------------------------------------- */

static void add_jnds(const measure *m, double value, text *t) {
  if (isnan(m->jnd))
    return;
  char jnds[EF_NUMBER_TEXT];
  ef_number_format_fixed(value / m->jnd, 1, jnds);
  text_format(t, " (%s JND)", jnds);
}

static void add_fit(const profile_fit *f, text *out) {
  const char *symbol = ef_metric_symbol(f->measure.metric);
  const tally *sum = &f->tally;
  char mean[EF_NUMBER_TEXT], p95[EF_NUMBER_TEXT], worst[EF_NUMBER_TEXT];
  words_amount(sum->mean, mean);
  words_amount(sum->p95, p95);
  words_amount(sum->worst, worst);
  text t = {0};
  if (f->is_made)
    text_format(&t, "Wrote %.400s: it", f->path);
  else
    text_format(&t, "%.400s", f->path);
  text_format(&t,
              " describes %zu %s colours%s to %s %s on average; 95 %% of them "
              "are off by less than %s, the worst by %s %s",
              sum->n, f->from_model ? "computed" : "measured",
              f->from_model ? " of the display" : "", mean, symbol, p95, worst,
              symbol);
  add_jnds(&f->measure, sum->worst, &t);
  text_add(&t, ".");
  text_paragraph(out, &t, 0);
}

static void add_verdict(const profile_fit *f, text *out) {
  if (!f->options->check)
    return;
  char tolerance[EF_NUMBER_TEXT];
  ef_number_format(f->measure.tolerance, tolerance);
  text t = {0};
  if (f->row == NULL) {
    text_format(&t, "The check %s: %s.",
                profile_fit_fails(f) ? "fails" : "holds",
                profile_fit_fails(f) ? "required tags are not there"
                                     : "all required tags are there");
  } else {
    text_format(&t,
                "The check %s: %zu of %zu colours %s off by more than the "
                "tolerance of %s %s%s.",
                profile_fit_fails(f) ? "fails" : "holds", f->n_beyond,
                f->tally.n, f->n_beyond == 1 ? "is" : "are", tolerance,
                ef_metric_symbol(f->measure.metric),
                f->info.missing[0] != '\0' ? ", and required tags are not there"
                                           : "");
  }
  text_paragraph(out, &t, 0);
}

static void add_answer(const profile_fit *f, text *out) {
  text t = {0};
  if (f->row != NULL) {
    add_fit(f, out);
    if (f->info.missing[0] != '\0') {
      text_format(&t,
                  "It lacks tags that ICC.1:2022 requires of its class: "
                  "%s.",
                  f->info.missing);
      text_paragraph(out, &t, 0);
    }
  } else if (f->info.missing[0] != '\0') {
    text_format(&t,
                "%.400s lacks tags that ICC.1:2022 requires of its class: "
                "%s.",
                f->path, f->info.missing);
    text_paragraph(out, &t, 0);
  } else {
    text_format(&t,
                "%.400s can be read and holds every tag that ICC.1:2022 "
                "requires of its class.",
                f->path);
    text_paragraph(out, &t, 0);
  }
  add_verdict(f, out);
}

/* ---- The worst rows ------------------------------------------------------ */

static int by_difference(const void *a, const void *b) {
  const fit_row *const *p = a, *const *q = b;
  const double x = (*p)->difference, y = (*q)->difference;
  if (x != y)
    return x < y ? 1 : -1;
  return (*p > *q) - (*p < *q); /* in file order */
}

static void add_heads(const profile_fit *f, text_table *t) {
  const char *names[EF_MAX_DRIVES];
  profile_channel_names(&f->info, names);
  if (!f->from_model)
    table_column(t, f->has_names ? "Colour" : "Line", "", f->has_names);
  for (size_t i = 0; i < f->info.n_channels; ++i)
    table_column(t, i == 0 ? "Device value, %" : NULL, names[i], false);
  table_column(t, f->from_model ? "Computed" : "Measured", "L*", false);
  table_column(t, NULL, "a*", false);
  table_column(t, NULL, "b*", false);
  table_column(t, "The profile says", "L*", false);
  table_column(t, NULL, "a*", false);
  table_column(t, NULL, "b*", false);
  table_column(t, "Off by", ef_metric_symbol(f->measure.metric), false);
}

static void add_lab(text_table *t, ef_xyz xyz, ef_xyz white) {
  const ef_lab lab = ef_xyz_to_lab(xyz, white);
  table_number(t, lab.L_star, 1);
  table_number(t, lab.a_star, 1);
  table_number(t, lab.b_star, 1);
}

static void add_row(const profile_fit *f, const fit_row *row, text_table *t) {
  const size_t i = (size_t)(row - f->row);
  if (f->has_names && !f->from_model)
    table_cell(t, f->rows.name[i]);
  else if (!f->from_model)
    table_format(t, "%zu", f->rows.line[i]);
  for (size_t k = 0; k < f->info.n_channels; ++k)
    table_number(t, 100.0 * f->rows.device[i * f->rows.n_device + k], 1);
  add_lab(t, row->measured, row->white);
  add_lab(t, row->predicted, row->white);
  table_number(t, row->difference, 2);
}

static void add_worst(const profile_fit *f, text *out) {
  const size_t n = f->rows.n, n_shown = n < MOST_ROWS ? n : MOST_ROWS;
  const fit_row **sorted = malloc(n * sizeof *sorted);
  if (sorted == NULL) {
    out->failed = true;
    return;
  }
  for (size_t i = 0; i < n; ++i)
    sorted[i] = &f->row[i];
  qsort(sorted, n, sizeof *sorted, by_difference);
  if (n_shown < n)
    text_format(out,
                "\nThe %zu colours that are off most (--format csv or "
                "json gives all %zu):\n",
                n_shown, n);
  else
    text_add(out, "\nAll colours, the worst first:\n");
  text_table t = table_new();
  add_heads(f, &t);
  for (size_t i = 0; i < n_shown; ++i)
    add_row(f, sorted[i], &t);
  table_finish(&t, out);
  free(sorted);
}

/* ---- What it rests on ---------------------------------------------------- */

static void add_display(const profile_fit *f, text *out) {
  const display *d = &f->display;
  text t = {0};
  text_format(&t, "%s (%s), known from %s", ef_device_name(d->device),
              d->source, display_origin_text(d->origin));
  if (!isnan(f->options->ambient_lux)) {
    char lux[EF_NUMBER_TEXT], reflectance[EF_NUMBER_TEXT];
    ef_number_format(f->options->ambient_lux, lux);
    ef_number_format(f->options->reflectance, reflectance);
    text_format(&t, ", with %s lux on a screen of reflectance %s", lux,
                reflectance);
  }
  text_label(out, "Display", &t);
}

static void add_profile(const profile_fit *f, text *out) {
  text t = {0};
  text_format(&t, "\"%s\": ", f->info.description);
  profile_file_words(&f->info, &t);
  if (f->is_made)
    text_format(&t,
                ", %zu bytes; the white goes to D50 by linear Bradford "
                "(tag chad), the black is laid into the curves",
                f->n_bytes);
  text_label(out, "Profile", &t);
}

static void add_measurements(const profile_fit *f, text *out) {
  const bool is_ink = strcmp(f->info.space, "RGB") != 0;
  text t = {0};
  if (f->from_model) {
    text_format(&t,
                "none: %zu colours in even steps of the drives, as the "
                "additive model of the display has them; how far the model "
                "holds for the real display is not known from this",
                f->rows.n);
  } else {
    text_format(&t, "%zu rows of %s (%s), CIE 1931", f->rows.n, f->source,
                f->about);
    if (f->is_made)
      text_add(&t, "; the profile was made from the same rows, so this tells "
                   "how far its model fits, not how the display drifts");
  }
  if (f->settings.intent == EF_INTENT_ABSOLUTE)
    text_add(&t, "; taken as under D50, Y = 100 for the perfect reflecting "
                 "diffuser");
  else
    text_format(&t, "; the %s goes to D50 %s",
                is_ink ? "bare medium (all inks 0)" : "white (full drive)",
                is_ink ? "by the ratios of X, Y and Z" : "by linear Bradford");
  text_label(out, "Measurements", &t);
}

static void add_basis(const profile_fit *f, text *out) {
  text_add(out, "\nWhat this rests on:\n");
  if (f->is_made)
    add_display(f, out);
  add_profile(f, out);
  if (f->row == NULL)
    return;
  add_measurements(f, out);
  text t = {0};
  profile_intent_words(f->settings.intent, f->settings.black_point_compensation,
                       &t);
  text_label(out, "Intent", &t);
  measure_label(&f->measure, out);
}

static void add_intents(const profile_fit *f, text *out) {
  if (f->row != NULL)
    return;
  text t = {0};
  size_t n = 0;
  for (int i = EF_INTENT_PERCEPTUAL; i <= EF_INTENT_ABSOLUTE; ++i) {
    if (f->info.has_intent[i])
      text_format(&t, "%s%s", n++ == 0 ? "" : ", ", ef_intent_name((ef_intent)i));
  }
  text_add(&t, n > 0 ? "" : "none has a table of its own");
  text_label(out, "Intents", &t);
  const ef_xyz white = f->info.media_white;
  text_format(&t, "X %.2f, Y %.2f, Z %.2f (tag wtpt)", white.X, white.Y,
              white.Z);
  text_label(out, "Medium white", &t);
  text_add(&t, "name a file of measurements behind the profile to learn how "
               "well it describes its device");
  text_label(out, "Not known", &t);
}

static const char closing[] =
    "These figures hold for the colours that were compared. A device changes "
    "with warmth, age and settings: measure again when a decision hangs on it.";

ef_status render_profile_text(const profile_fit *f, ef_output *output,
                              ef_error *error) {
  text out = {0};
  add_answer(f, &out);
  if (f->row != NULL)
    add_worst(f, &out);
  add_basis(f, &out);
  add_intents(f, &out);
  if (f->row != NULL) {
    text_add(&out, "\n");
    text_wrap(&out, closing, 0);
  }
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}
