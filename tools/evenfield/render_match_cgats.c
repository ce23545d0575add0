/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The values to show or print, and the colours they give, in the text form of
 * CGATS.17: what a press or a measuring program takes. */
#include "render_match.h"

#include <stdio.h>
#include <stdlib.h>

#include "message.h"

struct match_list {
  ef_output *output;
  ef_cgats *cgats;
  size_t n;
};

/* Percent of ink; of lights the highest code, as far as there are codes. */
static double full_drive(const match_scene *s) {
  if (s->device.is_subtractive)
    return 100.0;
  return s->device.bits > 0 ? (double)((1 << s->device.bits) - 1) : 255.0;
}

static ef_status begin(void *self, const match_scene *s, ef_error *error) {
  static const char *const rgb[] = {"RGB_R", "RGB_G", "RGB_B"};
  static const char *const cmy[] = {"CMY_C", "CMY_M", "CMY_Y"};
  static const char *const cmyk[] = {"CMYK_C", "CMYK_M", "CMYK_Y"};
  static const char *const colour[] = {"XYZ_X", "XYZ_Y", "XYZ_Z",
                                       "LAB_L", "LAB_A", "LAB_B"};
  match_list *l = self;
  if (s->recipes.device != NULL) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--format cgats has no fields for recipes: it goes "
                        "with --display and --inks");
  }
  l->cgats = ef_cgats_new(l->output, error);
  if (l->cgats == NULL)
    return error->status;
  ef_cgats_keyword(l->cgats, "ORIGINATOR", "evenfield match");
  ef_cgats_keyword(l->cgats, "FILE_DESCRIPTOR",
                   ef_device_name(s->device.device));
  /* The same targets give the same file. */
  ef_cgats_keyword(l->cgats, "CREATED", "date not recorded");
  char light[120];
  const bool reflects = ef_device_reflects(s->device.device);
  if (reflects || s->device.kind == &device_profile) {
    /* Profiles know their device's colours under D50. */
    snprintf(light, sizeof light, "ILLUMINANT, %.100s",
             reflects ? ef_illuminant_name(s->illuminant) : "D50");
    ef_cgats_keyword(l->cgats, "WEIGHTING_FUNCTION", light);
  }
  if (!s->device.is_subtractive) {
    /* A keyword of our own, announced as the standard wants it: nothing else
     * tells codes from percent. */
    char most[EF_NUMBER_TEXT];
    ef_number_format(full_drive(s), most);
    ef_cgats_keyword(l->cgats, "KEYWORD", "DEVICE_MAX");
    ef_cgats_keyword(l->cgats, "DEVICE_MAX", most);
  }
  ef_cgats_field(l->cgats, "SAMPLE_ID");
  ef_cgats_field(l->cgats, "SAMPLE_NAME");
  for (size_t i = 0; i < 3; ++i)
    ef_cgats_field(l->cgats, s->device.has_black        ? cmyk[i]
                             : s->device.is_subtractive ? cmy[i]
                                                        : rgb[i]);
  if (s->device.has_black)
    ef_cgats_field(l->cgats, "CMYK_K");
  for (size_t i = 0; i < 6; ++i)
    ef_cgats_field(l->cgats, colour[i]);
  return EF_OK;
}

static double value_of(const match_scene *s, const ef_match *m, size_t i) {
  return !s->device.is_subtractive && s->device.bits > 0
             ? (double)m->code[i]
             : full_drive(s) * match_achieved(s, m)->drive[i];
}

static ef_status add_rows(void *self, const match_scene *s,
                          const match_rows *rows, ef_error *error) {
  (void)error; /* the writer keeps its errors until it is finished */
  match_list *l = self;
  const ef_xyz white = ef_setup_white(s->setup);
  for (size_t k = 0; k < rows->n; ++k) {
    const ef_match *m = &rows->match[k];
    const ef_xyz xyz = match_achieved(s, m)->xyz;
    const ef_lab lab = ef_xyz_to_lab(xyz, white);
    const double colour[] = {xyz.X,      xyz.Y,      xyz.Z,
                             lab.L_star, lab.a_star, lab.b_star};
    ef_cgats_number(l->cgats, (double)++l->n);
    ef_cgats_text(l->cgats, rows->name[k]);
    for (size_t i = 0; i < 3; ++i)
      ef_cgats_number(l->cgats, value_of(s, m, i));
    if (s->device.has_black)
      ef_cgats_number(l->cgats, s->device.black_percent);
    for (size_t i = 0; i < 6; ++i)
      ef_cgats_number(l->cgats, colour[i]);
    ef_cgats_end_row(l->cgats);
  }
  return EF_OK;
}

static ef_status end(void *self, const match_scene *s, const match_summary *sum,
                     ef_error *error) {
  (void)s;
  (void)sum;
  match_list *l = self;
  ef_cgats *cgats = l->cgats;
  l->cgats = NULL;
  return ef_cgats_finish(cgats, error);
}

match_list *match_list_new(ef_output *output) {
  match_list *l = calloc(1, sizeof *l);
  if (l != NULL)
    l->output = output;
  return l;
}

void match_list_free(match_list *l) {
  if (l == NULL)
    return;
  ef_cgats_discard(l->cgats);
  free(l);
}

match_sink match_list_sink(match_list *l) {
  return (match_sink){.self = l, .begin = begin, .rows = add_rows, .end = end};
}
