/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_ellipse.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "text.h"
#include "viewing.h"
#include "words.h"

/* A person reads so many rows. */
enum { MOST_ROWS = 200 };
enum { NAME_ROOM = 128 };

/* The ellipse of least or largest area. */
typedef struct extreme {
  bool found;
  double area, semi_major, semi_minor;
  char name[NAME_ROOM];
} extreme;

struct ellipse_text {
  ellipse_row row[MOST_ROWS];
  char *name[MOST_ROWS]; /* of the rows, owned */
  size_t n_rows, n_found;
  ef_ellipse only;   /* of the last one found */
  bool some_outside; /* of MacAdam's centres */
  bool some_between; /* the centres of an experiment */
  extreme smallest, largest;
};

/* ---- Collecting -------------------------------------------------------- */

static void set_extreme(extreme *e, const ellipse_row *row, double area) {
  *e = (extreme){true, area, row->ellipse.semi_major, row->ellipse.semi_minor,
                 ""};
  snprintf(e->name, NAME_ROOM, "%s", row->name);
}

static void count(ellipse_text *t, const ellipse_row *row) {
  if (!row->found)
    return;
  ++t->n_found;
  t->only = row->ellipse;
  t->some_outside = t->some_outside || !row->between;
  t->some_between = t->some_between || row->nearest.difference > 0.05;
  const double area = row->ellipse.semi_major * row->ellipse.semi_minor;
  if (!t->smallest.found || area < t->smallest.area)
    set_extreme(&t->smallest, row, area);
  if (!t->largest.found || area > t->largest.area)
    set_extreme(&t->largest, row, area);
}

static ef_status keep(void *self, const ellipse_scene *s, size_t n,
                      const ellipse_row *rows, ef_error *error) {
  (void)s;
  ellipse_text *t = self;
  for (size_t i = 0; i < n; ++i) {
    count(t, &rows[i]);
    if (t->n_rows >= MOST_ROWS)
      continue;
    char *name = strdup(rows[i].name);
    if (name == NULL)
      return message_fail(error, EF_NO_MEMORY, "out of memory for names");
    t->name[t->n_rows] = name;
    t->row[t->n_rows] = rows[i];
    t->row[t->n_rows++].name = name;
  }
  return EF_OK;
}

/* ---- Words ------------------------------------------------------------- */

void ellipse_size_words(const ellipse_scene *s, char words[ELLIPSE_SIZE_ROOM]) {
  char number[EF_NUMBER_TEXT];
  if (isnan(s->steps)) {
    ef_number_format(s->size, number);
    snprintf(words, ELLIPSE_SIZE_ROOM, "%s %s", number,
             ef_metric_symbol(s->metric));
    return;
  }
  static const char *const one[] = {
      "one JND",           "one standard deviation", "one step",
      "one step",          "the published size",     "the published size",
      "the published size"};
  static const char *const many[] = {"JND",
                                     "standard deviations",
                                     "steps",
                                     "steps",
                                     "times the published size",
                                     "times the published size",
                                     "times the published size"};
  ef_number_format(s->steps, number);
  if (s->steps == 1.0) {
    snprintf(words, ELLIPSE_SIZE_ROOM, "%s", one[s->from]);
  } else {
    snprintf(words, ELLIPSE_SIZE_ROOM, "%s %s", number, many[s->from]);
  }
}

const char *ellipse_figure_words(const ellipse_scene *s) {
  const bool projection = s->figure == FIGURE_PROJECTION;
  switch (s->frame.space) {
  case EF_SPACE_LAB:
    return projection ? "projection of the ellipsoid: all colours it holds, of "
                        "any L*"
                      : "section at constant L*: the colours that differ in "
                        "a* and b* alone";
  case EF_SPACE_CONE_LM:
    return projection ? "projection of the ellipsoid: all colours it holds, of "
                        "any contrast of the S cones"
                      : "section at constant S: the colours that excite the S "
                        "cones alike";
  default:
    return projection
               ? "projection of the ellipsoid: all colours it holds, of "
                 "any luminance"
               : "section at constant luminance: the colours that differ "
                 "in chromaticity alone";
  }
}

const char *ellipse_source_words(const ellipse_scene *s) {
  switch (s->from) {
  case BASIS_MACADAM:
    return "MacAdam, J. Opt. Soc. Am. 32 (1942) 247-274: one observer's "
           "settings, 2 degree field, about 48 cd/m2; between the 25 centres "
           "the logarithms of the forms in u', v' are averaged with weights of "
           "1 / distance^4. About three standard deviations are taken for just "
           "noticeable (from memory)";
  case BASIS_STEPS:
    return "circles in u', v' of radius 0.0011 for each step (CIE TN 001:2014)";
  case BASIS_LAMPS:
    return "standard colours of lamps (IEC 60081, ANSI C78.376); the "
           "coefficients are from memory, not from a printed copy";
  case BASIS_FORMULA:
    return "the local metric of the formula, exact for small steps";
  default:
    return ef_experiment_source(s->experiment);
  }
}

static const char *axis_words(ef_space space, int i) {
  static const char *const words[][2] = {
      [EF_SPACE_XY] = {"x", "y"},    [EF_SPACE_UV] = {"u'", "v'"},
      [EF_SPACE_LAB] = {"a*", "b*"}, [EF_SPACE_MB] = {"l", "s"},
      [EF_SPACE_CONE] = {"L", "S"},  [EF_SPACE_CONE_LM] = {"L", "M"}};
  return words[space][i];
}

static const char *space_words(ef_space space) {
  static const char *const words[] = {
      [EF_SPACE_XY] = "x, y",
      [EF_SPACE_UV] = "u', v'",
      [EF_SPACE_LAB] = "a*, b*",
      [EF_SPACE_MB] = "MacLeod-Boynton l, s",
      [EF_SPACE_CONE] = "contrasts of the L and S cones",
      [EF_SPACE_CONE_LM] = "contrasts of the L and M cones"};
  return words[space];
}

/* ---- The answer -------------------------------------------------------- */

/* "one JND (0.8 Delta E*00)" */
static void add_size(text *out, const ellipse_scene *s) {
  char size[ELLIPSE_SIZE_ROOM];
  ellipse_size_words(s, size);
  text_add(out, size);
  if (isnan(s->steps) || s->metric == NULL)
    return;
  char number[EF_NUMBER_TEXT];
  words_amount(s->size, number);
  text_format(out, " (%s %s)", number, ef_metric_symbol(s->metric));
}

static void add_axes(text *out, double semi_major, double semi_minor) {
  char major[EF_NUMBER_TEXT], minor[EF_NUMBER_TEXT];
  const int decimals = words_decimals(semi_minor, 3);
  ef_number_format_fixed(semi_major, decimals, major);
  ef_number_format_fixed(semi_minor, decimals, minor);
  text_format(out, "%s by %s", major, minor);
}

static void add_one(text *out, const ellipse_text *t, const ellipse_scene *s) {
  const ef_ellipse *e = &t->only;
  const char *verb = s->steps == 1.0 ? "is" : "make";
  const char *plane = space_words(s->frame.space);
  char number[EF_NUMBER_TEXT];
  text_format(out, "Around %s, ", t->smallest.name);
  add_size(out, s);
  if (e->semi_major == e->semi_minor) {
    ef_number_format_fixed(e->semi_major, words_decimals(e->semi_major, 3),
                           number);
    text_format(out, " %s a circle in %s with a radius of %s.\n", verb, plane,
                number);
    return;
  }
  text_format(out, " %s an ellipse in %s with semi-axes of ", verb, plane);
  add_axes(out, e->semi_major, e->semi_minor);
  ef_number_format_fixed(e->angle_deg, 1, number);
  text_format(out, ", the longer one at %s degrees.\n", number);
}

static void add_many(text *out, const ellipse_text *t, const ellipse_scene *s) {
  char n[WORDS_ROOM];
  words_count(t->n_found, "ellipse", "ellipses", n);
  text_format(out, "%s of ", n);
  add_size(out, s);
  text_format(out, " in %s: semi-axes from ", space_words(s->frame.space));
  add_axes(out, t->smallest.semi_major, t->smallest.semi_minor);
  text_format(out, " (%s) to ", t->smallest.name);
  add_axes(out, t->largest.semi_major, t->largest.semi_minor);
  text_format(out, " (%s).\n", t->largest.name);
}

/* ---- Tables ------------------------------------------------------------ */

/* Decimals that show three digits of the smallest short axis. */
static int axis_decimals(const ellipse_text *t) {
  double least = (double)INFINITY;
  for (size_t i = 0; i < t->n_rows; ++i) {
    if (t->row[i].found)
      least = fmin(least, t->row[i].ellipse.semi_minor);
  }
  return words_decimals(least, 3);
}

static void add_table(text *out, const ellipse_text *t,
                      const ellipse_scene *s) {
  const ef_space space = s->frame.space;
  const int center_decimals = space == EF_SPACE_LAB ? 2 : 4;
  const int decimals = axis_decimals(t);
  text_table a = table_new();
  table_column(&a, "Centre", "", true);
  table_column(&a, "At", axis_words(space, 0), false);
  table_column(&a, NULL, axis_words(space, 1), false);
  table_column(&a, "Semi-axes", "long", false);
  table_column(&a, NULL, "short", false);
  table_column(&a, "Angle", "deg", false);
  if (t->some_outside)
    table_column(&a, "Between", "centres", true);
  if (t->some_between) {
    table_column(&a, "Nearest centre", "CIELAB", false);
    table_column(&a, NULL, "", true);
  }
  for (size_t i = 0; i < t->n_rows; ++i) {
    const ellipse_row *row = &t->row[i];
    if (!row->found)
      continue;
    table_cell(&a, row->name);
    table_number(&a, row->ellipse.center[0], center_decimals);
    table_number(&a, row->ellipse.center[1], center_decimals);
    table_number(&a, row->ellipse.semi_major, decimals);
    table_number(&a, row->ellipse.semi_minor, decimals);
    table_number(&a, row->ellipse.angle_deg, 1);
    if (t->some_outside)
      table_cell(&a, row->between ? "yes" : "no");
    if (t->some_between) {
      table_number(&a, row->nearest.difference, 1);
      table_cell(&a, row->nearest.name);
    }
  }
  text_add(out, "\n");
  table_finish(&a, out);
}

/* As many decimals as show four digits of the smallest coefficient on the
 * diagonal. */
static void add_forms(text *out, const ellipse_text *t) {
  double least = (double)INFINITY;
  for (size_t i = 0; i < t->n_rows; ++i) {
    const ef_ellipse *e = &t->row[i].ellipse;
    if (t->row[i].found)
      least = fmin(least, fmin(e->g11, e->g22));
  }
  const int decimals = words_decimals(least, 4);
  text_table a = table_new();
  table_column(&a, "Form", "", true);
  table_column(&a, "g11", "", false);
  table_column(&a, "g12", "", false);
  table_column(&a, "g22", "", false);
  for (size_t i = 0; i < t->n_rows; ++i) {
    if (!t->row[i].found)
      continue;
    table_cell(&a, t->row[i].name);
    table_number(&a, t->row[i].ellipse.g11, decimals);
    table_number(&a, t->row[i].ellipse.g12, decimals);
    table_number(&a, t->row[i].ellipse.g22, decimals);
  }
  text_add(out, "\n");
  table_finish(&a, out);
}

static void add_solids(text *out, const ellipse_text *t,
                       const ellipse_scene *s) {
  const ef_space space = s->frame.space;
  const int decimals = axis_decimals(t);
  text_table a = table_new();
  table_column(&a, "Ellipsoid", "", true);
  table_column(&a, "Semi-axis", "", false);
  table_column(&a, "Direction", axis_words(space, 0), false);
  table_column(&a, NULL, axis_words(space, 1), false);
  table_column(&a, NULL,
               space == EF_SPACE_LAB       ? "L*"
               : space == EF_SPACE_CONE_LM ? "S"
               : space == EF_SPACE_CONE    ? "luminance"
               : space == EF_SPACE_MB      ? "V"
                                           : "Y",
               false);
  for (size_t i = 0; i < t->n_rows; ++i) {
    const ef_ellipsoid *e = &t->row[i].solid;
    for (int k = 0; k < 3 && t->row[i].found; ++k) {
      table_cell(&a, k == 0 ? t->row[i].name : "");
      table_number(&a, e->semi_axis[k], decimals);
      for (int c = 0; c < 3; ++c)
        table_number(&a, e->direction[3 * k + c], 4);
    }
  }
  text_add(out, "\n");
  table_finish(&a, out);
}

static void add_missing(text *out, const ellipse_text *t,
                        const ellipse_count *n) {
  if (n->n_found == n->n)
    return;
  text_add(out, "\nWithout an ellipse:\n");
  for (size_t i = 0; i < t->n_rows; ++i) {
    if (t->row[i].found)
      continue;
    text line = {0};
    text_format(&line, "%s: %s", t->row[i].name, t->row[i].reason);
    text_add(out, "  ");
    text_paragraph(out, &line, 4);
  }
}

/* ---- What it rests on -------------------------------------------------- */

static void add_formula(text *out, const ellipse_scene *s) {
  text line = {0};
  text_format(&line, "%s (%s); %s", ef_metric_title(s->metric),
              ef_metric_source(s->metric), ellipse_source_words(s));
  if (!ef_metric_symmetric(s->metric))
    text_add(&line, "; the centre is the standard");
  if (viewing_matters(s->metric)) {
    char conditions[200];
    viewing_words(&s->conditions, conditions);
    text_format(&line, "; for %s", conditions);
  }
  text_label(out, "Formula", &line);
  if (isnan(s->steps))
    return;
  jnd_add(&line, &s->jnd, s->metric);
  text_label(out, "JND", &line);
}

static void add_basis(text *out, const ellipse_scene *s) {
  const ef_space space = s->frame.space;
  text line = {0};
  text_add(out, "\nWhat this rests on:\n");
  if (s->from == BASIS_FORMULA) {
    add_formula(out, s);
  } else {
    text_add(&line, ellipse_source_words(s));
    text_label(out, "Source", &line);
  }
  if (s->experiment != NULL) {
    text_add(&line, ef_experiment_remark(s->experiment));
    text_label(out, "Size", &line);
    text_add(&line, "the logarithms of the forms in CIELAB are averaged with "
                    "weights of 1 / difference^4; far from all centres that "
                    "is little more than a guess");
    text_label(out, "Between", &line);
  }
  text_add(&line, ellipse_figure_words(s));
  text_label(out, "Figure", &line);
  text_format(&line,
              "in degrees from the axis of %s, anticlockwise; the form is g11 "
              "d%s^2 + 2 g12 d%s d%s + g22 d%s^2 = 1",
              axis_words(space, 0), axis_words(space, 0), axis_words(space, 0),
              axis_words(space, 1), axis_words(space, 1));
  text_label(out, "Angle", &line);
  text_format(&line, "%s: %s", ef_observer_name(s->observer),
              ef_observer_about(s->observer));
  text_label(out, "Observer", &line);
  if (s->metric != NULL || s->experiment != NULL || space == EF_SPACE_LAB) {
    text_format(&line, "%s, Y = 100", ef_illuminant_name(s->illuminant));
    text_label(out, "White", &line);
  }
  if (space == EF_SPACE_XY || space == EF_SPACE_UV || space == EF_SPACE_LAB)
    return;
  text_format(&line, "%s",
              ef_observer_cones_borrowed(s->observer)
                  ? "the CIE 2006 fundamentals, fitted to this "
                    "observer's functions, which have none of "
                    "their own"
                  : "the observer's own fundamentals");
  if (space != EF_SPACE_MB)
    text_format(&line, "; contrasts are from %s",
                s->options->contrast_from != NULL ? s->options->contrast_from
                                                  : "the white");
  text_label(out, "Cones", &line);
}

static const char people[] =
    "A threshold changes with the size of the field, its surround, brightness "
    "and time, and from person to person: read an ellipse as a guide to "
    "directions and proportions, and let eyes decide where its size matters.";

ellipse_text *ellipse_text_new(void) {
  return calloc(1, sizeof(struct ellipse_text));
}

void ellipse_text_free(ellipse_text *t) {
  for (size_t i = 0; t != NULL && i < t->n_rows; ++i)
    free(t->name[i]);
  free(t);
}

ellipse_sink ellipse_text_sink(ellipse_text *t) {
  return (ellipse_sink){.self = t, .rows = keep};
}

void ellipse_text_add(const ellipse_text *t, text *out, const ellipse_scene *s,
                      const ellipse_count *n) {
  if (n->n_found == 1) {
    add_one(out, t, s);
  } else {
    add_many(out, t, s);
  }
  if (n->n_found < n->n) {
    text_format(out, "%zu of %zu colours have none, for the reasons below.\n",
                n->n - n->n_found, n->n);
  }
  if (n->n_skipped > 0) {
    text_format(out, "%zu rows were at fault and are left out.\n",
                n->n_skipped);
  }
  if (n->n > t->n_rows) {
    text_format(out, "The first %zu of %zu follow (--format csv gives all).\n",
                t->n_rows, n->n);
  }
  add_table(out, t, s);
  add_forms(out, t);
  if (s->figure == FIGURE_ELLIPSOID)
    add_solids(out, t, s);
  add_missing(out, t, n);
  add_basis(out, s);
  text_add(out, "\n");
  text_section(out, "What to keep in mind");
  text_wrap(out, people, 0);
}

ef_status ellipse_text_finish(ellipse_text *t, const ellipse_scene *s,
                              const ellipse_count *n, ef_output *output,
                              ef_error *error) {
  text out = {0};
  ellipse_text_add(t, &out, s, n);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}

size_t ellipse_text_rows(const ellipse_text *t, const ellipse_row **row) {
  *row = t->row;
  return t->n_rows;
}
