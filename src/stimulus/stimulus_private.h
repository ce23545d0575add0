/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the files of this folder share: the stimulator, linear programmes, and
 * the rows that a direction makes of a background. */
#ifndef EVENFIELD_STIMULUS_PRIVATE_H
#define EVENFIELD_STIMULUS_PRIVATE_H

#include <evenfield/stimulus.h>

#include "base/base_private.h"

/* ---- Stimulator (stimulator.c) ------------------------------------------ */

struct ef_stimulator {
  const ef_device *device;
  const ef_observer *observer;
  size_t n;                                      /**< primaries */
  double dark[EF_N_RECEPTORS];                   /**< all amounts 0 */
  double matrix[EF_N_RECEPTORS * EF_MAX_DRIVES]; /**< EF_N_RECEPTORS x n */
  double dark_y;           /**< luminance by y_bar, of all amounts 0 */
  double y[EF_MAX_DRIVES]; /**< and of each primary without it */
  double luminance_weight[3];
  ef_grid grid;     /**< of the device, which it borrows */
  double *spectrum; /**< (1 + n) x count: all amounts 0, then each primary
                         without it */
};

/* ---- Linear programmes (table.c) ---------------------------------------- */

enum {
  EF__TABLE_ROWS = 2 * EF_N_RECEPTORS + 1,
  EF__TABLE_COLUMNS = 2 * EF_MAX_DRIVES + 2 + EF_N_RECEPTORS
};

/** The x with `row` x = right and low <= x <= high that makes gain . x
 * largest; limits are finite. */
typedef struct ef__table {
  size_t n_rows, n_columns;
  double row[EF__TABLE_ROWS * EF__TABLE_COLUMNS]; /**< n_rows x n_columns */
  double right[EF__TABLE_ROWS];
  double low[EF__TABLE_COLUMNS], high[EF__TABLE_COLUMNS];
  double gain[EF__TABLE_COLUMNS];
} ef__table;

/** Fills `x`, within its limits and on the rows to rounding, and the gain
 * there, when the end is EF__SIMPLEX_BEST. `simplex` is one for tables of this
 * size and may hold the end of another. */
ef__simplex_end ef__table_solve(const ef__table *table, ef__simplex *simplex,
                                double *x, double *value);

/** Moves x, within its limits, as close to the rows as rounding allows, and no
 * more than that takes; what stands at a limit stays there. */
void ef__table_bring_onto_rows(const ef__table *table, double *x);

/* ---- Rows (rows.c) ------------------------------------------------------ */

/** Receptors that are controlled, and luminance never: at most one row each. */
typedef struct ef__rows {
  size_t n; /**< independent rows */
  size_t n_primaries;
  ef_receptor receptor[EF_N_RECEPTORS];
  double gain[EF_N_RECEPTORS * EF_MAX_DRIVES]; /**< contrast per amount */
  double target[EF_N_RECEPTORS]; /**< contrast per unit along the direction */
  size_t n_controlled;
  double condition_number;
} ef__rows;

/** The controlled receptors' rows at a background with these excitations, less
 * those that depend on others and are met with them. EF_NO_ANSWER as
 * ef_isolate says. */
ef_status ef__rows_make(const ef_stimulator *stimulator,
                        const ef_receptor_role role[EF_N_RECEPTORS],
                        const double contrast[EF_N_RECEPTORS],
                        const double excitation[EF_N_RECEPTORS], ef__rows *out,
                        ef_error *error);

/* ---- Isolation (isolate.c, background.c) -------------------------------- */

/** How far each amount can go down and up from the background. */
void ef__isolate_room(ef_modulation modulation, size_t n,
                      const double *background, double *down, double *up);

/** The largest modulation with rows * modulation = along * target. */
ef_status ef__isolate_largest(const ef__rows *rows, const double *down,
                              const double *up, double *modulation,
                              double *along, ef_error *error);

/** The background of a rule that is not EF_BACKGROUND_GIVEN. */
ef_status ef__background_choose(const ef_stimulator *stimulator,
                                const ef_direction *direction,
                                const ef_isolate_settings *settings,
                                double background[EF_MAX_DRIVES],
                                ef_error *error);

/** Fills contrasts, luminance and pooled contrast of an isolation from its
 * background, excitations and modulation. */
void ef__isolation_take_contrasts(const ef_stimulator *stimulator,
                                  ef_isolation *isolation);

/* ---- Populations (eyes.c) ------------------------------------------------ */

enum { EF__WORKING_SAMPLES = 471 }; /* of ef_grid_standard */

/** The display's light on the standard grid, and what it takes to make a
 * model's excitations of it. One block, released with free(). */
typedef struct ef__eyes {
  size_t n;                /**< primaries */
  struct ef__cones *cones; /**< released with free() too */
  double *light; /**< (1 + n) x EF__WORKING_SAMPLES: all amounts 0, then each
                      primary without it */
  double *rest;  /**< rods and melanopsin of the mean observer, 2 x that */
} ef__eyes;

ef_status ef__eyes_new(const ef_stimulator *stimulator, ef__eyes **out,
                       ef_error *error);
void ef__eyes_free(ef__eyes *eyes);
/** Excitations by all amounts 0 and by each primary (EF_N_RECEPTORS x n), in
 * units of the member's own. */
void ef__eyes_excitations(const ef__eyes *eyes, const ef_cone_model *model,
                          double dark[EF_N_RECEPTORS], double *matrix);

/** Contrasts that one unit of each primary gives a member at a background,
 * EF_N_RECEPTORS x n; 0 for a receptor it does not excite. */
void ef__eyes_gains(const ef__eyes *eyes, const ef_cone_model *model,
                    const double *background, double *gain);

/** A note when the population looks at another field than the observer
 * (spread.c). */
void ef__tell_field(const ef_stimulator *stimulator,
                    const ef_population *population, const ef_notes *notes);

#endif
