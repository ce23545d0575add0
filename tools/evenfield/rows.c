/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "rows.h"

#include <stdlib.h>
#include <string.h>

#include "message.h"

enum { BLOCK_ROWS = 1024 };

static bool grow(void *array, size_t count, size_t size) {
  void *block;
  memcpy(&block, array, sizeof block);
  void *grown = realloc(block, (count > 0 ? count : 1) * size);
  if (grown == NULL)
    return false;
  memcpy(array, &grown, sizeof grown);
  return true;
}

static bool append(rows *r, const ef_block *block) {
  const size_t n = r->n + block->n;
  if (!grow(&r->name, n, sizeof *r->name) ||
      !grow(&r->line, n, sizeof *r->line) ||
      !grow(&r->value, n * r->width, sizeof *r->value) ||
      (block->device != NULL &&
       !grow(&r->device, n * r->n_device, sizeof *r->device))) {
    return false;
  }
  memcpy(r->line + r->n, block->line, block->n * sizeof *r->line);
  memcpy(r->value + r->n * r->width, block->value,
         block->n * r->width * sizeof *r->value);
  if (block->device != NULL) {
    memcpy(r->device + r->n * r->n_device, block->device,
           block->n * r->n_device * sizeof *r->device);
  }
  for (size_t i = 0; i < block->n; ++i) {
    char *name = strdup(block->name[i]);
    if (name == NULL)
      return false;
    r->name[r->n++] = name;
  }
  return true;
}

ef_status rows_read(ef_reader *reader, rows *out, ef_error *error) {
  const ef_reader_head *head = ef_reader_get_head(reader);
  *out = (rows){.width = head->width, .n_device = head->n_device};
  for (;;) {
    ef_block block;
    const ef_status status = ef_reader_next(reader, BLOCK_ROWS, &block, error);
    if (status != EF_OK)
      return status;
    if (block.n == 0)
      break;
    if (!append(out, &block)) {
      return message_fail(error, EF_NO_MEMORY, "out of memory for the rows");
    }
  }
  if (out->n > 0)
    return EF_OK;
  message_fail(error, EF_MALFORMED, "there is a header and no row to read");
  return message_place(error, head->file);
}

void rows_free(rows *r) {
  for (size_t i = 0; i < r->n; ++i)
    free(r->name[i]);
  free(r->name);
  free(r->line);
  free(r->value);
  free(r->device);
  *r = (rows){0};
}

ef_spectra *rows_spectra(const rows *r, const ef_reader_head *head,
                         ef_error *error) {
  const char **names = malloc(r->n * sizeof *names);
  if (names == NULL) {
    message_fail(error, EF_NO_MEMORY, "out of memory for names");
    return NULL;
  }
  for (size_t i = 0; i < r->n; ++i)
    names[i] = r->name[i];
  ef_spectra *spectra =
      ef_spectra_new(r->n, names, &head->grid, head->kind, r->value, error);
  free(names);
  if (spectra != NULL) {
    ef_spectra_set_absolute(spectra, head->absolute);
  } else {
    message_place(error, head->file);
  }
  return spectra;
}
