/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How an observer's channels, the light and the scale of the result come
 * together in one weights matrix. */
#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"
#include "observer/observer_private.h"

static const double worth_a_note = 0.001; /* of a channel's whole weight */

ef_viewing ef_viewing_default(const ef_illuminant *illuminant) {
  return (ef_viewing){.kind = illuminant != NULL ? EF_SURFACE : EF_LIGHT,
                      .illuminant = illuminant,
                      .absolute = false,
                      .interpolation = EF_INTERPOLATE_AUTO,
                      .extension = EF_EXTEND_AUTO,
                      .correct_bandpass = false,
                      .working = ef_grid_standard()};
}

/* What is summed over: the channels and y_bar, the light, on one grid. */
typedef struct working {
  void *block; /* all arrays; to be freed */
  ef_grid grid;
  size_t n_channels;
  double *channel; /* n_channels x grid.count */
  double *y_bar;
  double *power;   /* of the illuminant */
} working;

/* Scale that gives 100 to the illuminant's own y_bar. */
static double unit_hundred(const working *w) {
  double sum = 0;
  for (size_t i = 0; i < w->grid.count; ++i) sum += w->power[i] * w->y_bar[i];
  return 100 / sum;
}

static ef_status resample_set(const ef_channels *from, size_t first,
                              size_t count, const ef_grid *to, double *out,
                              ef_error *error) {
  return ef_resample(&from->grid, count,
                     from->value + first * from->grid.count, to,
                     EF_INTERPOLATE_AUTO, EF_EXTEND_ZERO, out, error);
}

ef_status ef__working_check(const ef_grid *grid, ef_error *error) {
  const ef_status status = ef_grid_check(grid, error);
  if (status != EF_OK || grid->wavelength_nm == NULL) return status;
  return ef__error_set(error, EF_INVALID,
                       "the summation grid must have even steps");
}

static ef_status allocate(working *w, ef_error *error) {
  size_t n_values;
  const size_t n = w->grid.count;
  const bool fits = ef__size_multiply(w->n_channels, n, &n_values);
  const ef__part parts[] = {{&w->channel, n_values, sizeof(double)},
                            {&w->y_bar, n, sizeof(double)},
                            {&w->power, n, sizeof(double)}};
  w->block =
      fits ? ef__allocate_block(sizeof parts / sizeof *parts, parts) : NULL;
  if (w->block != NULL) return EF_OK;
  return ef__error_memory(error, "weights of an observer");
}

/* Fills `w` (free its block) or nothing. */
static ef_status prepare(const ef_observer *observer, ef_channel_role role,
                         const ef_illuminant *illuminant, const ef_grid *grid,
                         working *w, ef_error *error) {
  const ef_channels channels = ef_observer_channels(observer, role);
  const ef_channels own = ef_observer_channels(observer, EF_TRISTIMULUS);
  *w = (working){.grid = *grid, .n_channels = channels.count};
  ef_status status = ef__working_check(grid, error);
  if (status == EF_OK) status = allocate(w, error);
  if (status == EF_OK) {
    status = resample_set(&channels, 0, channels.count, grid, w->channel,
                          error);
  }
  if (status == EF_OK) status = resample_set(&own, 1, 1, grid, w->y_bar, error);
  if (status == EF_OK && illuminant != NULL) {
    status = ef_illuminant_sample(illuminant, grid, w->power, error);
  }
  if (status != EF_OK) free(w->block);
  return status;
}

ef_status ef__light_check(const ef_illuminant *illuminant, double scale,
                          ef_error *error) {
  if (isfinite(scale) && scale > 0) return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "illuminant '%s' is dark for this observer, so nothing "
                       "can be seen in it",
                       ef_illuminant_name(illuminant));
}

static ef_status find_scale(const ef_observer *observer,
                            const ef_viewing *viewing, const working *w,
                            double *scale, ef_error *error) {
  if (viewing->kind == EF_SURFACE) {
    *scale = unit_hundred(w);
    return ef__light_check(viewing->illuminant, *scale, error);
  }
  *scale = viewing->absolute ? observer->k_m * w->grid.step_nm
                             : w->grid.step_nm;
  return EF_OK;
}

ef_status ef__viewing_check(const ef_viewing *viewing, ef_error *error) {
  const bool has_light = viewing->illuminant != NULL;
  if (viewing->kind == EF_SURFACE && !has_light) {
    return ef__error_set(error, EF_INVALID,
                         "surfaces are seen in some light: an illuminant is "
                         "needed");
  }
  if (viewing->kind == EF_LIGHT && has_light) {
    return ef__error_set(error, EF_INVALID,
                         "lights are seen by themselves, not in illuminant "
                         "'%s'",
                         ef_illuminant_name(viewing->illuminant));
  }
  return EF_OK;
}

void ef__note_outside(const ef_weights *weights, size_t n_names,
                      const char *const *names, const ef_viewing *viewing,
                      const ef_notes *notes) {
  size_t worst = 0;
  for (size_t c = 1; c < ef_weights_channels(weights); ++c) {
    if (ef_weights_outside(weights, c) > ef_weights_outside(weights, worst)) {
      worst = c;
    }
  }
  const double share = ef_weights_outside(weights, worst);
  if (!(share > worth_a_note)) return;
  const bool held = viewing->extension == EF_EXTEND_HOLD ||
                    (viewing->extension == EF_EXTEND_AUTO &&
                     viewing->kind == EF_SURFACE);
  const ef_grid *const grid = ef_weights_grid(weights);
  ef__note(notes,
           "%.2f %% of the weight of %s lies outside the measured %g to %g nm, "
           "where %s",
           100 * share, names[worst % n_names], ef_grid_wavelength(grid, 0),
           ef_grid_wavelength(grid, grid->count - 1),
           held ? "the end values were held" : "zero was taken");
}

ef_weights *ef_observer_weights(const ef_observer *observer,
                                ef_channel_role role, const ef_grid *samples,
                                const ef_viewing *viewing,
                                const ef_notes *notes, ef_error *error) {
  if (ef__viewing_check(viewing, error) != EF_OK) return NULL;
  const ef_channels channels = ef_observer_channels(observer, role);
  ef_weights *weights = NULL;
  working w;
  double *scale = NULL;
  if (prepare(observer, role, viewing->illuminant, &viewing->working, &w,
              error) != EF_OK) {
    return NULL;
  }
  double one_scale;
  if (find_scale(observer, viewing, &w, &one_scale, error) != EF_OK) goto done;
  scale = ef__allocate(w.n_channels, sizeof *scale);
  if (scale == NULL) {
    ef__error_memory(error, "weights of an observer");
    goto done;
  }
  for (size_t c = 0; c < w.n_channels; ++c) scale[c] = one_scale;
  const ef_fold_settings settings = {
      .working = viewing->working,
      .interpolation = viewing->interpolation,
      .extension = viewing->extension,
      .kind = viewing->kind,
      .correct_bandpass = viewing->correct_bandpass};
  weights = ef_weights_fold(samples, w.n_channels, w.channel,
                            viewing->illuminant != NULL ? w.power : NULL,
                            scale, &settings, error);
  if (weights != NULL) {
    ef__note_outside(weights, channels.count, channels.name, viewing, notes);
  }
done:
  free(scale);
  free(w.block);
  return weights;
}

ef_status ef_observer_white(const ef_observer *observer, ef_channel_role role,
                            const ef_illuminant *illuminant,
                            const ef_grid *working_grid, double *out,
                            ef_error *error) {
  const ef_grid standard = ef_grid_standard();
  const ef_grid *const grid = working_grid != NULL ? working_grid : &standard;
  working w;
  ef_status status = prepare(observer, role, illuminant, grid, &w, error);
  if (status != EF_OK) return status;
  const double scale = unit_hundred(&w);
  status = ef__light_check(illuminant, scale, error);
  for (size_t c = 0; c < w.n_channels && status == EF_OK; ++c) {
    double sum = 0;
    for (size_t i = 0; i < w.grid.count; ++i) {
      sum += w.power[i] * w.channel[c * w.grid.count + i];
    }
    out[c] = scale * sum;
  }
  free(w.block);
  return status;
}
