/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Converted colours in the text form of CGATS.17. */
#include "render_convert.h"

#include <string.h>

#include "message.h"

/* Of a field of the standard, and what its values are multiplied with. */
typedef struct field_set {
  const char *space;
  size_t n;
  const char *name[4];
  double unit;
} field_set;

static const field_set sets[] = {
    {"RGB", 3, {"RGB_R", "RGB_G", "RGB_B"}, 255},
    {"CMY", 3, {"CMY_C", "CMY_M", "CMY_Y"}, 100},
    {"CMYK", 4, {"CMYK_C", "CMYK_M", "CMYK_Y", "CMYK_K"}, 100},
    {"XYZ", 3, {"XYZ_X", "XYZ_Y", "XYZ_Z"}, 1},
    {"Lab", 3, {"LAB_L", "LAB_A", "LAB_B"}, 1},
};

static const field_set *find_set(const conversion *c) {
  const char *space = c->target == CONVERT_TO_XYZ   ? "XYZ"
                      : c->target == CONVERT_TO_LAB ? "Lab"
                                                    : c->to_info.space;
  for (size_t i = 0; i < sizeof sets / sizeof sets[0]; ++i) {
    if (strcmp(sets[i].space, space) == 0)
      return &sets[i];
  }
  return NULL;
}

typedef struct list {
  ef_cgats *cgats;
  const field_set *set;
  size_t n;
} list;

static ef_status put(void *self, const conversion *c, size_t n,
                     const converted *row, ef_error *error) {
  list *l = self;
  (void)c;
  (void)error; /* the writer keeps its errors until it is finished */
  for (size_t i = 0; i < n; ++i) {
    ef_cgats_number(l->cgats, (double)++l->n);
    ef_cgats_text(l->cgats, row[i].name);
    for (size_t k = 0; k < l->set->n; ++k)
      ef_cgats_number(l->cgats, l->set->unit * row[i].out[k]);
    ef_cgats_end_row(l->cgats);
  }
  return EF_OK;
}

static void begin(const list *l, const conversion *c) {
  ef_cgats_keyword(l->cgats, "ORIGINATOR", "evenfield profile convert");
  ef_cgats_keyword(l->cgats, "FILE_DESCRIPTOR", c->file);
  /* The same colours give the same file. */
  ef_cgats_keyword(l->cgats, "CREATED", "date not recorded");
  if (c->target != CONVERT_TO_DEVICE) {
    ef_cgats_keyword(l->cgats, "WEIGHTING_FUNCTION", "ILLUMINANT, D50");
    ef_cgats_keyword(l->cgats, "WEIGHTING_FUNCTION", "OBSERVER, 2 degree");
  } else if (strcmp(l->set->space, "RGB") == 0) {
    ef_cgats_keyword(l->cgats, "KEYWORD", "DEVICE_MAX");
    ef_cgats_keyword(l->cgats, "DEVICE_MAX", "255");
  }
  ef_cgats_field(l->cgats, "SAMPLE_ID");
  ef_cgats_field(l->cgats, "SAMPLE_NAME");
  for (size_t i = 0; i < l->set->n; ++i)
    ef_cgats_field(l->cgats, l->set->name[i]);
}

ef_status render_conversion_cgats(conversion *c, ef_output *output,
                                  convert_summary *sum, ef_error *error) {
  list l = {.set = find_set(c)};
  if (l.set == NULL)
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--format cgats has no fields for device values of "
                        "space %s: RGB, CMY, CMYK, xyz and lab have",
                        c->to_info.space);
  l.cgats = ef_cgats_new(output, error);
  if (l.cgats == NULL)
    return error->status;
  begin(&l, c);
  const convert_sink sink = {&l, put};
  const ef_status status = conversion_stream(c, &sink, sum, error);
  ef_error late;
  const ef_status finished =
      ef_cgats_finish(l.cgats, status == EF_OK ? error : &late);
  return status != EF_OK ? status : finished;
}
