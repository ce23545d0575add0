/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "ellipse.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "source.h"
#include "viewing.h"

enum { BLOCK_ROWS = 4096 };

/* ---- Loading ----------------------------------------------------------- */

static ef_status set_size(ellipse_scene *s, const ef_notes *notes,
                          ef_error *error) {
  const command_options *o = s->options;
  s->steps = isnan(o->steps) ? 1.0 : o->steps;
  s->size = (double)NAN;
  if (s->from != BASIS_FORMULA)
    return EF_OK;
  s->metric = jnd_metric(o, notes, error);
  if (s->metric == NULL)
    return error->status;
  const ef_status status = jnd_load(o, s->metric, notes, &s->jnd, error);
  if (status != EF_OK)
    return status;
  s->size = s->steps * s->jnd.record.value;
  if (!isnan(o->size)) {
    s->size = o->size;
    s->steps = (double)NAN;
  } else if (isnan(s->size)) {
    s->size = s->steps;
    s->steps = (double)NAN;
    message_note(notes,
                 "no JND is published for %s: the ellipses are of %g %s; "
                 "--jnd or --size says otherwise",
                 ef_metric_name(s->metric), s->size,
                 ef_metric_symbol(s->metric));
  }
  return EF_OK;
}

/* Surface colours of experiments were seen by large fields in daylight. */
static ef_status check_experiment(const ellipse_scene *s, ef_error *error) {
  if (strcmp(ef_observer_name(s->observer), "cie-1964") == 0 &&
      strcmp(ef_illuminant_name(s->illuminant), "D65") == 0) {
    return EF_OK;
  }
  return message_fail(error, EF_UNKNOWN_NAME,
                      "--basis: the colours of %.60s are those of D65 and "
                      "observer cie-1964; leave --observer and --illuminant "
                      "out",
                      ef_experiment_title(s->experiment));
}

/* MacAdam's and the steps of the trade are in CIE 1931 coordinates. */
static ef_status check_observer(const ellipse_scene *s, ef_error *error) {
  if (s->experiment != NULL)
    return check_experiment(s, error);
  if (ef_observer_dimensions(s->observer) < 3) {
    return message_fail(error, EF_NO_ANSWER,
                        "to observer %.100s the colours of one luminance lie "
                        "on a line: there are no ellipses",
                        ef_observer_name(s->observer));
  }
  if (s->from == BASIS_FORMULA ||
      strcmp(ef_observer_name(s->observer), "cie-1931") == 0) {
    return EF_OK;
  }
  return message_fail(error, EF_UNKNOWN_NAME,
                      "--observer: only formulas are for any observer; the "
                      "other ellipses are defined in CIE 1931 coordinates");
}

static ef_status set_frame(ellipse_scene *s, const ef_notes *notes,
                           ef_error *error) {
  const command_options *o = s->options;
  ef_space space = EF_SPACE_XY;
  if (o->space != NULL && ef_space_find(o->space, &space, error) != EF_OK)
    return message_option(error, "space", "");
  ef_status status = ef_frame_set(space, s->observer, &s->frame, error);
  if (status != EF_OK || o->contrast_from == NULL)
    return status;
  if (space != EF_SPACE_CONE && space != EF_SPACE_CONE_LM) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--contrast-from is for --space cone and cone-lm");
  }
  point from;
  status = point_parse("contrast-from", o->contrast_from, s->basis.white, notes,
                       &from, error);
  if (status == EF_OK && !from.has_luminance) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--contrast-from: \"%.100s\" has no luminance; write "
                        "xyy:x,y,Y",
                        o->contrast_from);
  }
  s->frame.background = from.xyz;
  return status;
}

ef_status ellipse_scene_load(ellipse_scene *s, const command_options *options,
                             const ef_notes *notes, ef_error *error) {
  const command_options *o = options;
  *s = (ellipse_scene){.options = o,
                       .from = (ellipse_basis)o->basis,
                       .figure = (ellipse_figure)o->figure,
                       .has_luminance = !isnan(o->white_cd_m2)};
  ef_status status = set_size(s, notes, error);
  if (status != EF_OK)
    return status;
  if (s->from >= BASIS_LUO_RIGG) {
    s->experiment = ef_experiment_new(
        ef_experiment_name_at((size_t)(s->from - BASIS_LUO_RIGG)), error);
    if (s->experiment == NULL)
      return error->status;
  }
  s->observer = s->experiment != NULL && o->observer == NULL
                    ? ef_observer_new("cie-1964", error)
                    : source_observer(o, notes, error);
  if (s->observer == NULL)
    return error->status;
  s->illuminant = source_illuminant(
      o, "illuminant", o->illuminant != NULL ? o->illuminant : "D65", notes,
      error);
  if (s->illuminant == NULL)
    return error->status;
  status = check_observer(s, error);
  if (status == EF_OK)
    status = colour_basis_init(&s->basis, s->observer, s->illuminant, error);
  if (status == EF_OK)
    status = viewing_conditions(o, s->basis.white, &s->conditions, error);
  if (status == EF_OK)
    status = set_frame(s, notes, error);
  return status;
}

void ellipse_scene_free(ellipse_scene *s) {
  ef_experiment_free(s->experiment);
  ef_illuminant_free(s->illuminant);
  ef_observer_free(s->observer);
  ef_metric_free(s->metric);
}

/* ---- One colour -------------------------------------------------------- */

/* In these a colour's place does not depend on its luminance. */
static bool is_chromaticity(ef_space space) {
  return space == EF_SPACE_XY || space == EF_SPACE_UV || space == EF_SPACE_MB;
}

/* An ellipse in x, y carried to the frame along colours of equal Y. */
static ef_status carry(const ellipse_scene *s, ellipse_row *row,
                       const ef_ellipse *in_xy, ef_error *error) {
  const double x = in_xy->center[0], y = in_xy->center[1];
  const double Y = row->at.has_luminance ? row->at.xyz.Y : 100.0;
  const ef_xyz xyz = {x * Y / y, Y, (1.0 - x - y) * Y / y};
  /* d(X, Y, Z) / d(x, y) */
  const double by_xy[6] = {Y / y, -x * Y / (y * y), 0.0,
                           0.0,   -Y / y,           (x - 1.0) * Y / (y * y)};
  double at[3], by_xyz[9], j[4] = {0.0, 0.0, 0.0, 0.0};
  const ef_status status =
      ef_frame_coordinates(&s->frame, xyz, &s->conditions, at, by_xyz, error);
  if (status != EF_OK)
    return status;
  for (int i = 0; i < 2; ++i) {
    for (int k = 0; k < 3; ++k) {
      j[2 * i] += by_xyz[3 * i + k] * by_xy[2 * k];
      j[2 * i + 1] += by_xyz[3 * i + k] * by_xy[2 * k + 1];
    }
  }
  row->ellipse = ef_ellipse_carry(in_xy, at, j);
  row->third = row->at.has_luminance ? at[2] : (double)NAN;
  return EF_OK;
}

/* The circle in u', v', carried to x, y. */
static ef_ellipse step_in_xy(ef_xy at, double n_steps) {
  const ef_uv uv = ef_xy_to_uv(at);
  const ef_ellipse circle = ef_step_circle(uv, n_steps);
  /* d(x, y) / d(u', v'), from x = 9 u' / w, y = 4 v' / w. */
  const double w = 6.0 * uv.u_prime - 16.0 * uv.v_prime + 12.0;
  const double j[4] = {(9.0 - 6.0 * at.x) / w, 16.0 * at.x / w, -6.0 * at.y / w,
                       (4.0 + 16.0 * at.y) / w};
  return ef_ellipse_carry(&circle, (double[2]){at.x, at.y}, j);
}

/* Without the way through x, y, which would leave a circle an angle. */
static void keep_circle(const ellipse_scene *s, ellipse_row *row) {
  if (s->from == BASIS_STEPS && s->frame.space == EF_SPACE_UV)
    row->ellipse = ef_step_circle(ef_xy_to_uv(row->at.xy), s->steps);
}

static ef_status from_chromaticity(const ellipse_scene *s, ellipse_row *row,
                                   const ef_lamp_colour *lamp,
                                   ef_error *error) {
  if (isnan(row->at.xy.x))
    return message_fail(error, EF_NO_ANSWER, "it has no chromaticity");
  if (!row->at.has_luminance && !is_chromaticity(s->frame.space)) {
    return message_fail(error, EF_NO_ANSWER,
                        "its luminance is not known, and %s needs it",
                        ef_space_name(s->frame.space));
  }
  ef_ellipse in_xy;
  ef_status status = EF_OK;
  if (lamp != NULL) {
    in_xy = ef_lamp_ellipse(lamp, s->steps);
  } else if (s->from == BASIS_STEPS) {
    in_xy = step_in_xy(row->at.xy, s->steps);
  } else {
    status =
        ef_macadam_ellipse(row->at.xy, s->steps, &in_xy, &row->between, error);
  }
  if (status == EF_OK)
    status = carry(s, row, &in_xy, error);
  if (status == EF_OK)
    keep_circle(s, row);
  return status;
}

/* From a formula or an experiment, which give a solid. */
static ef_status from_solid(const ellipse_scene *s, ellipse_row *row,
                            ef_error *error) {
  if (!row->at.has_luminance) {
    return message_fail(error, EF_NO_ANSWER,
                        "its luminance is not known, and %s needs it",
                        s->metric != NULL ? "a formula" : "a surface colour");
  }
  ef_ellipsoid solid;
  const ef_status status =
      s->metric != NULL
          ? ef_metric_ellipsoid(s->metric, row->at.xyz, &s->conditions,
                                &s->frame, s->size, &solid, error)
          : ef_experiment_ellipsoid(s->experiment, row->at.xyz, &s->conditions,
                                    &s->frame, s->steps, &solid, &row->nearest,
                                    error);
  if (status != EF_OK)
    return status;
  row->ellipse = ef_ellipsoid_figure(&solid, s->figure == FIGURE_PROJECTION
                                                 ? EF_ELLIPSE_PROJECTION
                                                 : EF_ELLIPSE_SECTION);
  row->third = solid.center[2];
  row->solid = solid;
  return EF_OK;
}

/* What has no ellipse is told why: an answer, not a failure. */
static ellipse_row answer(const ellipse_scene *s, const char *name, point at,
                          const ef_lamp_colour *lamp) {
  const double none = (double)NAN;
  ellipse_row row = {.name = name, .at = at, .between = true, .third = none};
  row.ellipse = ef_ellipse_of_form((double[2]){none, none}, none, none, none);
  ef_error error = {0};
  const ef_status status = s->metric != NULL || s->experiment != NULL
                               ? from_solid(s, &row, &error)
                               : from_chromaticity(s, &row, lamp, &error);
  row.found = status == EF_OK && !isnan(row.ellipse.semi_minor);
  if (status != EF_OK) {
    snprintf(row.reason, sizeof row.reason, "%s", error.message);
  } else if (!row.found) {
    snprintf(row.reason, sizeof row.reason, "the form is no ellipse there");
  }
  return row;
}

/* ---- All colours ------------------------------------------------------- */

/* Where the rows go, and what they came to. */
typedef struct progress {
  const ellipse_sink *sink;
  ellipse_count *count;
  char reason[ELLIPSE_REASON_ROOM]; /* of the first one without */
} progress;

static ef_status hand_on(const ellipse_scene *s, progress *p, size_t n,
                         const ellipse_row *rows, ef_error *error) {
  for (size_t i = 0; i < n; ++i) {
    if (rows[i].found)
      ++p->count->n_found;
    else if (p->reason[0] == '\0')
      memcpy(p->reason, rows[i].reason, sizeof p->reason);
  }
  p->count->n += n;
  return p->sink->rows(p->sink->self, s, n, rows, error);
}

static ef_status add_lamp(const ellipse_scene *s, progress *p,
                          const ef_lamp_colour *lamp, ef_error *error) {
  const point at = {.xy = lamp->center};
  const ellipse_row row = answer(s, lamp->name, at, lamp);
  return hand_on(s, p, 1, &row, error);
}

static ef_status add_lamps(const ellipse_scene *s, progress *p,
                           ef_error *error) {
  const text_list *names = &s->options->at;
  ef_status status = EF_OK;
  for (size_t i = 0; i < ef_lamp_count() && names->n == 0 && status == EF_OK;
       ++i) {
    status = add_lamp(s, p, ef_lamp_at(i), error);
  }
  for (size_t i = 0; i < names->n && status == EF_OK; ++i) {
    const ef_lamp_colour *lamp = ef_lamp_find(names->text[i], error);
    status = lamp == NULL ? message_option(error, "at", "")
                          : add_lamp(s, p, lamp, error);
  }
  return status;
}

/* All of an experiment where nothing else was asked for. */
static ef_status add_centers(const ellipse_scene *s, progress *p,
                             ef_error *error) {
  ef_status status = EF_OK;
  ef_lab lab;
  const char *name;
  for (size_t i = 0;
       status == EF_OK &&
       (name = ef_experiment_center(s->experiment, i, &lab)) != NULL;
       ++i) {
    const point at = point_of_xyz(ef_lab_to_xyz(lab, s->basis.white), true);
    const ellipse_row row = answer(s, name, at, NULL);
    status = hand_on(s, p, 1, &row, error);
  }
  return status;
}

static ef_status add_points(const ellipse_scene *s, progress *p,
                            const ef_notes *notes, ef_error *error) {
  const text_list *texts = &s->options->at;
  ef_status status = EF_OK;
  for (size_t i = 0; i < texts->n && status == EF_OK; ++i) {
    point at;
    status =
        point_parse("at", texts->text[i], s->basis.white, notes, &at, error);
    if (status != EF_OK)
      break;
    const ellipse_row row = answer(s, texts->text[i], at, NULL);
    status = hand_on(s, p, 1, &row, error);
  }
  return status;
}

/* How the values of a file become colours of known luminance: the factor to
 * Y = 100 for the white, or NaN. */
static ef_status luminance_scale(const ellipse_scene *s,
                                 const ef_reader_head *head, double *scale,
                                 ef_error *error) {
  const bool spectral_light =
      head->content == EF_CONTENT_SPECTRA && head->kind == EF_LIGHT;
  *scale = 1.0;
  if (!spectral_light && !head->absolute)
    return EF_OK;
  *scale = head->absolute && s->has_luminance ? 100.0 / s->options->white_cd_m2
                                              : (double)NAN;
  if (!isnan(*scale) || (s->metric == NULL && s->experiment == NULL))
    return EF_OK;
  const char *who = s->metric != NULL ? "a formula" : "a surface colour";
  if (head->absolute) {
    message_fail(error, EF_NO_ANSWER,
                 "the colours are in cd/m2, and %s needs to know the white's: "
                 "give --white-luminance",
                 who);
  } else {
    message_fail(error, EF_NO_ANSWER,
                 "these are lights in a relative unit, and %s needs to know "
                 "how bright they are beside the white; X,Y,Z with Y = 100 for "
                 "the white would do",
                 who);
  }
  return message_place(error, head->file);
}

static void make_rows(const ellipse_scene *s, const ef_block *block,
                      const double *xyz, double scale, ellipse_row *rows) {
  const bool known = !isnan(scale);
  const double by = known ? scale : 1.0;
  for (size_t i = 0; i < block->n; ++i) {
    const double *v = xyz + 3 * i;
    const ef_xyz c = {by * v[0], by * v[1], by * v[2]};
    rows[i] = answer(s, block->name[i], point_of_xyz(c, known), NULL);
  }
}

static ef_status read_file(const ellipse_scene *s, ef_reader *reader,
                           const colours *c, double scale, progress *p,
                           ef_error *error) {
  double *xyz = malloc(3 * BLOCK_ROWS * sizeof *xyz);
  ellipse_row *rows = malloc(BLOCK_ROWS * sizeof *rows);
  message_progress shown = message_progress_start(s->options->quiet);
  ef_status status = EF_OK;
  if (xyz == NULL || rows == NULL)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the rows");
  size_t n_here = 0;
  while (status == EF_OK) {
    ef_block block;
    status = ef_reader_next(reader, BLOCK_ROWS, &block, error);
    if (status != EF_OK || block.n == 0)
      break;
    n_here += block.n;
    status = colours_xyz(c, block.n, block.value, s->options->jobs, xyz, error);
    if (status != EF_OK)
      break;
    make_rows(s, &block, xyz, scale, rows);
    status = hand_on(s, p, block.n, rows, error);
    message_progress_show(&shown, p->count->n);
  }
  message_progress_end(&shown);
  free(xyz);
  free(rows);
  if (status == EF_OK && n_here == 0) {
    message_fail(error, EF_MALFORMED,
                 ef_reader_skipped(reader) > 0
                     ? "no row is left: every one was at fault"
                     : "there is a header and no row to read");
    status = message_place(error, ef_reader_get_head(reader)->file);
  }
  return status;
}

static ef_status add_file(const ellipse_scene *s, const char *path, progress *p,
                          const ef_notes *notes, ef_error *error) {
  ef_reader *reader =
      source_reader(s->options, path, source_kind(s->options), notes, error);
  if (reader == NULL)
    return error->status;
  const ef_reader_head *head = ef_reader_get_head(reader);
  colours c = {0};
  double scale;
  ef_status status = colours_init(&c, &s->basis, head, notes, error);
  if (status == EF_OK)
    status = luminance_scale(s, head, &scale, error);
  if (status == EF_OK)
    status = read_file(s, reader, &c, scale, p, error);
  p->count->n_skipped += ef_reader_skipped(reader);
  colours_free(&c);
  ef_reader_free(reader);
  return status;
}

ef_status ellipse_stream(ellipse_scene *s, const ef_notes *notes,
                         const ellipse_sink *sink, ellipse_count *count,
                         ef_error *error) {
  *count = (ellipse_count){0};
  progress p = {.sink = sink, .count = count};
  const bool is_asked = s->options->at.n > 0 || s->options->n_files > 0;
  ef_status status = s->from == BASIS_LAMPS ? add_lamps(s, &p, error)
                     : s->experiment != NULL && !is_asked
                         ? add_centers(s, &p, error)
                         : add_points(s, &p, notes, error);
  for (size_t i = 0; i < s->options->n_files && status == EF_OK; ++i) {
    status = add_file(s, s->options->files[i], &p, notes, error);
  }
  if (status == EF_OK && count->n_found == 0) {
    return message_fail(error, EF_NO_ANSWER, "there is no ellipse: %.400s",
                        p.reason);
  }
  return status;
}
