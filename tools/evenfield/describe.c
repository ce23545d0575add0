/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "describe.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "source.h"

enum { BLOCK_ROWS = 8192 };

/* Those of ISO/CIE 23603 (CIE S 012). */
static const char *const daylights[] = {"D50", "D55", "D65", "D75"};
enum { N_DAYLIGHTS = sizeof daylights / sizeof daylights[0] };

/* ---- Loading ----------------------------------------------------------- */

static ef_status set_equal_energy(describe_scene *s, ef_error *error) {
  ef_illuminant *e = ef_illuminant_new("E", error);
  if (e == NULL)
    return error->status;
  colour_basis basis;
  const ef_status status = colour_basis_init(&basis, s->observer, e, error);
  if (status == EF_OK) {
    const ef_xyy white = ef_xyz_to_xyy(basis.white);
    s->equal_energy = (ef_xy){white.x, white.y};
  }
  ef_illuminant_free(e);
  return status;
}

ef_status describe_scene_load(describe_scene *s, const command_options *options,
                              const ef_notes *notes, ef_error *error) {
  *s = (describe_scene){.options = options};
  s->observer = source_observer(options, notes, error);
  if (s->observer == NULL)
    return error->status;
  if (strcmp(ef_observer_name(s->observer), "cie-1931") != 0) {
    s->observer_1931 = ef_observer_new("cie-1931", error);
    if (s->observer_1931 == NULL)
      return error->status;
  }
  const char *name = options->illuminant != NULL ? options->illuminant : "D65";
  s->illuminant = source_illuminant(options, "illuminant", name, notes, error);
  if (s->illuminant == NULL)
    return error->status;
  const ef_status status =
      colour_basis_init(&s->basis, s->observer, s->illuminant, error);
  /* Defined for a few lights only: that there is none is no failure. */
  ef_error ignored;
  s->white_scale =
      ef_white_scale_find(ef_observer_name(s->observer),
                          ef_illuminant_name(s->illuminant), &ignored);
  return status == EF_OK ? set_equal_energy(s, error) : status;
}

void describe_scene_free(describe_scene *s) {
  ef_illuminant_free(s->illuminant);
  ef_observer_free(s->observer_1931);
  ef_observer_free(s->observer);
}

/* ---- One file ---------------------------------------------------------- */

/* What one file's rows go through. */
typedef struct file_work {
  const ef_reader_head *head;
  bool is_light; /* no illuminant makes its white */
  colours colours;
  ef_weights *receptors; /* of spectra */
  ef_weights *xyz_1931;  /* of lights, when the observer is another */
  ef_weights *alpha;     /* of spectra of lights */
  ef_weights *xyz_1964;  /* the same */
  ef_uv daylight[N_DAYLIGHTS];
  bool has_white;
  ef_xyz white;         /* Y = 100 */
  double white_level;   /* Y of the white in the unit of the rows */
  double *xyz, *xyz_31; /* BLOCK_ROWS x 3 each */
  double *excitation;   /* BLOCK_ROWS x EF_N_RECEPTORS */
  double *xyz_64;       /* of spectra of lights, BLOCK_ROWS x 3 */
  double *sums;         /* BLOCK_ROWS x EF_ALPHA_OPIC_CHANNELS */
  ef_xyy *xyy;          /* BLOCK_ROWS, as the three that follow */
  ef_xy *xy;
  ef_dominant *dominant;
  description *out;
} file_work;

static void work_free(file_work *w) {
  colours_free(&w->colours);
  ef_weights_free(w->receptors);
  ef_weights_free(w->xyz_1931);
  ef_weights_free(w->alpha);
  ef_weights_free(w->xyz_1964);
  free(w->xyz_64);
  free(w->xyz);
  free(w->xyz_31);
  free(w->excitation);
  free(w->sums);
  free(w->xyy);
  free(w->xy);
  free(w->dominant);
  free(w->out);
}

/* The daylights, and what tells lights from them. */
static ef_status fold_daylights(file_work *w, const ef_viewing *viewing,
                                ef_error *error) {
  ef_observer *observer = ef_observer_new("cie-1964", error);
  if (observer == NULL)
    return error->status;
  ef_status status = EF_OK;
  for (size_t i = 0; i < N_DAYLIGHTS && status == EF_OK; ++i) {
    const ef_grid working = ef_grid_standard();
    double white[3];
    ef_illuminant *light = ef_illuminant_new(daylights[i], error);
    status = light == NULL ? error->status
                           : ef_observer_white(observer, EF_TRISTIMULUS, light,
                                               &working, white, error);
    ef_illuminant_free(light);
    if (status == EF_OK)
      w->daylight[i] = ef_xyz_to_uv((ef_xyz){white[0], white[1], white[2]});
  }
  w->xyz_1964 = ef_observer_weights(observer, EF_TRISTIMULUS, &w->head->grid,
                                    viewing, NULL, error);
  ef_observer_free(observer);
  w->xyz_64 = malloc(3 * BLOCK_ROWS * sizeof *w->xyz_64);
  if (w->xyz_64 == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the rows");
  return status == EF_OK && w->xyz_1964 == NULL ? error->status : status;
}

static ef_status fold_more(file_work *w, const describe_scene *s,
                           ef_error *error) {
  ef_viewing viewing = ef_viewing_default(w->is_light ? NULL : s->illuminant);
  viewing.absolute = w->is_light && w->head->absolute;
  w->receptors = ef_observer_weights(s->observer, EF_RECEPTORS, &w->head->grid,
                                     &viewing, NULL, error);
  if (w->receptors == NULL)
    return error->status;
  if (!w->is_light)
    return EF_OK;
  w->alpha = ef_alpha_opic_weights(&w->head->grid, &viewing, NULL, error);
  if (w->alpha == NULL)
    return error->status;
  const ef_status status = fold_daylights(w, &viewing, error);
  if (status != EF_OK)
    return status;
  if (s->observer_1931 == NULL)
    return EF_OK;
  w->xyz_1931 = ef_observer_weights(s->observer_1931, EF_TRISTIMULUS,
                                    &w->head->grid, &viewing, NULL, error);
  return w->xyz_1931 != NULL ? EF_OK : error->status;
}

static ef_status work_init(file_work *w, const describe_scene *s,
                           const ef_reader_head *head, const ef_notes *notes,
                           ef_error *error) {
  const bool spectra = head->content == EF_CONTENT_SPECTRA;
  *w = (file_work){.head = head};
  w->is_light = head->kind == EF_LIGHT || (!spectra && head->absolute);
  ef_status status = colours_init(&w->colours, &s->basis, head, notes, error);
  if (status == EF_OK && spectra)
    status = fold_more(w, s, error);
  if (status != EF_OK)
    return status;
  w->has_white = !w->is_light;
  w->white = s->basis.white;
  w->white_level = 100.0;
  w->xyz = malloc(3 * BLOCK_ROWS * sizeof *w->xyz);
  w->xyz_31 = malloc(3 * BLOCK_ROWS * sizeof *w->xyz_31);
  w->excitation = malloc(EF_N_RECEPTORS * BLOCK_ROWS * sizeof *w->excitation);
  w->sums = malloc(EF_ALPHA_OPIC_CHANNELS * BLOCK_ROWS * sizeof *w->sums);
  w->xyy = malloc(BLOCK_ROWS * sizeof *w->xyy);
  w->xy = malloc(BLOCK_ROWS * sizeof *w->xy);
  w->dominant = malloc(BLOCK_ROWS * sizeof *w->dominant);
  w->out = malloc(BLOCK_ROWS * sizeof *w->out);
  if (w->xyy != NULL && w->xy != NULL && w->dominant != NULL && w->xyz != NULL && w->xyz_31 != NULL && w->excitation != NULL &&
      w->sums != NULL && w->out != NULL) {
    return EF_OK;
  }
  return message_fail(error, EF_NO_MEMORY, "out of memory for the rows");
}

static ef_status integrate(file_work *w, const ef_block *block, int jobs,
                           ef_error *error) {
  ef_status status =
      colours_xyz(&w->colours, block->n, block->value, jobs, w->xyz, error);
  if (status == EF_OK && w->receptors != NULL) {
    status = ef_weights_apply(w->receptors, block->n, block->value, jobs,
                              w->excitation, error);
  }
  if (status == EF_OK && w->alpha != NULL) {
    status = ef_weights_apply(w->alpha, block->n, block->value, jobs, w->sums,
                              error);
  }
  if (status == EF_OK && w->xyz_1964 != NULL) {
    status = ef_weights_apply(w->xyz_1964, block->n, block->value, jobs,
                              w->xyz_64, error);
  }
  if (status == EF_OK && w->xyz_1931 != NULL) {
    status = ef_weights_apply(w->xyz_1931, block->n, block->value, jobs,
                              w->xyz_31, error);
  }
  return status;
}

/* A light named white is what the others of its file are seen against. It is
 * looked for among the first rows. */
static void find_white(file_work *w, describe_scene *s, const ef_block *block,
                       const ef_notes *notes) {
  for (size_t i = 0; i < block->n && w->is_light && !w->has_white; ++i) {
    if (strcmp(block->name[i], "white") != 0 || !(w->xyz[3 * i + 1] > 0.0)) {
      continue;
    }
    w->white_level = w->xyz[3 * i + 1];
    const double scale = 100.0 / w->white_level;
    w->white =
        (ef_xyz){scale * w->xyz[3 * i], 100.0, scale * w->xyz[3 * i + 2]};
    w->has_white = s->has_light_white = true;
    message_note(notes,
                 "%s: L*a*b* of the lights is relative to the one named "
                 "white",
                 w->head->file);
  }
}

/* Of a part the first rows of the file may not be, and they say which light is
 * the white. */
static ef_status find_white_of_file(file_work *w, describe_scene *s,
                                    const ef_notes *notes, ef_error *error) {
  const part_range all = {0};
  if (!w->is_light)
    return EF_OK;
  ef_reader *reader = source_rows(s->options, w->head->file, &all, NULL, error);
  if (reader == NULL)
    return error->status;
  ef_block block;
  ef_status status = ef_reader_next(reader, BLOCK_ROWS, &block, error);
  if (status == EF_OK)
    status = integrate(w, &block, s->options->jobs, error);
  if (status == EF_OK)
    find_white(w, s, &block, notes);
  ef_reader_free(reader);
  return status;
}

/* ---- One row ----------------------------------------------------------- */

static ef_lab lab_of(const file_work *w, size_t i) {
  const double none = (double)NAN;
  if (!w->has_white)
    return (ef_lab){none, none, none};
  const double scale = 100.0 / w->white_level;
  const double *v = w->xyz + 3 * i;
  return ef_xyz_to_lab((ef_xyz){scale * v[0], scale * v[1], scale * v[2]},
                       w->white);
}

static void add_receptors(description *d, const describe_scene *s,
                          const file_work *w, size_t i) {
  const double none = (double)NAN;
  d->lms = (ef_lms){none, none, none};
  d->rod = d->melanopsin = none;
  d->mb = (ef_mb){none, none, none};
  d->has_alpha = w->alpha != NULL;
  if (d->has_alpha)
    d->alpha = ef_alpha_opic_from(w->sums + EF_ALPHA_OPIC_CHANNELS * i);
  if (w->receptors == NULL)
    return;
  const double *excitation = w->excitation + EF_N_RECEPTORS * i;
  d->lms = (ef_lms){excitation[EF_L_CONE], excitation[EF_M_CONE],
                    excitation[EF_S_CONE]};
  d->rod = excitation[EF_ROD];
  d->melanopsin = excitation[EF_MELANOPSIN];
  d->mb = ef_lms_to_mb(d->lms, ef_observer_mb_scale(s->observer));
  /* A coordinate that is the same for all lights tells nothing. */
  ef_cone_model model;
  if (!ef_observer_model(s->observer, &model))
    return;
  if (model.deficiency == EF_TRITANOPE)
    d->mb.mb_s = none;
  else if (model.deficiency != EF_TRICHROMAT)
    d->mb.mb_l = none;
}

/* Colour temperature is defined with the CIE 1931 observer, whoever looks. */
static void add_temperature(description *d, const file_work *w, size_t i) {
  const double none = (double)NAN;
  d->cct = (ef_cct){none, none, false};
  if (!w->is_light)
    return;
  const double *v = w->xyz_1931 != NULL ? w->xyz_31 : w->xyz;
  const ef_xyy c =
      ef_xyz_to_xyy((ef_xyz){v[3 * i], v[3 * i + 1], v[3 * i + 2]});
  if (!isnan(c.x))
    d->cct = ef_xy_to_cct((ef_xy){c.x, c.y});
  if (!d->cct.defined)
    d->cct.cct_k = d->cct.duv = none;
}

/* What has no dominant wavelength (black, a colour outside the locus) or no
 * rendering index is left empty: an answer, not a failure. */
static void find_dominants(file_work *w, const describe_scene *s, size_t n) {
  const double none = (double)NAN;
  const ef_xyy white = ef_xyz_to_xyy(s->basis.white);
  const ef_xy against =
      w->is_light ? s->equal_energy : (ef_xy){white.x, white.y};
  for (size_t i = 0; i < n; ++i) {
    const double *v = w->xyz + 3 * i;
    w->xyy[i] = ef_xyz_to_xyy((ef_xyz){v[0], v[1], v[2]});
    w->xy[i] = (ef_xy){w->xyy[i].x, w->xyy[i].y};
    w->dominant[i] = (ef_dominant){none, false, none};
  }
  ef_error ignored;
  if (ef_observer_dimensions(s->observer) == 3) {
    ef_xy_to_dominant_batch(n, w->xy, against, s->observer, s->options->jobs,
                            w->dominant, &ignored);
  }
}

static void add_whiteness(description *d, const describe_scene *s,
                          const file_work *w) {
  const double none = (double)NAN;
  d->whiteness = (ef_whiteness){none, none, none, false};
  if (!w->is_light && s->white_scale != NULL)
    d->whiteness = ef_whiteness_of(d->xyz, s->white_scale);
}

static void add_daylight(description *d, const file_work *w, size_t i) {
  d->daylight = NULL;
  d->daylight_distance = (double)NAN;
  if (w->xyz_1964 == NULL)
    return;
  const double *v = w->xyz_64 + 3 * i;
  const ef_uv at = ef_xyz_to_uv((ef_xyz){v[0], v[1], v[2]});
  for (size_t k = 0; k < N_DAYLIGHTS && !isnan(at.u_prime); ++k) {
    const double distance = hypot(at.u_prime - w->daylight[k].u_prime,
                                  at.v_prime - w->daylight[k].v_prime);
    if (distance >= d->daylight_distance)
      continue;
    d->daylight = daylights[k];
    d->daylight_distance = distance;
  }
}

static void add_rendering(description *d, const file_work *w,
                          const double *value) {
  d->Ra = (double)NAN;
  d->Ra_tolerable = true;
  if (!w->is_light || w->head->content != EF_CONTENT_SPECTRA)
    return;
  ef_error ignored;
  ef_rendering r;
  if (ef_rendering_index(&w->head->grid, value, &r, &ignored) == EF_OK) {
    d->Ra = r.Ra;
    d->Ra_tolerable = r.tolerable;
  }
}

static description describe_row(const describe_scene *s, const file_work *w,
                                const ef_block *block, size_t i) {
  const bool spectra = w->head->content == EF_CONTENT_SPECTRA;
  description d = {.name = block->name[i],
                   .file = w->head->file,
                   .kind = w->is_light ? "light"
                           : spectra   ? "surface"
                                       : "colour"};
  d.xyz = (ef_xyz){w->xyz[3 * i], w->xyz[3 * i + 1], w->xyz[3 * i + 2]};
  d.xyy = w->xyy[i];
  d.uv = ef_xyz_to_uv(d.xyz);
  d.lab = lab_of(w, i);
  d.luminance_cd_m2 = w->is_light && w->head->absolute ? d.xyz.Y : (double)NAN;
  add_receptors(&d, s, w, i);
  add_temperature(&d, w, i);
  d.dominant = w->dominant[i];
  add_whiteness(&d, s, w);
  add_daylight(&d, w, i);
  add_rendering(&d, w, block->value + i * w->head->width);
  return d;
}

/* ---- All rows ---------------------------------------------------------- */

/* Rows that a thread describes at a time. */
enum { PIECE = 64 };

typedef struct rows_work {
  const describe_scene *scene;
  const file_work *file;
  const ef_block *block;
} rows_work;

static void describe_some(void *context, size_t begin, size_t end) {
  const rows_work *r = context;
  for (size_t i = begin; i < end; ++i)
    r->file->out[i] = describe_row(r->scene, r->file, r->block, i);
}

static ef_status describe_file(describe_scene *s, ef_reader *reader,
                               file_work *w, const ef_notes *notes,
                               const describe_sink *sink, size_t *n,
                               ef_error *error) {
  message_progress progress = message_progress_start(s->options->quiet);
  const bool is_part = s->options->part != NULL;
  ef_status status =
      is_part ? find_white_of_file(w, s, notes, error) : EF_OK;
  bool is_first = !is_part;
  size_t n_here = 0;
  while (status == EF_OK) {
    ef_block block;
    status = ef_reader_next(reader, BLOCK_ROWS, &block, error);
    if (status != EF_OK || block.n == 0)
      break;
    status = integrate(w, &block, s->options->jobs, error);
    if (status != EF_OK)
      break;
    if (is_first)
      find_white(w, s, &block, notes);
    is_first = false;
    find_dominants(w, s, block.n);
    rows_work rows = {s, w, &block};
    ef_parallel_for(block.n, PIECE, s->options->jobs, describe_some, &rows);
    status = sink->rows(sink->self, s, block.n, w->out, error);
    n_here += block.n;
    message_progress_show(&progress, *n + n_here);
  }
  message_progress_end(&progress);
  *n += n_here;
  if (status == EF_OK && n_here == 0 && !is_part) {
    message_fail(error, EF_MALFORMED,
                 ef_reader_skipped(reader) > 0
                     ? "no row is left: every one was at fault"
                     : "there is a header and no row to read");
    return message_place(error, w->head->file);
  }
  return status;
}

ef_status describe_stream(describe_scene *s, const ef_notes *notes,
                          const describe_sink *sink, size_t *n,
                          size_t *n_skipped, ef_error *error) {
  const command_options *o = s->options;
  part_walk walk;
  *n = *n_skipped = 0;
  ef_status status = part_begin(&walk, o, o->n_files, o->files, error);
  for (size_t f = 0; f < o->n_files && status == EF_OK; ++f) {
    part_range range;
    status = part_next(&walk, o->files[f], &range, error);
    if (status != EF_OK || range.is_empty)
      continue;
    ef_reader *reader = source_rows(o, o->files[f], &range, notes, error);
    if (reader == NULL)
      return error->status;
    file_work w;
    status = work_init(&w, s, ef_reader_get_head(reader), notes, error);
    if (status == EF_OK) {
      status = describe_file(s, reader, &w, notes, sink, n, error);
    }
    *n_skipped += ef_reader_skipped(reader);
    work_free(&w);
    ef_reader_free(reader);
  }
  return status;
}
