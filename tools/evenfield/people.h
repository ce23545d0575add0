/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --population, --ages, --seed, --field: many observers who differ. */
#ifndef COMMAND_PEOPLE_H
#define COMMAND_PEOPLE_H

#include <evenfield/exchange.h>
#include <evenfield/observer.h>

#include "option.h"
#include "text.h"

typedef struct people {
  /** Owned; those drawn, or after people_choose those who stand for them, the
   * one who stands for most first. */
  ef_population *population;
  ef_population_settings settings;
  double *table;        /**< of an age table: ages, then shares; owned */
  const char *age_file; /**< NULL: a range */
  size_t n_chosen;      /**< 0: everybody */
  double *share;        /**< n_chosen, of those they stand for; owned */
  char mean[420];       /**< the observer they vary about, "" the mean eye */
} people;

/** How many --categories chooses from unless --population says. */
enum { PEOPLE_CHOSEN_FROM = 10000 };

/** EXIT_USAGE with its message when --ages, --seed or --field stand without
 * `option`, which they go with, or when --categories cannot choose from so many
 * people. */
exit_code people_check_usage(const command_options *options, const char *option,
                             bool is_asked);

/** `n_default` people when --population is not given, who vary about the model
 * of `observer` or, for an observer without one, about the mean eye. Free with
 * people_free in every case. */
ef_status people_load(people *p, const command_options *options,
                      size_t n_default, const ef_observer *observer,
                      const ef_notes *notes, ef_error *error);
/** Puts the `k` observers that stand best for the population in its place.
 * EF_UNKNOWN_NAME for more than there are people. */
ef_status people_choose(people *p, size_t k, int jobs, ef_error *error);
void people_free(people *p);

/** "1000 people 20 to 70 years old", "1 protanope of the ages in FILE". */
void people_add_who(text *out, const people *p);
/** The same with field and seed, and whom they vary about. */
void people_add(text *out, const people *p);
/** The same as members of the open object. */
void people_write(ef_json *json, const people *p);

#endif
