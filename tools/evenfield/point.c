/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "point.h"

#include <math.h>
#include <string.h>

#include "message.h"

typedef enum notation {
  NOTATION_LAB,
  NOTATION_XYZ,
  NOTATION_XYY,
  NOTATION_XY,
  N_NOTATIONS
} notation;

static const struct {
  const char *prefix;
  const char *numbers;
  int n;
} notations[N_NOTATIONS] = {[NOTATION_LAB] = {"lab", "L,a,b", 3},
                            [NOTATION_XYZ] = {"xyz", "X,Y,Z", 3},
                            [NOTATION_XYY] = {"xyy", "x,y,Y", 3},
                            [NOTATION_XY] = {"xy", "x,y", 2}};

static ef_status not_a_point(const char *option, const char *text,
                             const char *what, ef_error *error) {
  return message_fail(error, EF_UNKNOWN_NAME,
                      "--%s: \"%.100s\" %s; a colour is lab:L,a,b, xyz:X,Y,Z, "
                      "xyy:x,y,Y or xy:x,y",
                      option, text, what);
}

/* Numbers parted by commas; how many, or -1 for anything else. */
static int read_numbers(const char *text, double value[3]) {
  int n = 0;
  for (;;) {
    const size_t length = strcspn(text, ",");
    if (n == 3 || !ef_number_parse(text, length, '.', &value[n]))
      return -1;
    ++n;
    if (text[length] == '\0')
      return n;
    text += length + 1;
  }
}

static bool is_share(double value) {
  return value >= 0.0 && value <= 1.0;
}

/* The notation, and where its numbers start; N_NOTATIONS without a prefix. */
static notation find_prefix(const char *text, const char **numbers) {
  *numbers = text;
  for (int i = 0; i < N_NOTATIONS; ++i) {
    const size_t length = strlen(notations[i].prefix);
    if (strncmp(text, notations[i].prefix, length) == 0 &&
        text[length] == ':') {
      *numbers = text + length + 1;
      return (notation)i;
    }
  }
  return N_NOTATIONS;
}

static const char *fault_in_xy(double x, double y) {
  if (x < 0.0)
    return "has an x below zero";
  if (!(y > 0.0))
    return "has a y that is not above zero";
  return x + y > 1.0 ? "has an x and a y that together exceed 1" : NULL;
}

/* NULL, or what is wrong with the numbers. */
static const char *fault(notation kind, const double v[3]) {
  switch (kind) {
  case NOTATION_LAB:
    return v[0] < 0.0 ? "has an L* below zero" : NULL;
  case NOTATION_XYZ:
    return v[1] < 0.0 ? "has a Y below zero" : NULL;
  case NOTATION_XYY:
    return v[2] < 0.0 ? "has a Y below zero" : fault_in_xy(v[0], v[1]);
  default:
    return fault_in_xy(v[0], v[1]);
  }
}

point point_of_xyz(ef_xyz xyz, bool has_luminance) {
  const double none = (double)NAN;
  const ef_xyy c = ef_xyz_to_xyy(xyz);
  return (point){.xyz = has_luminance ? xyz : (ef_xyz){none, none, none},
                 .xy = {c.x, c.y},
                 .has_luminance = has_luminance};
}

static point make(notation kind, const double v[3], ef_xyz white) {
  switch (kind) {
  case NOTATION_LAB:
    return point_of_xyz(ef_lab_to_xyz((ef_lab){v[0], v[1], v[2]}, white), true);
  case NOTATION_XYZ:
    return point_of_xyz((ef_xyz){v[0], v[1], v[2]}, true);
  case NOTATION_XYY: {
    point p = point_of_xyz(ef_xyy_to_xyz((ef_xyy){v[0], v[1], v[2]}), true);
    p.xy = (ef_xy){v[0], v[1]};
    return p;
  }
  default: {
    point p = point_of_xyz((ef_xyz){0.0, 0.0, 0.0}, false);
    p.xy = (ef_xy){v[0], v[1]};
    return p;
  }
  }
}

ef_status point_parse(const char *option, const char *text, ef_xyz white,
                      const ef_notes *notes, point *out, ef_error *error) {
  const char *numbers;
  double v[3] = {0.0, 0.0, 0.0};
  notation kind = find_prefix(text, &numbers);
  const int n = read_numbers(numbers, v);
  if (kind == N_NOTATIONS && n == 2) {
    kind = NOTATION_XY;
  } else if (kind == N_NOTATIONS && n == 3) {
    kind = is_share(v[0]) && is_share(v[1]) ? NOTATION_XYY : NOTATION_LAB;
    message_note(notes, "--%s %.100s is taken as %s; %s:%.100s says so", option,
                 text, notations[kind].numbers, notations[kind].prefix, text);
  }
  if (kind == N_NOTATIONS || n != notations[kind].n)
    return not_a_point(option, text, "is none", error);
  const char *wrong = fault(kind, v);
  if (wrong != NULL)
    return not_a_point(option, text, wrong, error);
  *out = make(kind, v, white);
  return EF_OK;
}
