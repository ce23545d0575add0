/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What `tools/embed_tables --text` makes of the files in spectra/demo/. */
#ifndef EVENFIELD_EXCHANGE_EMBEDDED_H
#define EVENFIELD_EXCHANGE_EMBEDDED_H

#include <stddef.h>

/* A file, byte for byte: text[length] is a zero that is not part of it. */
typedef struct ef__embedded_text {
  const char *name; /* without folders, with its ending */
  const char *text;
  size_t length;
} ef__embedded_text;

/* Sorted by name. */
extern const ef__embedded_text ef__demo_files[];
extern const size_t ef__demo_file_count;
/* Their names without the ending, in the same order. */
extern const char *const ef__demo_names[];

#endif
