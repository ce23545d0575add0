/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The rows of the table of options: what parsing, help and completion read. */
#ifndef COMMAND_OPTION_ROWS_H
#define COMMAND_OPTION_ROWS_H

#include "option.h"

typedef enum option_type {
  TYPE_FLAG,
  TYPE_TEXT,
  TYPE_TEXTS,  /* may be given more than once */
  TYPE_CHOICE, /* one of `choices`; its number is stored */
  TYPE_INTEGER,
  TYPE_WHOLE, /* a whole number that an int may be too small for */
  TYPE_NUMBER
} option_type;

typedef struct option_row {
  const char *name;
  const char *value; /* as help shows it; NULL for a flag */
  unsigned commands; /* which know it */
  option_type type;
  size_t offset;    /* of its field in struct command_options */
  double low, high; /* of a number */
  const char *const *choices;
  const char *help;
} option_row;

/** At least as many as there are. */
enum { MOST_OPTIONS = 256 };

/** All of them, in the order of help; returns how many. */
size_t option_rows(const option_row **rows);

#endif
