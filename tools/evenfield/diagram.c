/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "diagram.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <evenfield/match.h>

#include "message.h"

/* ---- Planes ------------------------------------------------------------ */

typedef struct plane_row {
  const char *name, *x_title, *y_title;
  bool equal_scales, is_chromaticity;
} plane_row;

static const plane_row planes[] = {
    {"u', v'", "u\xE2\x80\xB2", "v\xE2\x80\xB2", true, true},
    {"x, y", "x", "y", true, true},
    {"a*, b*", "a*", "b*", true, false},
    {"C*, L*", "C*", "L*", true, false},
    {"differences of a*, b*", "", "", true, false}};

ef_chart_settings diagram_settings(diagram_plane plane) {
  ef_chart_settings settings = ef_chart_settings_default();
  settings.x_title = planes[plane].x_title;
  settings.y_title = planes[plane].y_title;
  settings.equal_scales = planes[plane].equal_scales;
  return settings;
}

/* U+0394: a difference. */
void diagram_set_differences(ef_chart_settings *settings, diagram_plane plane) {
  const bool is_ab = plane != PLANE_LC;
  settings->equal_scales = true;
  settings->x_title = is_ab ? "\xCE\x94" "a*" : "\xCE\x94" "C*";
  settings->y_title = is_ab ? "\xCE\x94" "b*" : "\xCE\x94" "L*";
}

const char *diagram_plane_name(diagram_plane plane) {
  return planes[plane].name;
}

bool diagram_is_chromaticity(diagram_plane plane) {
  return planes[plane].is_chromaticity;
}

/* Chromaticities far from all that light can have are nowhere on a chart, which
 * else would shrink around them; the primaries of encodings are not as far. */
static ef_xy on_chart(double x, double y) {
  const double least = -0.25, most = 1.25;
  const double nowhere = (double)NAN;
  const bool is_on = x > least && x < most && y > least && y < most;
  return is_on ? (ef_xy){x, y} : (ef_xy){nowhere, nowhere};
}

ef_xy diagram_point(diagram_plane plane, ef_xyz xyz, ef_xyz white) {
  switch (plane) {
  case PLANE_XY: {
    const ef_xyy at = ef_xyz_to_xyy(xyz);
    return on_chart(at.x, at.y);
  }
  case PLANE_UV: {
    const ef_uv at = ef_xyz_to_uv(xyz);
    return on_chart(at.u_prime, at.v_prime);
  }
  case PLANE_PEOPLE:
  case PLANE_AB: {
    const ef_lab at = ef_xyz_to_lab(xyz, white);
    return (ef_xy){at.a_star, at.b_star};
  }
  case PLANE_LC:
    break;
  }
  const ef_lch at = ef_lab_to_lch(ef_xyz_to_lab(xyz, white));
  return (ef_xy){at.C_star, at.L_star};
}

/* ---- Charts ------------------------------------------------------------ */

ef_status diagram_init(diagram *d, const ef_chart_settings *settings,
                       diagram_plane plane, ef_xyz white, ef_error *error) {
  *d = (diagram){
      .chart = ef_chart_new(settings, error), .plane = plane, .white = white};
  return d->chart != NULL ? EF_OK : error->status;
}

void diagram_free(diagram *d) {
  ef_chart_free(d->chart);
  *d = (diagram){0};
}

static ef_xy locus_point(const diagram *d, ef_xy xy) {
  if (d->plane == PLANE_XY)
    return xy;
  const ef_uv uv = ef_xy_to_uv(xy);
  return (ef_xy){uv.u_prime, uv.v_prime};
}

/* Ends of the locus in nm, as for the areas of gamuts, and the wavelengths
 * that are named on it. */
enum { LOCUS_FROM = 380, LOCUS_TO = 780, LOCUS_POINTS = 401 };
static const double named_nm[] = {380, 460, 470, 480, 490, 500, 520,
                                  540, 560, 580, 600, 620, 700};
static const char *const named[] = {"380", "460", "470", "480", "490",
                                    "500", "520", "540", "560", "580",
                                    "600", "620", "700"};
enum { N_NAMED = sizeof named / sizeof *named };

static ef_status add_named(diagram *d, const ef_observer *observer,
                           ef_error *error) {
  ef_xy xy[N_NAMED];
  double x[N_NAMED], y[N_NAMED];
  const ef_status status = ef_locus_xy(observer, N_NAMED, named_nm, xy, error);
  if (status != EF_OK)
    return status;
  for (size_t i = 0; i < N_NAMED; ++i) {
    const ef_xy at = locus_point(d, xy[i]);
    x[i] = at.x;
    y[i] = at.y;
  }
  ef_series marks = ef_series_default(EF_SERIES_MARKS);
  marks.look = EF_LOOK_FRAME;
  marks.n = N_NAMED;
  marks.x = x;
  marks.y = y;
  marks.label = named;
  return ef_chart_add(d->chart, &marks, error);
}

ef_status diagram_add_locus(diagram *d, const ef_observer *observer,
                            ef_error *error) {
  if (!diagram_is_chromaticity(d->plane))
    return EF_OK;
  double nm[LOCUS_POINTS], x[LOCUS_POINTS + 1], y[LOCUS_POINTS + 1];
  ef_xy xy[LOCUS_POINTS];
  for (size_t i = 0; i < LOCUS_POINTS; ++i)
    nm[i] = LOCUS_FROM + (double)i;
  ef_status status = ef_locus_xy(observer, LOCUS_POINTS, nm, xy, error);
  if (status != EF_OK)
    return status;
  size_t n = 0;
  for (size_t i = 0; i < LOCUS_POINTS; ++i) {
    if (isnan(xy[i].x))
      continue;
    const ef_xy at = locus_point(d, xy[i]);
    x[n] = at.x;
    y[n] = at.y;
    ++n;
  }
  if (n == 0)
    return EF_OK;
  x[n] = x[0]; /* the purple line */
  y[n] = y[0];
  ef_series line = ef_series_default(EF_SERIES_LINE);
  line.look = EF_LOOK_FRAME;
  line.name = "spectrum locus, wavelengths in nm";
  line.n = n + 1;
  line.x = x;
  line.y = y;
  status = ef_chart_add(d->chart, &line, error);
  return status == EF_OK ? add_named(d, observer, error) : status;
}

/* ---- Gamuts ------------------------------------------------------------ */

static ef_status add_region(diagram *d, const char *name, size_t n,
                            const double *x, const double *y,
                            const char *const *label, ef_error *error) {
  ef_series region = ef_series_default(EF_SERIES_REGION);
  region.look = 3;
  region.name = name;
  region.n = n;
  region.x = x;
  region.y = y;
  region.label = label;
  return ef_chart_add(d->chart, &region, error);
}

static ef_status add_polygon(diagram *d, const ef_setup *setup,
                             ef_error *error) {
  const ef_device *device = ef_setup_device(setup);
  const size_t n = ef_device_n_drives(device);
  double x[EF_MAX_DRIVES], y[EF_MAX_DRIVES];
  const char *label[EF_MAX_DRIVES];
  for (size_t i = 0; i < n; ++i) {
    double amount[EF_MAX_DRIVES] = {0.0};
    amount[i] = 1.0;
    const ef_xy at =
        diagram_point(d->plane, ef_setup_xyz(setup, amount, NULL), d->white);
    x[i] = at.x;
    y[i] = at.y;
    label[i] = ef_device_drive_name(device, i);
  }
  return add_region(d, "gamut: mixtures of the primaries", n, x, y, label,
                    error);
}

/* Points of a face of the cube of amounts in each of its directions, and the
 * directions in which the outline is told. */
enum { FACE_STEPS = 128, OUTLINE = 90 };

/* The point that lies farthest from the white in each direction. */
typedef struct outline {
  ef_xy center;
  double reach[OUTLINE];
  ef_xy farthest[OUTLINE];
} outline;

static void reach_out(outline *o, ef_xy at) {
  const double dx = at.x - o->center.x, dy = at.y - o->center.y;
  const double reach = hypot(dx, dy);
  if (!(reach > 0.0))
    return;
  const double turn = atan2(dy, dx) / (2.0 * acos(-1.0)) + 0.5;
  const size_t i = (size_t)(turn * OUTLINE) % OUTLINE;
  if (reach > o->reach[i]) {
    o->reach[i] = reach;
    o->farthest[i] = at;
  }
}

static void reach_face(const diagram *d, const ef_setup *setup, size_t fixed,
                       double value, outline *o) {
  const size_t a = (fixed + 1) % 3, b = (fixed + 2) % 3;
  for (int i = 0; i <= FACE_STEPS; ++i) {
    for (int j = 0; j <= FACE_STEPS; ++j) {
      double amount[EF_MAX_DRIVES] = {0.0};
      /* Finer towards dark colours, as lightness is. */
      const double p = (double)i / FACE_STEPS, q = (double)j / FACE_STEPS;
      amount[fixed] = value;
      amount[a] = p * p;
      amount[b] = q * q;
      reach_out(o, diagram_point(d->plane, ef_setup_xyz(setup, amount, NULL),
                                 d->white));
    }
  }
}

static ef_status add_outline(diagram *d, const ef_setup *setup,
                             ef_error *error) {
  outline o = {.center =
                   diagram_point(d->plane, ef_setup_white(setup), d->white)};
  for (size_t fixed = 0; fixed < 3; ++fixed) {
    reach_face(d, setup, fixed, 0.0, &o);
    reach_face(d, setup, fixed, 1.0, &o);
  }
  double x[OUTLINE], y[OUTLINE];
  size_t n = 0;
  for (size_t i = 0; i < OUTLINE; ++i) {
    if (o.reach[i] == 0.0)
      continue;
    x[n] = o.farthest[i].x;
    y[n] = o.farthest[i].y;
    ++n;
  }
  return add_region(d,
                    d->plane == PLANE_AB
                        ? "gamut: the most chroma at each hue, at any lightness"
                        : "gamut: the farthest from white in each direction",
                    n, x, y, NULL, error);
}

ef_status diagram_add_gamut(diagram *d, const ef_setup *setup,
                            ef_error *error) {
  if (d->plane == PLANE_LC || ef_device_n_drives(ef_setup_device(setup)) != 3)
    return EF_OK;
  return diagram_is_chromaticity(d->plane) && ef_setup_affine(setup)
             ? add_polygon(d, setup, error)
             : add_outline(d, setup, error);
}

ef_status diagram_add_section(diagram *d, const ef_setup *setup, double L_star,
                              ef_error *error) {
  if (ef_device_n_drives(ef_setup_device(setup)) != 3)
    return EF_OK;
  ef_gamut_section section;
  ef_status status = ef_gamut_section_new(setup, L_star, &section, error);
  size_t first = 0, n_points = 0;
  d->has_empty_section = status == EF_OK && section.n_loops == 0;
  for (size_t k = 0; k < section.n_loops; ++k)
    n_points += section.n[k];
  double *x = malloc((2 * n_points + 1) * sizeof *x);
  if (status == EF_OK && x == NULL)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  for (size_t i = 0; i < n_points && status == EF_OK; ++i) {
    x[i] = section.point[i].a_star;
    x[n_points + i] = section.point[i].b_star;
  }
  char name[80], lightness[EF_NUMBER_TEXT];
  ef_number_format_fixed(L_star, 1, lightness);
  snprintf(name, sizeof name, "gamut at L* %s", lightness);
  for (size_t k = 0; k < section.n_loops && status == EF_OK; ++k) {
    status = add_region(d, k == 0 ? name : NULL, section.n[k], x + first,
                        x + n_points + first, NULL, error);
    first += section.n[k];
  }
  free(x);
  ef_gamut_section_free(&section);
  return status;
}

ef_status diagram_add_origin(diagram *d, const char *name, ef_error *error) {
  const double middle = 0.0;
  ef_series mark = ef_series_default(EF_SERIES_MARKS);
  mark.look = EF_LOOK_FRAME;
  mark.n = 1;
  mark.x = mark.y = &middle;
  mark.label = &name;
  return ef_chart_add(d->chart, &mark, error);
}

ef_status diagram_add_white(diagram *d, const char *name, ef_error *error) {
  const ef_xy at = diagram_point(d->plane, d->white, d->white);
  const char *const label[] = {name};
  ef_series marks = ef_series_default(EF_SERIES_MARKS);
  marks.look = EF_LOOK_FRAME;
  marks.n = 1;
  marks.x = &at.x;
  marks.y = &at.y;
  marks.label = label;
  return ef_chart_add(d->chart, &marks, error);
}

/* ---- The file ---------------------------------------------------------- */

exit_code diagram_check_usage(const command_options *options) {
  const char *path = options->chart;
  if (path != NULL && !ef_chart_knows(path)) {
    return message_usage("--chart names a file that ends in .svg, .pdf or "
                         ".png, not \"%.100s\"",
                         path);
  }
  if (path == NULL && options->plane >= 0)
    return message_usage("--plane is for charts: --chart names their file");
  if (path == NULL && !isnan(options->lightness))
    return message_usage("--lightness is for charts: --chart names their file");
  if (!isnan(options->lightness) && options->plane >= 0 &&
      options->plane != PLANE_AB)
    return message_usage("--lightness cuts the gamut in the plane of a*, b*: "
                         "--plane ab, or none");
  if (options->plane == PLANE_PEOPLE && isnan(options->population) &&
      options->categories == 0)
    return message_usage("--plane people shows what people see: --population "
                         "says how many");
  return EXIT_DONE;
}

ef_status diagram_write(const diagram *d, const char *path,
                        const ef_notes *notes, ef_error *error) {
  ef_chart_report report;
  const ef_status status = ef_chart_write(d->chart, path, &report, error);
  if (status == EF_EXISTS) {
    message_fail(error, EF_EXISTS,
                 "is there already; --force overwrites it, or name another "
                 "file with --chart");
    return message_place(error, path);
  }
  if (status != EF_OK)
    return error->file[0] == '\0' ? message_place(error, path) : status;
  if (report.n_drawn < report.n_points) {
    message_note(notes,
                 "%s: %zu of %zu points are drawn; the others lie on or beside "
                 "these, or outside the axes",
                 path, report.n_drawn, report.n_points);
  }
  if (report.n_labelled < report.n_labels) {
    message_note(notes, "%s: %zu of %zu names found no room", path,
                 report.n_labels - report.n_labelled, report.n_labels);
  }
  if (!report.has_text) {
    message_note(notes, "%s has no text: no font was found", path);
  }
  return EF_OK;
}
