/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What an observer holds, for the files that make one. */
#ifndef EVENFIELD_OBSERVER_PRIVATE_H
#define EVENFIELD_OBSERVER_PRIVATE_H

#include <evenfield/observer.h>

/** Channels on the standard grid. */
typedef struct ef__channel_set {
  size_t count;
  const char *const *name; /**< static */
  double *value;           /**< count x samples of the standard grid */
} ef__channel_set;

/** One block of memory, released with free(). */
struct ef_observer {
  char *name;
  char *about;
  double field_deg;
  double k_m;
  bool cones_borrowed;
  ef_mb_scale mb_scale;
  size_t dimensions;      /**< 3, or 2 for dichromats */
  bool has_model;         /**< made of a cone model: this one */
  ef_cone_model model;
  ef__channel_set set[3]; /**< by ef_channel_role; the cones are the first
                               three channels of the receptors */
};

/** The cones of one of the two fields that the CIE tabulates (cmf.c). */
typedef struct ef__cone_field {
  const char *table; /**< CIE 170-1:2006 */
  double field_deg;
  double k_m;        /**< lm/W for y_F */
  ef_mb_scale mb_scale;
  double to_xyz[9];  /**< l, m, s to x_F, y_F, z_F */
} ef__cone_field;

extern const ef__cone_field ef__cone_field_2;
extern const ef__cone_field ef__cone_field_10;

/** x_bar, y_bar, z_bar and l_bar, m_bar, s_bar. */
extern const char *const ef__tristimulus_names[3];
extern const char *const ef__receptor_names[EF_N_RECEPTORS];

/** An observer with room for its texts (copied) and the channels of each role,
 * all zero; the rest is to be filled. NULL without memory. */
ef_observer *ef__observer_allocate(const char *name, const char *about,
                                   ef_error *error);

/** Fills rods and melanopsin (receptor.c): for the mean observer of 32 years,
 * or for the ocular media of `model` unless that is NULL. */
ef_status ef__observer_set_receptors(ef_observer *observer,
                                     const ef_cone_model *model,
                                     ef_error *error);

/** An observer of a checked model under the name that was asked for. */
ef_observer *ef__observer_from_model(const char *name,
                                     const ef_cone_model *model,
                                     ef_error *error);

/* ---- Viewing (viewing.c) ----------------------------------------------- */

/** An illuminant for surfaces and none for lights. */
ef_status ef__viewing_check(const ef_viewing *viewing, ef_error *error);
/** Even steps. */
ef_status ef__working_check(const ef_grid *grid, ef_error *error);
/** Refuses an illuminant that makes no finite scale for surfaces. */
ef_status ef__light_check(const ef_illuminant *illuminant, double scale,
                          ef_error *error);
/** When more than 0.1 % of the weight of a channel lies outside the samples.
 * Names repeat after `n_names` channels. */
void ef__note_outside(const ef_weights *weights, size_t n_names,
                      const char *const *names, const ef_viewing *viewing,
                      const ef_notes *notes);

/* ---- Tables (cmf.c) ---------------------------------------------------- */

/** Number and names of the tabulated observers. */
size_t ef__tabulated_names(const char *const **names);
/** The i-th of them. */
ef_observer *ef__tabulated_new(size_t i, ef_error *error);

#endif
