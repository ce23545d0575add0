/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The lights and observers that pairs are compared under: each observer in
 * each light is one look. */
#ifndef COMMAND_LOOKS_H
#define COMMAND_LOOKS_H

#include <evenfield/difference.h>

#include "colours.h"
#include "option.h"

#define LOOKS_MOST 32

typedef struct look {
  const ef_illuminant *illuminant;
  const ef_observer *observer;
  size_t light;       /**< index of the illuminant */
  colour_basis basis; /**< the two, and the white */
  ef_conditions conditions;
  bool is_own;     /**< the light comes from a file of the user's */
  char words[200]; /**< "in daylight (D65)" */
} look;

/** The first look is the reference: where a pair should match. */
typedef struct looks {
  size_t n;                /**< looks that answers are given for */
  look at[LOOKS_MOST + 1]; /**< behind them the one below */
  bool has_other;          /**< at[n] is another standard observer in the first
                                light, for the change of observer, where one
                                observer was asked for */
  size_t n_lights, n_observers;
  ef_illuminant **light;  /**< owned */
  ef_observer **observer; /**< owned */
} looks;

/** From --illuminant and --observer, each of which may be given more than once;
 * without the first `n_defaults` names are taken. Free with looks_free in every
 * case. */
ef_status looks_init(looks *l, const command_options *options,
                     size_t n_defaults, const char *const *defaults,
                     const ef_notes *notes, ef_error *error);
void looks_free(looks *l);
/** Keeps the first look alone: colours belong to one light and observer. */
void looks_keep_first(looks *l);

/** How the rows of one file become tristimulus values under each look. */
typedef struct looks_colours {
  size_t n; /**< with the other observer */
  colours at[LOOKS_MOST + 1];
  double scale; /**< of colours in cd/m2, to Y = 100 for the white */
} looks_colours;

/** For a file with this head: surfaces, or colours of known luminance. Free
 * with looks_colours_free in every case. */
ef_status looks_colours_init(looks_colours *c, const looks *l,
                             const command_options *options,
                             const ef_reader_head *head, const ef_notes *notes,
                             ef_error *error);
void looks_colours_free(looks_colours *c);
/** n rows under look `i`: n x 3. */
ef_status looks_colours_xyz(const looks_colours *c, size_t i, size_t n,
                            const double *value, int jobs, double *xyz,
                            ef_error *error);

#endif
