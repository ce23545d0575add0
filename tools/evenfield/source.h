/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What options name: a built-in thing or a file. */
#ifndef COMMAND_SOURCE_H
#define COMMAND_SOURCE_H

#include <evenfield/exchange.h>
#include <evenfield/observer.h>

#include "option.h"
#include "part.h"

/** True when `name` is meant as a file: it exists, or it has the look of a
 * path. */
bool source_is_file(const command_options *options, const char *name);
/** --kind. */
ef_kind_choice source_kind(const command_options *options);
/** Opens a file as the options say; `kind` is the answer the place gives when
 * the file is silent, EF_KIND_AUTO if it gives none. */
ef_reader *source_reader(const command_options *options, const char *path,
                         ef_kind_choice kind, const ef_notes *notes,
                         ef_error *error);
/** The rows of a large file, or those of a part of it; --kind when the file is
 * silent. */
ef_reader *source_rows(const command_options *options, const char *path,
                       const part_range *range, const ef_notes *notes,
                       ef_error *error);
/** --observer: a name or a file. */
ef_observer *source_observer(const command_options *options,
                             const ef_notes *notes, ef_error *error);
/** The same of any name; `what` names the argument in messages. */
ef_observer *source_observer_named(const command_options *options,
                                   const char *name, const char *what,
                                   const ef_notes *notes, ef_error *error);
/** One surface of a file, FILE or FILE:SAMPLE; free *spectra with
 * ef_spectra_free. */
ef_status source_surface(const command_options *options, const char *option,
                         const char *name, const ef_notes *notes,
                         ef_spectra **spectra, size_t *at, ef_error *error);
/** First of --illuminant, or `otherwise`. */
const char *source_first_light(const command_options *options,
                               const char *otherwise);
/** A light by name, FILE or FILE:COLUMN; `option` names the option in
 * messages. */
ef_illuminant *source_illuminant(const command_options *options,
                                 const char *option, const char *name,
                                 const ef_notes *notes, ef_error *error);

#endif
