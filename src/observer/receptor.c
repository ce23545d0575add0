/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Rods and melanopsin beside the cones, and the alpha-opic quantities of CIE S
 * 026. */
#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"
#include "observer/model_private.h"
#include "observer/observer_private.h"

/* Columns of the table "cie-s026", by ef_receptor. */
static const char *const columns[EF_N_RECEPTORS] = {
    "l_cone", "m_cone", "s_cone", "rhodopic", "melanopic"};

const char *ef_receptor_name(ef_receptor receptor) {
  return columns[receptor];
}

double ef_alpha_opic_d65_mw_lm(ef_receptor receptor) {
  static const double d65[EF_N_RECEPTORS] = {
      1.6289, 1.4558, 0.8173, 1.4497, 1.3262}; /* mW/lm, CIE S 026/E:2018 */
  return d65[receptor];
}

/* A column of a table with 1 nm rows on the standard grid, zero where the
 * table has no row. */
static ef_status read_column(const char *table_name, const char *column,
                             double *value, ef_error *error) {
  const ef_table *const table = ef_table_find(table_name, error);
  if (table == NULL) return EF_UNKNOWN_NAME;
  const size_t c = ef_table_column(table, column);
  if (c == SIZE_MAX) {
    return ef__error_set(error, EF_MALFORMED,
                         "built-in table '%s' has no column '%s'", table_name,
                         column);
  }
  const ef_grid from = ef_table_grid(table);
  const ef_grid to = ef_grid_standard();
  return ef_resample(&from, 1, table->value + c * table->n_rows, &to,
                     EF_INTERPOLATE_LINEAR, EF_EXTEND_ZERO, value, error);
}

/* ---- Channels of an observer ------------------------------------------- */

/* Carries a function of the mean observer of 32 years to other ocular media
 * (as CIE S 026 does for age) and gives it a peak of 1 again. */
static void change_lens(const ef__templates *templates,
                        const ef_cone_model *model, double *value) {
  const ef_grid grid = ef_grid_standard();
  double peak = 0;
  for (size_t i = 0; i < grid.count; ++i) {
    const double nm = ef_grid_wavelength(&grid, i);
    value[i] *= exp(ef__cones_lens_change(templates, model, nm));
    peak = fmax(peak, value[i]);
  }
  for (size_t i = 0; i < grid.count; ++i) value[i] /= peak;
}

ef_status ef__observer_set_receptors(ef_observer *observer,
                                     const ef_cone_model *model,
                                     ef_error *error) {
  const size_t n = ef_grid_standard().count;
  double *const value = observer->set[EF_RECEPTORS].value;
  for (size_t r = EF_ROD; r <= EF_MELANOPSIN; ++r) {
    const ef_status status =
        read_column("cie-s026", columns[r], value + r * n, error);
    if (status != EF_OK) return status;
  }
  if (model == NULL) return EF_OK;
  ef__templates templates;
  const ef_status status = ef__templates_read(&templates, error);
  if (status != EF_OK) return status;
  for (size_t r = EF_ROD; r <= EF_MELANOPSIN; ++r) {
    change_lens(&templates, model, value + r * n);
  }
  return EF_OK;
}

/* ---- Alpha-opic quantities --------------------------------------------- */

static const double k_m = 683; /* lm/W, CIE 018:2019 */
enum { V = EF_N_RECEPTORS }; /* the channel after the receptors */

static const char *const channel_names[EF_ALPHA_OPIC_CHANNELS] = {
    "l_cone", "m_cone", "s_cone", "rhodopic", "melanopic", "V"};

/* Five action spectra and V(lambda), which is y_bar of CIE 1931. */
static ef_status read_channels(double *value, ef_error *error) {
  const size_t n = ef_grid_standard().count;
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    const ef_status status =
        read_column("cie-s026", columns[r], value + r * n, error);
    if (status != EF_OK) return status;
  }
  return read_column("cie-1931", "y_bar", value + V * n, error);
}

/* The channels in the shape of an observer, whose y_bar is 683 V(lambda), so
 * that surfaces come out for a luminance of 100. */
ef_weights *ef_alpha_opic_weights(const ef_grid *samples,
                                  const ef_viewing *viewing,
                                  const ef_notes *notes, ef_error *error) {
  const size_t n = ef_grid_standard().count;
  double *channel, *xyz_bar;
  const ef__part parts[] = {
      {&channel, EF_ALPHA_OPIC_CHANNELS * n, sizeof(double)},
      {&xyz_bar, 3 * n, sizeof(double)}};
  void *const block = ef__allocate_block(2, parts);
  if (block == NULL) {
    ef__error_memory(error, "alpha-opic weights");
    return NULL;
  }
  ef_weights *weights = NULL;
  if (read_channels(channel, error) == EF_OK) {
    for (size_t i = 0; i < n; ++i) xyz_bar[n + i] = k_m * channel[V * n + i];
    const ef_observer standard = {
        .k_m = 1,
        .set = {[EF_TRISTIMULUS] = {3, ef__tristimulus_names, xyz_bar},
                [EF_RECEPTORS] = {EF_ALPHA_OPIC_CHANNELS, channel_names,
                                  channel}}};
    weights = ef_observer_weights(&standard, EF_RECEPTORS, samples, viewing,
                                  notes, error);
  }
  free(block);
  return weights;
}

ef_alpha_opic ef_alpha_opic_from(const double *channel) {
  ef_alpha_opic out = {.photopic = k_m * channel[V],
                       .scotopic = EF_K_M_SCOTOPIC_LM_W * channel[EF_ROD]};
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    const double d65 = ef_alpha_opic_d65_mw_lm((ef_receptor)r);
    const double milliwatt = 1000 * channel[r];
    out.quantity[r] = channel[r];
    out.equivalent_d65[r] = milliwatt / d65;
    out.efficacy_mw_lm[r] =
        out.photopic > 0 ? milliwatt / out.photopic : (double)NAN;
    out.daylight_ratio[r] = out.efficacy_mw_lm[r] / d65;
  }
  return out;
}
