/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_describe.h"

#include <math.h>
#include <stdlib.h>

#include "document.h"
#include "message.h"
#include "part.h"

struct describe_data {
  document out;
};

static void record_receptors(record *r, const char *key, bool is_known,
                             const double value[EF_N_RECEPTORS]) {
  record_begin(r, key);
  for (int i = 0; i < EF_N_RECEPTORS; ++i) {
    record_number(r, ef_receptor_name((ef_receptor)i),
                  is_known ? value[i] : (double)NAN);
  }
  record_end(r);
}

/* Quantities with a unit where that of the light is known, ratios of all
 * lights. */
static void record_alpha(record *r, const description *d) {
  const ef_alpha_opic *a = &d->alpha;
  const bool is_known = d->has_alpha;
  const bool is_absolute = is_known && !isnan(d->luminance_cd_m2);
  const double none = (double)NAN;
  record_begin(r, "alpha_opic");
  record_receptors(r, "radiance_w_m2_sr", is_absolute, a->quantity);
  record_receptors(r, "equivalent_daylight_cd_m2", is_absolute,
                   a->equivalent_d65);
  record_receptors(r, "efficacy_mw_lm", is_known, a->efficacy_mw_lm);
  record_receptors(r, "daylight_ratio", is_known, a->daylight_ratio);
  record_number(r, "scotopic_cd_m2", is_absolute ? a->scotopic : none);
  record_number(r, "scotopic_photopic_ratio",
                is_known ? a->scotopic / a->photopic : none);
  record_end(r);
}

static void record_description(record *r, const describe_scene *s,
                               const description *d) {
  record_begin(r, NULL);
  record_text(r, "name", d->name);
  record_text(r, "file", d->file);
  record_text(r, "kind", d->kind);
  record_text(r, "observer", ef_observer_name(s->observer));
  record_text(r, "illuminant",
              d->kind[0] == 'l' ? "" : ef_illuminant_name(s->illuminant));
  record_xyz(r, d->xyz);
  record_number(r, "x", d->xyy.x);
  record_number(r, "y", d->xyy.y);
  record_number(r, "u_prime", d->uv.u_prime);
  record_number(r, "v_prime", d->uv.v_prime);
  record_lab(r, d->lab);
  record_number(r, "luminance_cd_m2", d->luminance_cd_m2);
  record_number(r, "cct_k", d->cct.cct_k);
  record_number(r, "duv", d->cct.duv);
  record_number(r, "Ra", d->Ra);
  record_number(r, "dominant_nm", d->dominant.dominant_nm);
  record_boolean(r, "dominant_is_complementary", d->dominant.complementary);
  record_number(r, "purity", d->dominant.purity);
  record_number(r, "cone_l", d->lms.cone_l);
  record_number(r, "cone_m", d->lms.cone_m);
  record_number(r, "cone_s", d->lms.cone_s);
  record_number(r, "rod", d->rod);
  record_number(r, "melanopsin", d->melanopsin);
  record_number(r, "mb_l", d->mb.mb_l);
  record_number(r, "mb_s", d->mb.mb_s);
  record_number(r, "whiteness", d->whiteness.whiteness);
  record_number(r, "tint", d->whiteness.tint);
  record_boolean(r, "is_white", d->whiteness.is_white);
  record_number(r, "yellowness", d->whiteness.yellowness);
  const bool is_known = d->daylight != NULL;
  record_begin(r, "daylight");
  record_text(r, "nearest", is_known ? d->daylight : "");
  record_number(r, "uv_distance",
                is_known ? d->daylight_distance : (double)NAN);
  record_boolean(r, "may_be_graded",
                 is_known && d->daylight_distance <= DESCRIBE_SIMULATOR_REACH);
  record_end(r);
  record_alpha(r, d);
  record_end(r);
}

describe_data *describe_data_new(const describe_scene *s, ef_output *output,
                                 bool is_csv, ef_error *error) {
  describe_data *d = calloc(1, sizeof *d);
  if (d == NULL) {
    message_fail(error, EF_NO_MEMORY, "out of memory for the result");
    return NULL;
  }
  if (document_open(&d->out, output, is_csv, error) != EF_OK) {
    describe_data_free(d);
    return NULL;
  }
  if (is_csv && !part_has_header(s->options))
    return d;
  if (is_csv) {
    const description none = {.name = "", .file = "", .kind = ""};
    record r = document_header(&d->out);
    record_description(&r, s, &none);
    return d;
  }
  ef_json *j = d->out.json;
  ef_json_text(j, "observer", ef_observer_name(s->observer));
  ef_json_text(j, "cones",
               ef_observer_cones_borrowed(s->observer)
                   ? "CIE 2006 fundamentals of the nearest field"
                   : "the observer's own");
  ef_json_number(j, "cones_field_deg", ef_observer_field_deg(s->observer));
  document_begin_rows(&d->out, "spectra");
  return d;
}

typedef struct block {
  const describe_scene *scene;
  const description *row;
} block;

static void write_one(const document *to, const void *self, size_t i) {
  const block *b = self;
  record r = document_row(to);
  record_description(&r, b->scene, &b->row[i]);
}

static ef_status rows(void *self, const describe_scene *s, size_t n,
                      const description *descriptions, ef_error *error) {
  describe_data *d = self;
  const block b = {s, descriptions};
  return document_write(&d->out, n, s->options->jobs, write_one, &b, error);
}

describe_sink describe_data_sink(describe_data *d) {
  return (describe_sink){.self = d, .rows = rows};
}

ef_status describe_data_finish(describe_data *d, size_t n_skipped,
                               ef_error *error) {
  document_end_rows(&d->out);
  if (d->out.json != NULL)
    ef_json_integer(d->out.json, "skipped_rows", (int64_t)n_skipped);
  return document_close(&d->out, error);
}

void describe_data_free(describe_data *d) {
  if (d != NULL)
    document_free(&d->out);
  free(d);
}
