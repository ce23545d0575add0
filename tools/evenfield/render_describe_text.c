/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_describe.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "render_receptors.h"
#include "text.h"
#include "words.h"

/* A person reads so many rows. */
enum { MOST_ROWS = 200 };
enum { NAME_ROOM = 128 };

/* The smallest and the largest of a quantity, and whose they are. */
typedef struct range {
  size_t n;
  double low, high;
  char low_name[NAME_ROOM], high_name[NAME_ROOM];
} range;

struct describe_text {
  description row[MOST_ROWS];
  char *name[MOST_ROWS]; /* of the rows, owned */
  size_t n_rows;
  size_t n_lights, n_surfaces, n_colours;
  bool has_cones, has_alpha;
  size_t n_spectral_lights, n_daylights; /* near one of the CIE's */
  const char *daylight_of;               /* the last of these */
  double daylight_distance;
  range lightness, chroma, temperature, rendering;
};

/* ---- Collecting -------------------------------------------------------- */

static void extend(range *r, double value, const char *name) {
  if (isnan(value))
    return;
  if (r->n == 0 || value < r->low) {
    r->low = value;
    snprintf(r->low_name, NAME_ROOM, "%s", name);
  }
  if (r->n == 0 || value > r->high) {
    r->high = value;
    snprintf(r->high_name, NAME_ROOM, "%s", name);
  }
  ++r->n;
}

static bool is_light(const description *d) {
  return d->kind[0] == 'l';
}

static void count(describe_text *t, const description *d) {
  t->has_cones = t->has_cones || !isnan(d->lms.cone_l);
  t->has_alpha = t->has_alpha || d->has_alpha;
  if (d->daylight != NULL) {
    ++t->n_spectral_lights;
    if (d->daylight_distance <= DESCRIBE_SIMULATOR_REACH) {
      ++t->n_daylights;
      t->daylight_of = d->daylight;
      t->daylight_distance = d->daylight_distance;
    }
  }
  if (is_light(d)) {
    ++t->n_lights;
    extend(&t->temperature, d->cct.cct_k, d->name);
    extend(&t->rendering, d->Ra, d->name);
    return;
  }
  if (d->kind[0] == 's')
    ++t->n_surfaces;
  else
    ++t->n_colours;
  extend(&t->lightness, d->lab.L_star, d->name);
  extend(&t->chroma, ef_lab_to_lch(d->lab).C_star, d->name);
}

static ef_status keep(void *self, const describe_scene *s, size_t n,
                      const description *descriptions, ef_error *error) {
  (void)s;
  describe_text *t = self;
  for (size_t i = 0; i < n; ++i) {
    count(t, &descriptions[i]);
    if (t->n_rows >= MOST_ROWS)
      continue;
    char *name = strdup(descriptions[i].name);
    if (name == NULL) {
      return message_fail(error, EF_NO_MEMORY, "out of memory for names");
    }
    t->name[t->n_rows] = name;
    t->row[t->n_rows] = descriptions[i];
    t->row[t->n_rows].name = name;
    t->row[t->n_rows++].file = ""; /* gone with its reader */
  }
  return EF_OK;
}

/* ---- The answer -------------------------------------------------------- */

static void add_fixed(text *t, const char *before, double value, int decimals,
                      const char *after) {
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(value, decimals, number);
  text_format(t, "%s%s%s", before, number, after);
}

static void add_one(text *out, const describe_scene *s, const description *d) {
  text_format(out, "%s", d->name);
  if (!is_light(d)) {
    text_format(out, " under %s has", ef_illuminant_name(s->illuminant));
    add_fixed(out, " L* ", d->lab.L_star, 2, ",");
    add_fixed(out, " a* ", d->lab.a_star, 2, ",");
    add_fixed(out, " b* ", d->lab.b_star, 2, ".\n");
    return;
  }
  if (!isnan(d->cct.cct_k)) {
    add_fixed(out, " is a light of ", d->cct.cct_k, 0, " K");
    add_fixed(out, ", Duv ", d->cct.duv, 4, "");
    if (!isnan(d->Ra))
      add_fixed(out, ", Ra ", d->Ra, 1, "");
  } else if (!isnan(d->dominant.dominant_nm)) {
    add_fixed(out,
              d->dominant.complementary
                  ? " is a purple light, complementary to "
                  : " is a coloured light of dominant wavelength ",
              d->dominant.dominant_nm, 1, " nm");
    add_fixed(out, ", purity ", 100.0 * d->dominant.purity, 1, " %");
  } else {
    text_add(out, " is no light");
  }
  if (!isnan(d->luminance_cd_m2)) {
    add_fixed(out, ", ", d->luminance_cd_m2, 2, " cd/m2");
  }
  text_add(out, ".\n");
}

static void add_many_lights(text *out, const describe_text *t) {
  char n[WORDS_ROOM];
  words_count(t->n_lights, "light", "lights", n);
  text_add(out, n);
  if (t->temperature.n == 0) {
    text_add(out, ", none of them near enough to white to have a colour "
                  "temperature.\n");
    return;
  }
  if (t->temperature.n < t->n_lights) {
    text_format(out, ", %zu of them with a colour temperature",
                t->temperature.n);
  }
  add_fixed(out, ", from ", t->temperature.low, 0, " K");
  text_format(out, " (%s)", t->temperature.low_name);
  add_fixed(out, " to ", t->temperature.high, 0, " K");
  text_format(out, " (%s)", t->temperature.high_name);
  if (t->rendering.n > 0) {
    add_fixed(out, "; Ra from ", t->rendering.low, 0, "");
    text_format(out, " (%s)", t->rendering.low_name);
    add_fixed(out, " to ", t->rendering.high, 0, "");
    text_format(out, " (%s)", t->rendering.high_name);
  }
  text_add(out, ".\n");
}

static void add_many_surfaces(text *out, const describe_text *t,
                              const describe_scene *s) {
  const size_t n = t->n_surfaces + t->n_colours;
  char count_text[WORDS_ROOM];
  const bool all_surfaces = t->n_colours == 0;
  words_count(n, all_surfaces ? "surface" : "colour",
              all_surfaces ? "surfaces" : "colours", count_text);
  text_format(out, "%s under %s", count_text,
              ef_illuminant_name(s->illuminant));
  if (t->lightness.n > 0) {
    text_format(out, ", from %s", t->lightness.low_name);
    add_fixed(out, " (L* ", t->lightness.low, 1, ")");
    text_format(out, " to %s", t->lightness.high_name);
    add_fixed(out, " (L* ", t->lightness.high, 1, ")");
    text_format(out, "; the most vivid is %s", t->chroma.high_name);
    add_fixed(out, " (C* ", t->chroma.high, 1, ")");
  }
  text_add(out, ".\n");
}

static void add_answer(text *out, const describe_text *t,
                       const describe_scene *s) {
  const size_t n_others = t->n_surfaces + t->n_colours;
  if (t->n_lights + n_others == 1) {
    add_one(out, s, &t->row[0]);
    return;
  }
  if (n_others > 0)
    add_many_surfaces(out, t, s);
  if (t->n_lights > 0)
    add_many_lights(out, t);
}

/* ---- Tables ------------------------------------------------------------ */

/* What a group of rows has to tell. */
typedef struct group {
  const char *kind;
  bool is_absolute;  /* lights in cd/m2 */
  const char *scale; /* what Y is measured in */
  bool has_lab, has_temperature, has_cones;
  int decimals; /* of X, Y, Z */
  size_t n;
} group;

static bool belongs(const group *g, const description *d) {
  return strcmp(d->kind, g->kind) == 0 &&
         isnan(d->luminance_cd_m2) == !g->is_absolute;
}

static group look_at(const describe_text *t, const char *kind,
                     bool is_absolute) {
  group g = {.kind = kind,
             .is_absolute = is_absolute,
             .scale = is_absolute      ? "cd/m2"
                      : kind[0] == 'l' ? "unit of the file"
                                       : "Y of white = 100",
             .decimals = 2};
  double largest = 0.0;
  for (size_t i = 0; i < t->n_rows; ++i) {
    const description *d = &t->row[i];
    if (!belongs(&g, d))
      continue;
    largest = fmax(largest, fabs(d->xyz.Y));
    g.has_lab = g.has_lab || !isnan(d->lab.L_star);
    g.has_temperature = g.has_temperature || is_light(d);
    g.has_cones = g.has_cones || !isnan(d->lms.cone_l);
    ++g.n;
  }
  if (largest > 0.0 && largest < 10.0) {
    g.decimals = 3 - (int)floor(log10(largest));
  }
  if (g.decimals > 9)
    g.decimals = 9;
  return g;
}

static void add_tristimulus(text *out, const describe_text *t, const group *g) {
  text_table a = table_new();
  table_column(&a, "Name", "", true);
  table_column(&a, g->scale, "X", false);
  table_column(&a, NULL, "Y", false);
  table_column(&a, NULL, "Z", false);
  table_column(&a, "Chromaticity", "x", false);
  table_column(&a, NULL, "y", false);
  table_column(&a, NULL, "u'", false);
  table_column(&a, NULL, "v'", false);
  for (size_t i = 0; i < t->n_rows; ++i) {
    const description *d = &t->row[i];
    if (!belongs(g, d))
      continue;
    table_cell(&a, d->name);
    table_number(&a, d->xyz.X, g->decimals);
    table_number(&a, d->xyz.Y, g->decimals);
    table_number(&a, d->xyz.Z, g->decimals);
    table_number(&a, d->xyy.x, 4);
    table_number(&a, d->xyy.y, 4);
    table_number(&a, d->uv.u_prime, 4);
    table_number(&a, d->uv.v_prime, 4);
  }
  table_finish(&a, out);
}

static void start_appearance(text_table *a, const group *g) {
  table_column(a, "Name", "", true);
  if (g->has_lab) {
    table_column(a, "CIELAB", "L*", false);
    table_column(a, NULL, "a*", false);
    table_column(a, NULL, "b*", false);
    table_column(a, NULL, "C*", false);
    table_column(a, NULL, "h, deg", false);
  }
  if (g->has_temperature) {
    table_column(a, "CCT", "K", false);
    table_column(a, "Duv", "", false);
    table_column(a, "Ra", "", false);
  }
  table_column(a, "Dominant", "nm", false);
  table_column(a, "Purity", "%", false);
}

static void add_dominant(text_table *a, const description *d) {
  char number[EF_NUMBER_TEXT];
  if (isnan(d->dominant.dominant_nm)) {
    table_cell(a, "-");
  } else {
    ef_number_format_fixed(d->dominant.dominant_nm, 1, number);
    table_format(a, "%s%s", number, d->dominant.complementary ? " c" : "");
  }
  table_number(a, 100.0 * d->dominant.purity, 1);
}

/* In brackets where the light is so far from its reference that CIE 13.3 gives
 * the figure no meaning. */
static void add_rendering(text_table *a, const description *d) {
  if (isnan(d->Ra) || d->Ra_tolerable) {
    table_number(a, d->Ra, 1);
    return;
  }
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(d->Ra, 1, number);
  table_format(a, "(%s)", number);
}

static void add_appearance(text *out, const describe_text *t, const group *g) {
  text_table a = table_new();
  bool has_complementary = false;
  start_appearance(&a, g);
  for (size_t i = 0; i < t->n_rows; ++i) {
    const description *d = &t->row[i];
    if (!belongs(g, d))
      continue;
    const ef_lch lch = ef_lab_to_lch(d->lab);
    table_cell(&a, d->name);
    if (g->has_lab) {
      table_number(&a, d->lab.L_star, 2);
      table_number(&a, d->lab.a_star, 2);
      table_number(&a, d->lab.b_star, 2);
      table_number(&a, lch.C_star, 2);
      table_number(&a, lch.h_deg, 1);
    }
    if (g->has_temperature) {
      table_number(&a, d->cct.cct_k, 0);
      table_number(&a, d->cct.duv, 4);
      add_rendering(&a, d);
    }
    add_dominant(&a, d);
    has_complementary = has_complementary || d->dominant.complementary;
  }
  text_add(out, "\n");
  table_finish(&a, out);
  if (has_complementary) {
    text_add(out, "  c: a purple; the wavelength is that of its "
                  "complementary colour.\n");
  }
}

/* The rows of a group, in order; NULL without memory. */
static const description **rows_of(const describe_text *t, const group *g) {
  const description **row = malloc((g->n + 1) * sizeof *row);
  size_t n = 0;
  for (size_t i = 0; i < t->n_rows && row != NULL; ++i) {
    if (belongs(g, &t->row[i]))
      row[n++] = &t->row[i];
  }
  return row;
}

static void add_receptors(text *out, const describe_text *t, const group *g) {
  const description **row = rows_of(t, g);
  if (row == NULL) {
    out->failed = true;
    return;
  }
  render_receptors(out, g->n, row, g->decimals);
  if (row[0]->has_alpha)
    render_alpha_opic(out, g->n, row, g->is_absolute);
  free(row);
}

static bool has_whiteness(const description *d) {
  return d->whiteness.is_white || !isnan(d->whiteness.yellowness);
}

/* Whiteness and tint say nothing of what is not white by the limits of the
 * CIE. */
static void add_whiteness(text *out, const describe_text *t, const group *g) {
  text_table a = table_new();
  size_t n = 0;
  table_column(&a, "Name", "", true);
  table_column(&a, "Whiteness", "", false);
  table_column(&a, "Tint", "", false);
  table_column(&a, "Yellowness", "", false);
  for (size_t i = 0; i < t->n_rows; ++i) {
    const description *d = &t->row[i];
    if (!belongs(g, d) || !has_whiteness(d))
      continue;
    const bool white = d->whiteness.is_white;
    table_cell(&a, d->name);
    table_number(&a, white ? d->whiteness.whiteness : (double)NAN, 1);
    table_number(&a, white ? d->whiteness.tint : (double)NAN, 1);
    table_number(&a, d->whiteness.yellowness, 1);
    ++n;
  }
  text whole = {0};
  table_finish(&a, &whole);
  if (n > 0) {
    text_add(out, "\n");
    text_add(out, whole.bytes != NULL ? whole.bytes : "");
  }
  out->failed = out->failed || whole.failed;
  text_free(&whole);
}

static void add_group(text *out, const describe_text *t,
                      const describe_scene *s, const char *kind,
                      bool is_absolute) {
  const group g = look_at(t, kind, is_absolute);
  if (g.n == 0)
    return;
  text_add(out, "\n");
  add_tristimulus(out, t, &g);
  add_appearance(out, t, &g);
  if (g.has_cones)
    add_receptors(out, t, &g);
  if (kind[0] != 'l' && s->white_scale != NULL)
    add_whiteness(out, t, &g);
}

/* ---- What it rests on -------------------------------------------------- */

static void add_whiteness_basis(text *out, const describe_scene *s) {
  const ef_white_scale *scale = s->white_scale;
  if (scale == NULL)
    return;
  text line = {0};
  text_format(&line,
              "whiteness and tint (above 0 greener, below 0 redder): %s for %s "
              "and %s, of samples within the limits of the CIE for white",
              scale->is_cie ? "CIE 015:2018" : "ASTM E313", scale->observer,
              scale->illuminant);
  if (!isnan(scale->yellow_x))
    text_add(&line, "; yellowness: ASTM E313");
  text_add(&line, "; the coefficients are from memory; for samples compared on "
                  "one instrument");
  text_label(out, "Whiteness", &line);
}

/* What stands between a light and a grade as a simulator. */
static void add_daylight(text *out, const describe_text *t) {
  text line = {0};
  char distance[EF_NUMBER_TEXT];
  if (t->n_spectral_lights == 0)
    return;
  ef_number_format_fixed(t->daylight_distance, 4, distance);
  if (t->n_daylights == 0) {
    text_add(&line, "none of the lights lies within 0.015 of D50, D55, D65 or "
                    "D75 in CIE 1964 u', v': as daylight simulators they have "
                    "no grade (ISO/CIE 23603)");
  } else if (t->n_spectral_lights == 1) {
    text_format(&line,
                "it lies %s from %s in CIE 1964 u', v', within the 0.015 that "
                "ISO/CIE 23603 asks of simulators; `evenfield compare "
                "--grade-simulators` grades it over the pairs of the standard",
                distance, t->daylight_of);
  } else {
    text_format(&line,
                "%zu of %zu lights %s within 0.015 of D50, D55, D65 or D75 in "
                "CIE 1964 u', v', as ISO/CIE 23603 asks of simulators; "
                "`evenfield compare --grade-simulators` grades them over the "
                "pairs of the standard",
                t->n_daylights, t->n_spectral_lights,
                t->n_daylights == 1 ? "lies" : "lie");
  }
  text_label(out, "Daylight", &line);
}

static void add_basis(text *out, const describe_text *t,
                      const describe_scene *s) {
  text line = {0};
  text_add(out, "\nWhat this rests on:\n");
  text_format(&line, "%s: %s", ef_observer_name(s->observer),
              ef_observer_about(s->observer));
  text_label(out, "Observer", &line);
  if (ef_observer_dimensions(s->observer) < 3) {
    text_add(&line, words_two_dimensions);
    text_label(out, "", &line);
  }
  if (t->has_cones)
    render_receptor_basis(out, s, t->has_alpha);
  if (t->n_surfaces + t->n_colours > 0) {
    text_format(&line,
                "CIELAB, dominant wavelength and purity of surfaces and "
                "colours are relative to %s",
                ef_illuminant_name(s->illuminant));
    text_label(out, "White", &line);
  }
  if (t->n_surfaces + t->n_colours > 0)
    add_whiteness_basis(out, s);
  if (t->n_lights == 0)
    return;
  text_format(&line,
              "dominant wavelength and purity of lights are relative to "
              "the equal-energy stimulus%s",
              s->has_light_white ? ", CIELAB to the light named white" : "");
  text_label(out,
             t->n_lights < t->n_surfaces + t->n_colours + t->n_lights ? ""
                                                                      : "White",
             &line);
  text_add(&line,
           "nearest Planckian radiator in CIE 1960 u, v for the CIE 1931 "
           "observer, none beyond 0.05 (CIE 015:2018)");
  text_label(out, "CCT, Duv", &line);
  add_daylight(out, t);
  if (t->rendering.n == 0)
    return;
  text_add(&line, "CIE 13.3-1995; in brackets where the light is so far from "
                  "its reference that the figure means little");
  text_label(out, "Ra", &line);
}

describe_text *describe_text_new(void) {
  return calloc(1, sizeof(struct describe_text));
}

void describe_text_free(describe_text *t) {
  for (size_t i = 0; t != NULL && i < t->n_rows; ++i)
    free(t->name[i]);
  free(t);
}

describe_sink describe_text_sink(describe_text *t) {
  return (describe_sink){.self = t, .rows = keep};
}

ef_status describe_text_finish(describe_text *t, const describe_scene *s,
                               size_t n_skipped, ef_output *output,
                               ef_error *error) {
  const size_t n = t->n_lights + t->n_surfaces + t->n_colours;
  text out = {0};
  add_answer(&out, t, s);
  if (n_skipped > 0) {
    text_format(&out, "%zu rows were at fault and are left out.\n", n_skipped);
  }
  if (n > t->n_rows) {
    text_format(&out, "The first %zu of %zu follow (--format csv gives all).\n",
                t->n_rows, n);
  }
  add_group(&out, t, s, "surface", false);
  add_group(&out, t, s, "colour", false);
  add_group(&out, t, s, "light", true);
  add_group(&out, t, s, "light", false);
  add_basis(&out, t, s);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}
