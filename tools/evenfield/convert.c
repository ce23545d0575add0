/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "convert.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "source.h"

/* ---- The two ends -------------------------------------------------------- */

ef_status convert_target(const char *name, convert_to *target, ef_profile **out,
                         ef_error *error) {
  *target = strcmp(name, "xyz") == 0   ? CONVERT_TO_XYZ
            : strcmp(name, "lab") == 0 ? CONVERT_TO_LAB
                                       : CONVERT_TO_DEVICE;
  if (*target != CONVERT_TO_DEVICE)
    return EF_OK;
  *out = profile_file_load(name, "to", error);
  return *out != NULL ? EF_OK : error->status;
}

static ef_status load_ends(conversion *c, ef_error *error) {
  const command_options *o = c->options;
  if (o->from != NULL) {
    c->from = profile_file_load(o->from, "from", error);
    if (c->from == NULL)
      return error->status;
    c->from_info = ef_profile_get_info(c->from);
  }
  const ef_status status = convert_target(o->to, &c->target, &c->to, error);
  if (status != EF_OK)
    return status;
  if (c->to != NULL)
    c->to_info = ef_profile_get_info(c->to);
  if (c->from == NULL && c->to == NULL) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "neither --from nor --to names a profile; `evenfield "
                        "describe` turns colours into other coordinates");
  }
  return EF_OK;
}

static ef_transform *between(const conversion *c, const ef_profile *from,
                             const ef_profile *to, bool lab, ef_error *error) {
  const ef_transform_settings settings = {
      .intent = c->settings.intent,
      .black_point_compensation = c->settings.black_point_compensation,
      .lab = lab};
  return ef_transform_new(from, to, &settings, error);
}

/* What was asked for and what comes out, both as X, Y, Z: without them there is
 * no judgement, but the conversion stands. */
static void load_judges(conversion *c) {
  ef_error ignored;
  if (c->to == NULL)
    return;
  c->given = between(c, c->to, NULL, false, &ignored);
  if (c->given != NULL && c->from != NULL)
    c->asked = between(c, c->from, NULL, false, &ignored);
}

static ef_status load_transforms(conversion *c, ef_error *error) {
  c->convert = between(c, c->from, c->to, c->target == CONVERT_TO_LAB, error);
  if (c->convert == NULL)
    return error->status;
  load_judges(c);
  c->n_in = ef_transform_inputs(c->convert);
  c->n_out = ef_transform_outputs(c->convert);
  return EF_OK;
}

/* ---- The file ------------------------------------------------------------ */

static ef_status load_adaptation(conversion *c, const ef_reader_head *head,
                                 const ef_notes *notes, ef_error *error) {
  const command_options *o = c->options;
  const bool is_spectral = head->content == EF_CONTENT_SPECTRA;
  ef_adaptation adaptation = EF_ADAPT_BRADFORD;
  if (o->adaptation != NULL &&
      ef_adaptation_find(o->adaptation, &adaptation, error) != EF_OK)
    return message_option(error, "adaptation", "");
  c->observer = ef_observer_new("cie-1931", error);
  if (c->observer != NULL)
    c->illuminant = source_illuminant(
        o, "illuminant", o->illuminant != NULL ? o->illuminant : "D50", notes,
        error);
  if (c->illuminant == NULL)
    return error->status;
  colour_basis basis;
  ef_reader_head plain = *head; /* its device values are not asked for */
  plain.n_device = 0;
  ef_status status =
      colour_basis_init(&basis, c->observer, c->illuminant, error);
  if (status == EF_OK)
    status = colours_init(&c->colours, &basis, &plain, notes, error);
  if (status == EF_OK)
    status =
        ef_adaptation_matrix(adaptation, basis.white,
                             (ef_xyz){96.42, 100.0, 82.49}, c->adapt, error);
  if (status == EF_OK && is_spectral && head->kind == EF_LIGHT) {
    message_fail(error, EF_MALFORMED,
                 "has spectra of lights, which have no white to be seen "
                 "against; give surfaces, X,Y,Z, x,y,Y or L,a,b");
    status = message_place(error, c->file);
  }
  return status;
}

static void name_columns(conversion *c) {
  static const char *const xyz[] = {"X", "Y", "Z"};
  static const char *const lab[] = {"L", "a", "b"};
  static const char *const xyy[] = {"x", "y", "Y"};
  const char *const *in = c->content == EF_CONTENT_LAB   ? lab
                          : c->content == EF_CONTENT_XYY ? xyy
                                                         : xyz;
  for (size_t i = 0; i < 3; ++i) {
    c->in_name[i] = in[i];
    c->out_name[i] = c->target == CONVERT_TO_LAB ? lab[i] : xyz[i];
  }
  if (c->from != NULL)
    profile_channel_names(&c->from_info, c->in_name);
  if (c->to != NULL)
    profile_channel_names(&c->to_info, c->out_name);
}

static ef_status load_file(conversion *c, const ef_notes *notes,
                           ef_error *error) {
  c->reader =
      source_reader(c->options, c->file, source_kind(c->options), notes, error);
  if (c->reader == NULL)
    return error->status;
  const ef_reader_head *head = ef_reader_get_head(c->reader);
  c->content = head->content;
  ef_status status = EF_OK;
  if (c->from != NULL) {
    status = profile_check_columns(&c->from_info, c->options->from, c->file,
                                   head, error);
    if (status == EF_OK && head->width > 0)
      message_note(notes,
                   "%s: the device values are converted; %s beside "
                   "them are not used",
                   c->file, ef_content_text(head->content));
    c->content = EF_CONTENT_DEVICE;
  } else if (head->content == EF_CONTENT_DEVICE) {
    message_fail(error, EF_MALFORMED,
                 "has device values alone; --from PROFILE says what colours "
                 "they stand for");
    status = message_place(error, c->file);
  } else {
    status = load_adaptation(c, head, notes, error);
  }
  name_columns(c);
  return status;
}

ef_status conversion_load(conversion *c, const command_options *options,
                          const ef_notes *notes, ef_error *error) {
  *c = (conversion){.options = options, .file = options->files[1]};
  ef_status status = measure_load(&c->measure, options, error);
  if (status == EF_OK)
    status = profile_settings_load(options->intent, options->scale_black,
                                   &c->settings, error);
  if (status == EF_OK)
    status = load_ends(c, error);
  if (status == EF_OK)
    status = load_transforms(c, error);
  if (status == EF_OK)
    status = load_file(c, notes, error);
  return status;
}

void conversion_free(conversion *c) {
  ef_transform_free(c->convert);
  ef_transform_free(c->asked);
  ef_transform_free(c->given);
  colours_free(&c->colours);
  ef_illuminant_free(c->illuminant);
  ef_observer_free(c->observer);
  ef_reader_free(c->reader);
  ef_profile_free(c->from);
  ef_profile_free(c->to);
  measure_free(&c->measure);
}

/* ---- Rows ---------------------------------------------------------------- */

enum { BLOCK_ROWS = 1024 };

/* Room for a block of rows. */
typedef struct work {
  double in[BLOCK_ROWS * EF_MAX_DRIVES], out[BLOCK_ROWS * EF_MAX_DRIVES];
  double asked[BLOCK_ROWS * 3], given[BLOCK_ROWS * 3];
  converted row[BLOCK_ROWS];
} work;

/* What goes into the transform, in w->in. */
static ef_status take_in(const conversion *c, const ef_block *block, work *w,
                         ef_error *error) {
  if (c->from != NULL) {
    memcpy(w->in, block->device, block->n * c->n_in * sizeof *w->in);
    return EF_OK;
  }
  const ef_status status = colours_xyz(&c->colours, block->n, block->value,
                                       c->options->jobs, w->in, error);
  for (size_t i = 0; status == EF_OK && i < block->n; ++i) {
    double *v = w->in + 3 * i;
    const ef_xyz at = ef_xyz_transform(c->adapt, (ef_xyz){v[0], v[1], v[2]});
    v[0] = at.X;
    v[1] = at.Y;
    v[2] = at.Z;
  }
  return status;
}

static double off_by(const conversion *c, const double *asked,
                     const double *given) {
  const ef_conditions conditions =
      ef_conditions_default((ef_xyz){96.42, 100.0, 82.49});
  double p[3], q[3];
  ef_metric_coordinates(c->measure.metric,
                        (ef_xyz){asked[0], asked[1], asked[2]}, &conditions, p);
  ef_metric_coordinates(c->measure.metric,
                        (ef_xyz){given[0], given[1], given[2]}, &conditions, q);
  return ef_metric_difference(c->measure.metric, p, q);
}

static ef_status convert_block(const conversion *c, const ef_block *block,
                               work *w, ef_error *error) {
  const size_t n = block->n;
  const int jobs = c->options->jobs;
  ef_status status = take_in(c, block, w, error);
  if (status == EF_OK)
    status = ef_transform_apply(c->convert, n, w->in, jobs, w->out, error);
  if (status == EF_OK && c->given != NULL)
    status = ef_transform_apply(c->given, n, w->out, jobs, w->given, error);
  const double *asked = w->in;
  if (status == EF_OK && c->asked != NULL) {
    status = ef_transform_apply(c->asked, n, w->in, jobs, w->asked, error);
    asked = w->asked;
  }
  const bool is_judged =
      c->given != NULL && (c->from == NULL || c->asked != NULL);
  for (size_t i = 0; status == EF_OK && i < n; ++i) {
    converted *row = &w->row[i];
    *row = (converted){.name = block->name[i], .line = block->line[i]};
    /* As the file has them, where they are shown. */
    const double *shown = c->from != NULL ? block->device + i * c->n_in
                          : c->content == EF_CONTENT_SPECTRA
                              ? w->in + 3 * i
                              : block->value + 3 * i;
    memcpy(row->in, shown, c->n_in * sizeof *row->in);
    memcpy(row->out, w->out + i * c->n_out, c->n_out * sizeof *row->out);
    row->difference =
        is_judged ? off_by(c, asked + 3 * i, w->given + 3 * i) : (double)NAN;
  }
  return status;
}

static void count(const conversion *c, size_t n, const converted *row,
                  convert_summary *sum) {
  for (size_t i = 0; i < n; ++i) {
    ++sum->n;
    if (isnan(row[i].difference))
      continue;
    ++sum->n_judged;
    sum->mean += (row[i].difference - sum->mean) / (double)sum->n_judged;
    sum->n_noticed += row[i].difference > c->measure.jnd;
    sum->n_beyond += row[i].difference > c->measure.tolerance;
    if (sum->n_judged > 1 && !(row[i].difference > sum->worst))
      continue;
    sum->worst = row[i].difference;
    snprintf(sum->worst_name, sizeof sum->worst_name, "%s", row[i].name);
  }
}

ef_status conversion_stream(conversion *c, const convert_sink *sink,
                            convert_summary *sum, ef_error *error) {
  *sum = (convert_summary){0};
  work *w = malloc(sizeof *w);
  if (w == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for rows");
  message_progress progress = message_progress_start(c->options->quiet);
  ef_status status;
  ef_block block;
  do {
    status = ef_reader_next(c->reader, BLOCK_ROWS, &block, error);
    if (status != EF_OK || block.n == 0)
      break;
    status = convert_block(c, &block, w, error);
    if (status == EF_OK)
      status = sink->rows(sink->self, c, block.n, w->row, error);
    if (status == EF_OK)
      count(c, block.n, w->row, sum);
    message_progress_show(&progress, sum->n);
  } while (status == EF_OK);
  message_progress_end(&progress);
  sum->n_skipped = ef_reader_skipped(c->reader);
  free(w);
  if (status == EF_OK && sum->n == 0) {
    message_fail(error, EF_MALFORMED, "there is a header and no row to read");
    status = message_place(error, c->file);
  }
  return status;
}
