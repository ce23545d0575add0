/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Rows of a file as tristimulus values, seen by an observer under an
 * illuminant. */
#ifndef COMMAND_COLOURS_H
#define COMMAND_COLOURS_H

#include <evenfield/colour.h>
#include <evenfield/exchange.h>

/** Who looks, and in which light. */
typedef struct colour_basis {
  const ef_observer *observer;
  const ef_illuminant *illuminant; /**< on surfaces; white of L*a*b* */
  ef_xyz white;                    /**< of the illuminant, Y = 100 */
} colour_basis;

/** Fills `white` from the other two. */
ef_status colour_basis_init(colour_basis *basis, const ef_observer *observer,
                            const ef_illuminant *illuminant, ef_error *error);

/** How the rows of one file are turned. */
typedef struct colours {
  ef_content content;
  ef_kind kind;
  ef_grid grid;
  ef_xyz white;
  ef_weights *weights; /**< of spectra */
} colours;

/** For a file with this head; EF_MALFORMED for device values alone,
 * EF_NO_ANSWER for what is no spectrum to an observer of two dimensions. Free
 * with colours_free in every case. */
ef_status colours_init(colours *c, const colour_basis *basis,
                       const ef_reader_head *head, const ef_notes *notes,
                       ef_error *error);
void colours_free(colours *c);
/** Notes where a file says that its colours (not spectra) are of another light
 * or observer than they are read as. */
void colours_note_basis(const ef_reader_head *head, const ef_observer *observer,
                        const ef_illuminant *illuminant, const ef_notes *notes);
/** n rows to n x 3 tristimulus values. */
ef_status colours_xyz(const colours *c, size_t n, const double *value, int jobs,
                      double *xyz, ef_error *error);

#endif
