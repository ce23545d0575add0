/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Rows held in memory; reused from block to block. */
#include "exchange/exchange_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* Resizes one array; false when there is no memory. */
static bool resize(void *array_pointer, size_t count, size_t each,
                   size_t size) {
  void *array;
  size_t n;
  if (!ef__size_multiply(count, each, &n)) return false;
  memcpy(&array, array_pointer, sizeof array);
  void *const grown = ef__reallocate(array, n, size);
  if (grown == NULL) return false;
  memcpy(array_pointer, &grown, sizeof grown);
  return true;
}

ef_status ef__rows_reserve(ef__rows *rows, size_t room, ef_error *error) {
  if (room <= rows->room) return EF_OK;
  const bool has_room =
      resize(&rows->value, room, rows->width, sizeof *rows->value) &&
      (rows->n_device == 0 ||
       resize(&rows->device, room, rows->n_device, sizeof *rows->device)) &&
      (!rows->has_angles ||
       resize(&rows->angle_deg, room, 1, sizeof *rows->angle_deg)) &&
      resize(&rows->line, room, 1, sizeof *rows->line) &&
      resize(&rows->offset, room, 1, sizeof *rows->offset) &&
      resize(&rows->name_at, room, 1, sizeof *rows->name_at) &&
      resize(&rows->name, room, 1, sizeof *rows->name);
  if (!has_room) return ef__error_memory(error, "rows of a table");
  rows->room = room;
  return EF_OK;
}

static ef_status reserve_text(ef__rows *rows, size_t length, ef_error *error) {
  if (rows->texts_room - rows->texts_used >= length) return EF_OK;
  const size_t wanted = 2 * (rows->texts_used + length);
  const size_t room = wanted < 4096 ? 4096 : wanted;
  char *const grown = ef__reallocate(rows->texts, room, 1);
  if (grown == NULL) return ef__error_memory(error, "names of a table");
  rows->texts = grown;
  rows->texts_room = room;
  return EF_OK;
}

ef_status ef__rows_add(ef__rows *rows, size_t line, size_t offset,
                       ef__label label, ef_error *error) {
  const ef__span name = label.name;
  const ef_status status = reserve_text(rows, name.length + 1, error);
  if (status != EF_OK) return status;
  char *const to = rows->texts + rows->texts_used;
  memcpy(to, name.text, name.length);
  to[name.length] = '\0';
  rows->name_at[rows->n] = rows->texts_used;
  rows->line[rows->n] = line;
  rows->offset[rows->n] = offset;
  if (rows->has_angles) rows->angle_deg[rows->n] = label.angle_deg;
  rows->texts_used += name.length + 1;
  ++rows->n;
  return EF_OK;
}

void ef__rows_move(ef__rows *rows, size_t from, size_t to) {
  if (from == to) return;
  if (rows->width > 0) {
    memcpy(rows->value + to * rows->width, rows->value + from * rows->width,
           rows->width * sizeof *rows->value);
  }
  if (rows->n_device > 0) {
    memcpy(rows->device + to * rows->n_device,
           rows->device + from * rows->n_device,
           rows->n_device * sizeof *rows->device);
  }
  if (rows->has_angles) rows->angle_deg[to] = rows->angle_deg[from];
  rows->line[to] = rows->line[from];
  rows->offset[to] = rows->offset[from];
  rows->name_at[to] = rows->name_at[from];
}

void ef__rows_name_all(ef__rows *rows) {
  for (size_t i = 0; i < rows->n; ++i) {
    rows->name[i] = rows->texts + rows->name_at[i];
  }
}

void ef__rows_clear(ef__rows *rows) {
  free(rows->value);
  free(rows->device);
  free(rows->angle_deg);
  free(rows->line);
  free(rows->offset);
  free(rows->name_at);
  free(rows->name);
  free(rows->texts);
  *rows = (ef__rows){0};
}

ef__range ef__range_none(void) {
  return (ef__range){(double)INFINITY, -(double)INFINITY};
}

void ef__range_add(ef__range *range, size_t n, const double *value) {
  for (size_t i = 0; i < n; ++i) {
    if (value[i] < range->lowest) range->lowest = value[i];
    if (value[i] > range->highest) range->highest = value[i];
  }
}
