/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the solvers share: a setup as three amounts that mix to a colour, and
 * the search for amounts in the unit box. */
#ifndef EVENFIELD_MATCH_PRIVATE_H
#define EVENFIELD_MATCH_PRIVATE_H

#include <evenfield/match.h>

#include "difference/difference_private.h"

/** A look over the whole gamut, see below. */
typedef struct ef__scout ef__scout;

/* ---- Mixing (mixing.c) ------------------------------------------------- */

/** Three amounts to a colour. For affine setups the numbers are copied, so
 * that nothing leaves the folder inside a solver. */
typedef struct ef__mixing {
  bool affine;
  ef_conditions conditions; /**< white: all amounts 1 */
  double black[3];
  double vector[9];  /**< affine: d XYZ / d amount, row-major */
  double inverse[9]; /**< affine: of `vector` */
  ef_xyz (*xyz)(const void *context, const double *amount, double *jacobian);
  const void *context; /**< borrowed */
  double resolution;   /**< see ef_setup_resolution */
  bool has_kinks;      /**< a table, with bends at its points */
  const ef__scout *scout; /**< borrowed; what ef__nearest needs */
} ef__mixing;

/** From a setup, which it borrows. EF_INVALID unless there are three drives,
 * EF_NO_ANSWER when an affine setup's primaries are linearly dependent: their
 * condition number is above 1e8, where amounts have no 8 digits left. */
ef_status ef__mixing_from_setup(const ef_setup *setup, ef__mixing *out,
                                ef_error *error);
/** The same but for `inverse` and its check: what matching for observers of two
 * dimensions starts from. */
ef_status ef__mixing_copy(const ef_setup *setup, ef__mixing *out,
                          ef_error *error);
/** Fills `inverse` from `vector` and checks it as above. */
ef_status ef__mixing_finish(ef__mixing *mixing, ef_error *error);

/** Colour at `amount`, and unless NULL d XYZ / d amount. */
ef_xyz ef__mixing_xyz(const ef__mixing *mixing, const double amount[3],
                      double jacobian[9]);
/* ---- Exact amounts (exact.c) ------------------------------------------- */

/** Amounts that mix to `xyz`. Affine: always, with any sign. Else: true when
 * amounts in [0, 1] reach it to the resolution of the setup, and the amounts of
 * the closest colour that was found when not. */
bool ef__exact(const ef__mixing *mixing, ef_xyz xyz, double amount[3]);
/** The same from the one start in `amount`, for setups that are not affine. */
bool ef__exact_from(const ef__mixing *mixing, ef_xyz xyz, double amount[3]);

/* ---- Descent in the unit box (descend.c, edge.c) ----------------------- */

/** A function to make small: the squared difference to a target. */
typedef struct ef__search {
  const ef__mixing *mixing;
  const ef_metric *metric;
  double target[3];      /**< in the metric's coordinates */
  unsigned n_expansions; /**< work done, for the bench */
  unsigned n_values;
} ef__search;

/** A point of the box with the squared difference to second order. */
typedef struct ef__place {
  double amount[3];
  double square;
  double gradient[3];
  double hessian[9];
} ef__place;

/** Squared difference at `amount`. */
double ef__search_value(ef__search *search, const double amount[3]);
/** Fills all of `place` from its amounts. */
void ef__search_expand(ef__search *search, ef__place *place);
/** Walks down from place->amount to a local minimum in the box by projected
 * Newton steps on the active face. At a kink or jump of the formula it stops
 * where no step of at least 1e-3 of Newton's goes down, and returns false. */
bool ef__descend(ef__search *search, ef__place *place);

typedef enum ef__descent {
  EF__DESCENT_SMOOTH,  /**< at a local minimum */
  EF__DESCENT_STOPPED, /**< at a kink or jump */
  EF__DESCENT_KNOWN    /**< on the way to a minimum that is known */
} ef__descent;

/** The same, but ends on the way as soon as it is clear to which of the known
 * minima (expanded there or a last step beside) it leads. */
ef__descent ef__descend_beside(ef__search *search, size_t n_known,
                               const ef__place *known, ef__place *place);

/** From where a descent stopped at the jump of opposite hues: along the edge of
 * the jump to its least value. True when that is lower. */
bool ef__descend_edge(ef__search *search, ef__place *place);

/* ---- Starts all over the gamut (scout.c) ------------------------------- */

/** Most starts that a look over the gamut gives. */
enum { EF__MAX_SCOUTED = 6 };

/** Colours of a grid of amounts, for one metric. Free with ef__scout_free. */
ef__scout *ef__scout_new(const ef__mixing *mixing, const ef_metric *metric,
                         ef_error *error);
void ef__scout_free(ef__scout *scout);
/** A point of the grid. */
typedef struct ef__start {
  double amount[3];
  double square; /**< of the difference to the target, about */
} ef__start;
/** The points of the grid that are nearer to the target (in the metric's
 * coordinates) than all their neighbours, the nearest first; none that differ
 * by more than `limit`. */
size_t ef__scout_starts(const ef__scout *scout, const ef_metric *metric,
                        const double target[3], double limit,
                        ef__start start[EF__MAX_SCOUTED]);

/** The `most` points of the grid that are nearest to the target, the nearest
 * first; how many there are. */
size_t ef__scout_nearest(const ef__scout *scout, const ef_metric *metric,
                         const double target[3], size_t most,
                         ef__start *start);

/* ---- Nearest colour (nearest.c) ---------------------------------------- */

/** Local minima found on the way to the nearest colour, the least first. */
enum { EF__MAX_MINIMA = 4 };
typedef struct ef__minima {
  size_t n;
  struct {
    double amount[3];
    double square;
  } at[EF__MAX_MINIMA];
} ef__minima;

/** The global minimum of the search in the box, and the others that were seen.
 * `exact` are amounts outside the box that match, or any point to start from
 * (clamped). */
void ef__nearest(ef__search *search, const double exact[3], ef__minima *out);
/** Down from `amount`; what is found joins the minima. */
void ef__nearest_from(ef__search *search, const double amount[3],
                      ef__minima *minima);

/* ---- Hue and lightness kept (hue_kept.c) ------------------------------- */

/** See ef_match.hue_kept; false when there is no such colour. */
bool ef__hue_kept(const ef__search *search, double amount[3]);

/* ---- Code values (quantise.c) ------------------------------------------ */

/** Amounts that the codes of one channel give, in increasing order. */
typedef struct ef__lattice {
  size_t n_codes;         /**< of each channel */
  const double *amount[3]; /**< n_codes each; the channel's curve at the codes */
} ef__lattice;

/** Codes whose colour has the least difference to the search's target, found
 * around the minima of the difference in the box, the least of them first.
 * `square` receives the squared difference of these codes. */
void ef__quantise(ef__search *search, const ef__lattice *lattice,
                  const ef__minima *minima, uint32_t code[3], double *square);
/** The codes on both sides of these amounts. */
void ef__cell_around(const ef__lattice *lattice, const double amount[3],
                     uint32_t from[3], uint32_t to[3]);

/* ---- Codes far from the target (cells.c, boxes.c) ---------------------- */

/** Better codes than those of `square`, if there are any, in the cells around
 * that lead from a minimum (expanded). False when not all were looked at. */
bool ef__search_cells(ef__search *search, const ef__lattice *lattice,
                      const ef__place *minimum, uint32_t code[3],
                      double *square);
/** True when ef__search_boxes knows what it needs: setups whose colours add,
 * formulas on CIELAB with a bound. */
bool ef__boxes_apply(const ef__mixing *mixing, const ef_metric *metric);
/** The best codes of all, if they are better than those of `square`, up to 1e-9
 * of the difference. Takes a millisecond or two. */
void ef__search_boxes(ef__search *search, const ef__lattice *lattice,
                      uint32_t code[3], double *square);
/** A bound that no difference of colours with amounts between `from` and `to`
 * is below, where ef__boxes_apply; not sought closer than `enough`. */
double ef__least_over(ef__search *search, const double from[3],
                      const double to[3], double enough);

/* ---- Answers (match.c) ------------------------------------------------- */

/** What all targets of a call share. */
typedef struct ef__batch {
  const ef_device *device;
  ef__mixing mixing;
  const ef_match_settings *settings;
  double jnd;
  ef__lattice lattice;
  double max_code; /**< highest code; 0: none were asked for */
  const double *xyz;
  ef_match *out;
} ef__batch;

/** Checks settings, jobs and targets and fills all but `mixing`. `*block` is
 * the memory of the lattice, to free in every case. */
ef_status ef__batch_start(ef__batch *batch, const ef_setup *setup, size_t n,
                          const double *xyz, const ef_match_settings *settings,
                          int jobs, ef_match *out, double **block,
                          ef_error *error);
/** Everything about the colour that `amount` shows. */
void ef__fill_shown(const ef__batch *batch, const ef__search *search,
                    const double amount[3], ef_shown *out);
/** The target itself, shown exactly: no difference, not even of rounding. */
void ef__fill_exact(const ef__batch *batch, const double amount[3],
                    ef_xyz target, ef_shown *out);
/** What m->code shows, and what plainly rounded codes would. */
void ef__fill_coded(const ef__batch *batch, const ef__search *search,
                    ef_match *m);
/** Amounts this close to 0 or 1 become 0 or 1; sets `amount`, `below`, `above`
 * and `in_gamut` of `m`. */
void ef__fill_amounts(double amount[3], ef_match *m);
/** The limits at which the nearest colour of `m` stands. */
void ef__fill_held(ef_match *m);

/* ---- Crowds (population.c) --------------------------------------------- */

/** The weights of at most so many blocks of observers stay from call to call;
 * before the first call, for tests. */
void ef__crowd_hold(ef_crowd *crowd, size_t n_blocks);

/* ---- Dichromats (dichromat.c) ------------------------------------------ */

/** See ef_match_adaptation; `field_matrix` is that of ef_cone_xyz_matrix. */
ef_status ef__dichromat_adaptation(ef_deficiency deficiency,
                                   const double field_matrix[9], ef_xyz from,
                                   ef_xyz to, double matrix[9],
                                   ef_error *error);

static inline double ef__clamp(double value, double low, double high) {
  return value < low ? low : value > high ? high : value;
}

#endif
