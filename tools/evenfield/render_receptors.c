/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_receptors.h"

#include <math.h>

/* ---- Excitations ------------------------------------------------------- */

void render_receptors(text *out, size_t n, const description *const *row,
                      int decimals) {
  text_table t = table_new();
  table_column(&t, "Name", "", true);
  table_column(&t, "Excitation of cones", "L", false);
  table_column(&t, NULL, "M", false);
  table_column(&t, NULL, "S", false);
  table_column(&t, "Rods", "", false);
  table_column(&t, "Melanopsin", "", false);
  table_column(&t, "MacLeod-Boynton", "l", false);
  table_column(&t, NULL, "s", false);
  for (size_t i = 0; i < n; ++i) {
    const description *d = row[i];
    table_cell(&t, d->name);
    table_number(&t, d->lms.cone_l, decimals);
    table_number(&t, d->lms.cone_m, decimals);
    table_number(&t, d->lms.cone_s, decimals);
    table_number(&t, d->rod, decimals);
    table_number(&t, d->melanopsin, decimals);
    table_number(&t, d->mb.mb_l, 4);
    table_number(&t, d->mb.mb_s, 4);
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

/* ---- Alpha-opic quantities --------------------------------------------- */

/* The order in which CIE S 026 names them. */
static const ef_receptor order[EF_N_RECEPTORS] = {
    EF_S_CONE, EF_M_CONE, EF_L_CONE, EF_ROD, EF_MELANOPSIN};
static const char *const heads[EF_N_RECEPTORS] = {"S-cone", "M-cone", "L-cone",
                                                  "rhodopic", "melanopic"};

static void start(text_table *t, const char *what) {
  *t = table_new();
  table_column(t, "Name", "", true);
  for (size_t i = 0; i < EF_N_RECEPTORS; ++i)
    table_column(t, i == 0 ? what : NULL, heads[i], false);
}

static void add_five(text_table *t, double factor,
                     const double value[EF_N_RECEPTORS], int decimals) {
  for (size_t i = 0; i < EF_N_RECEPTORS; ++i)
    table_number(t, factor * value[order[i]], decimals);
}

/* Decimals that leave three digits of the largest. */
static int decimals_for(double largest) {
  if (!(largest > 0.0) || largest >= 100.0)
    return 1;
  const int decimals = 2 - (int)floor(log10(largest));
  return decimals > 9 ? 9 : decimals;
}

static void add_absolute(text *out, size_t n, const description *const *row) {
  double radiance = 0.0, luminance = 0.0;
  for (size_t i = 0; i < n; ++i) {
    for (size_t k = 0; k < EF_N_RECEPTORS; ++k) {
      radiance = fmax(radiance, 1e3 * row[i]->alpha.quantity[k]);
      luminance = fmax(luminance, row[i]->alpha.equivalent_d65[k]);
    }
  }
  text_table t;
  start(&t, "Alpha-opic radiance, mW m-2 sr-1");
  for (size_t i = 0; i < n; ++i) {
    table_cell(&t, row[i]->name);
    add_five(&t, 1e3, row[i]->alpha.quantity, decimals_for(radiance));
  }
  text_add(out, "\n");
  table_finish(&t, out);
  start(&t, "Equivalent daylight (D65) luminance, cd/m2");
  table_column(&t, "Scotopic", "luminance", false);
  for (size_t i = 0; i < n; ++i) {
    table_cell(&t, row[i]->name);
    add_five(&t, 1.0, row[i]->alpha.equivalent_d65, decimals_for(luminance));
    table_number(&t, row[i]->alpha.scotopic, decimals_for(luminance));
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

void render_alpha_opic(text *out, size_t n, const description *const *row,
                       bool is_absolute) {
  text_table t;
  if (is_absolute)
    add_absolute(out, n, row);
  start(&t, "Alpha-opic efficacy, mW/lm");
  for (size_t i = 0; i < n; ++i) {
    table_cell(&t, row[i]->name);
    add_five(&t, 1.0, row[i]->alpha.efficacy_mw_lm, 4);
  }
  text_add(out, "\n");
  table_finish(&t, out);
  start(&t, "The same against daylight (D65)");
  table_column(&t, "Scotopic", "/ photopic", false);
  for (size_t i = 0; i < n; ++i) {
    const ef_alpha_opic *a = &row[i]->alpha;
    table_cell(&t, row[i]->name);
    add_five(&t, 1.0, a->daylight_ratio, 4);
    table_number(&t, a->scotopic / a->photopic, 3);
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

/* ---- What they rest on ------------------------------------------------- */

void render_receptor_basis(text *out, const describe_scene *s,
                           bool has_lights) {
  char field[EF_NUMBER_TEXT];
  ef_number_format(ef_observer_field_deg(s->observer), field);
  text line = {0};
  if (ef_observer_cones_borrowed(s->observer)) {
    text_format(&line,
                "the CIE 2006 fundamentals for a field of %s degrees, "
                "since this observer has none of its own",
                field);
  } else {
    text_format(&line,
                "the observer's own fundamentals for a field of %s "
                "degrees",
                field);
  }
  text_add(&line, "; energy units, unit peak; MacLeod-Boynton coordinates by "
                  "CIE 170-2:2015");
  text_label(out, "Cones", &line);
  text_add(&line, "rods by V'(lambda) of the CIE (1951), melanopsin by CIE S "
                  "026/E:2018, unit peak");
  ef_cone_model model;
  if (ef_observer_model(s->observer, &model))
    text_add(&line, ", both behind the ocular media of this observer");
  text_label(out, "", &line);
  if (!has_lights)
    return;
  text_add(&line, "CIE S 026/E:2018, whose action spectra are those of its "
                  "standard observer of 32 years, whoever looks; scotopic "
                  "units with 1700 lm/W (CIE 018:2019)");
  text_label(out, "Alpha-opic", &line);
}
