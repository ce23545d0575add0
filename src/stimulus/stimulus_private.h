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

/* ---- Linear programmes (table.c, tableau.c) ----------------------------- */

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
 * size; what it ended with before does not matter. */
ef__simplex_end ef__table_solve(const ef__table *table, ef__simplex *simplex,
                                double *x, double *value);
/** The same from where the last one ended, for a series that changes little. */
ef__simplex_end ef__table_solve_next(const ef__table *table,
                                     ef__simplex *simplex, double *x,
                                     double *value);
/** Fills `x` where it can be proved; false, and `x` untouched, when it cannot:
 * without an answer, or where rows are all but dependent. */
bool ef__tableau_solve(const ef__table *table, double *x);

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

/** EF_INVALID unless it is one of as many primaries. */
ef_status ef__isolation_check(const ef_stimulator *stimulator,
                              const ef_isolation *isolation, ef_error *error);

/** Least-squares distance of contrasts along the direction, in the receptors
 * that change; `square` receives the direction's squared length in them
 * (codes.c). */
double ef__along(const ef_isolation *isolation, const double *contrast,
                 double *square);

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

/* ---- Code values (lattice.c, codes.c, step.c)
 * ------------------------------------ */

/** Amounts that the codes of each primary give, in increasing order. */
typedef struct ef__codes {
  size_t n;       /**< primaries */
  size_t n_codes; /**< 2^bits */
  double *amount; /**< n x n_codes */
} ef__codes;

/** One block, released with free(). `bits` 1 to 16. */
ef_status ef__codes_new(const ef_device *device, int bits, ef__codes **out,
                        ef_error *error);
/** Last code whose amount is not above `amount`; 0 when there is none. */
uint32_t ef__codes_below(const ef__codes *codes, size_t i, double amount);
/** Code whose amount is nearest. */
uint32_t ef__codes_round(const ef__codes *codes, size_t i, double amount);

/** A walk through all codes whose amounts x have |R (x - centre)|^2 below a
 * bound that shrinks on the way, the most promising first. */
typedef struct ef__walk {
  const ef__codes *codes;
  double root[EF_MAX_DRIVES * EF_MAX_DRIVES]; /**< R, upper triangular, n x n */
  double centre[EF_MAX_DRIVES];
  uint32_t first[EF_MAX_DRIVES], last[EF_MAX_DRIVES]; /**< codes to stay in */
  size_t most_places;
  double bound;
  /** Called at each place; returns the bound from then on. */
  double (*visit)(void *context, const uint32_t *code, const double *amount,
                  double square);
  void *context;
} ef__walk;

void ef__walk_run(ef__walk *walk);

/** Upper R with R' R = matrix (n x n, positive definite; a row that is not so
 * to rounding gets a diagonal that is). */
void ef__walk_set_root(ef__walk *walk, const double *matrix);

/** The error of a modulation as a quadratic form, to choose codes by. */
typedef struct ef__fit {
  size_t n;
  double background[EF_MAX_DRIVES]; /**< amounts of its codes */
  double excitation[EF_N_RECEPTORS];
  double weight[EF_N_RECEPTORS]; /**< of the squared error of contrast */
  double gain[EF_N_RECEPTORS * EF_MAX_DRIVES]; /**< contrast per amount */
  double matrix[EF_MAX_DRIVES * EF_MAX_DRIVES];
} ef__fit;

/** For an isolation around the amounts of `background` codes. */
void ef__fit_set(ef__fit *fit, const ef_stimulator *stimulator,
                 const ef_isolation *isolation, const ef__codes *codes,
                 const uint32_t *background, double quiet_weight);
/** Codes for `level` times the modulation (-1 to 1), the best of the first
 * `most_places` places. */
void ef__fit_codes(const ef__fit *fit, const ef__codes *codes,
                   const ef_isolation *isolation, double level,
                   size_t most_places, uint32_t *code);
/** Contrasts of amounts, and of codes, against the background of the fit; NaN
 * for a receptor that it does not excite. */
void ef__fit_contrasts_at(const ef__fit *fit, const double *amount,
                          double contrast[EF_N_RECEPTORS]);
void ef__fit_contrasts(const ef__fit *fit, const ef__codes *codes,
                       const uint32_t *code, double contrast[EF_N_RECEPTORS]);

/** Fills the smallest step of `out`, whose background codes are set. */
void ef__smallest_step(const ef__fit *fit, const ef__codes *codes,
                       const ef_isolation *isolation, double purity,
                       ef_coded *out);

/* ---- Frames (pattern.c, dither.c) ---------------------------------------- */

/** Where a pixel lies, seen from the eye. */
typedef struct ef__view {
  double pixel_mm, distance_mm;
  double middle_x, middle_y; /**< of the frame, in pixels from its corner */
  double centre[3];          /**< of the pattern, mm; the screen is at z = 0 and
                                  the eye at -distance */
  double reach_mm;           /**< beyond it, on the screen, there is nothing */
  double direction[2];       /**< of the grating */
  double centre_angle_deg;   /**< of the pattern, along the direction */
} ef__view;

ef__view ef__view_of(const ef_frame_settings *settings);
/** Window of the pattern at a pixel, 0 to 1. */
double ef__pattern_window(const ef_frame_settings *settings,
                          const ef__view *view, size_t x, size_t y);
/** Grating at a pixel and time, -1 to 1; 1 for patterns without one. */
double ef__pattern_carrier(const ef_frame_settings *settings,
                           const ef__view *view, size_t x, size_t y,
                           double time_s);
/** Solid angle of a pixel. */
double ef__pixel_sr(const ef__view *view, size_t x, size_t y);

enum { EF__DITHER_TILE = 8 };

/** Where the thresholds of each primary begin. */
typedef struct ef__thresholds {
  uint32_t dx[EF_MAX_DRIVES], dy[EF_MAX_DRIVES];
  double offset[EF_MAX_DRIVES];
} ef__thresholds;

ef__thresholds ef__thresholds_of(size_t n, uint64_t seed);
/** Code of primary i for an amount at a pixel of a frame. */
uint32_t ef__dither_code(const ef__thresholds *thresholds,
                         const ef__codes *codes, size_t i, double amount,
                         size_t x, size_t y, size_t frame);

/** Amounts of a frame where the window is full and a grating at its most; the
 * device (frame.c). */
void ef__frames_peak(const ef_frames *frames, size_t frame, double *amount);
const ef_device *ef__frames_device(const ef_frames *frames);
const ef_stimulator *ef__frames_stimulator(const ef_frames *frames);
/** Amounts of the two ends of the modulation. */
void ef__frames_extremes(const ef_frames *frames, double *high, double *low);

#endif
