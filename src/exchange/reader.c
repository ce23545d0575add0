/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Blocks of rows from a table of any form. */
#include "exchange/exchange_private.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

enum {
  FIRST_ROWS = 100, /* looked at before kind and device maximum are decided */
  MOST_NOTED = 10,  /* faulty rows noted one by one */
  MOST_VALUES = 1 << 20 /* numbers of one block, whatever the caller asks */
};

ef_reader_settings ef_reader_settings_default(void) {
  return (ef_reader_settings){.kind = EF_KIND_AUTO,
                              .max_bytes = (size_t)1 << 30};
}

/* ---- Rows -------------------------------------------------------------- */

/* What is wrong with a row, without the advice behind the semicolon: it is
 * left out already. */
static void note_fault(const ef_reader *reader, const ef_error *fault) {
  ef_error said = *fault;
  char text[900];
  bool in_quotes = false;
  char *at = said.message;
  for (; *at != '\0' && (*at != ';' || in_quotes); ++at) {
    if (*at == '\'') in_quotes = !in_quotes;
  }
  *at = '\0';
  ef_error_describe(&said, text, sizeof text);
  ef__note(reader->settings.notes, "%s; row left out", text);
}

/* ---- The range --------------------------------------------------------- */

static bool has_range(const ef_reader *reader) {
  return reader->settings.end_byte > 0;
}

static bool is_before_range(const ef_reader *reader, size_t offset) {
  return has_range(reader) && offset < reader->settings.first_byte;
}

static bool is_behind_range(const ef_reader *reader, size_t offset) {
  return has_range(reader) && offset >= reader->settings.end_byte;
}

/* Rows of long spectra are wavelengths, which all ranges share. */
static bool is_told_of(const ef_reader *reader, size_t offset) {
  return reader->layout.is_long || (!is_before_range(reader, offset) &&
                                    !is_behind_range(reader, offset));
}

ef_status ef__reader_fault(ef_reader *reader, size_t offset,
                           const ef_error *fault, ef_error *error) {
  if (!reader->settings.skip_bad || fault->status != EF_MALFORMED) {
    if (error != NULL) *error = *fault;
    return fault->status;
  }
  if (!is_told_of(reader, offset)) return EF_OK;
  ++reader->n_skipped;
  if (reader->n_skipped <= MOST_NOTED) note_fault(reader, fault);
  return EF_OK;
}

/* Of a long table the first value is the wavelength. */
static void to_ratios(const ef_reader *reader, double *value) {
  const ef__layout *const layout = &reader->layout;
  for (size_t i = layout->is_long ? 1 : 0; i < layout->n_values; ++i) {
    value[i] /= 100;
  }
}

ef_status ef__reader_row(ef_reader *reader, bool with_limits, double *value,
                         double *device, ef__label *label, bool *has_row,
                         ef_error *error) {
  ef_error fault;
  for (;;) {
    ef_status status = ef__table_next(&reader->table, has_row, error);
    if (status != EF_OK || !*has_row) return status;
    ++reader->n_rows_seen;
    const size_t offset = reader->table.records.offset;
    if (reader->keeps_to_range && is_behind_range(reader, offset)) {
      *has_row = false;
      return EF_OK;
    }
    if (reader->keeps_to_range && is_before_range(reader, offset)) {
      /* As long as no number has shown the decimal mark, this one may. */
      if (reader->table.mark == '\0') {
        ef__row_read(&reader->table, &reader->layout, value, device, label,
                     &fault);
      }
      continue;
    }
    status = ef__row_read(&reader->table, &reader->layout, value, device, label,
                          &fault);
    if (status == EF_OK && reader->limits.is_percent) to_ratios(reader, value);
    if (status == EF_OK && with_limits) {
      status = ef__row_check(&reader->table, &reader->layout, &reader->limits,
                             reader->table.records.line, value, device, &fault);
    }
    if (status == EF_OK) return EF_OK;
    status = ef__reader_fault(reader, offset, &fault, error);
    if (status != EF_OK) return status;
  }
}

/* "row 7" for a row without a name of its own. */
static ef__span number_name(size_t number, char text[32]) {
  char *at = text + 32;
  do {
    *--at = (char)('0' + number % 10);
    number /= 10;
  } while (number > 0);
  at -= 4;
  memcpy(at, "row ", 4);
  return (ef__span){at, (size_t)(text + 32 - at)};
}

/* Full drive becomes 1. */
static void scale_device(const ef_reader *reader, ef__rows *rows, size_t row) {
  if (rows->device == NULL) return;
  double *const device = rows->device + row * reader->layout.n_device;
  for (size_t i = 0; i < reader->layout.n_device; ++i) {
    device[i] /= reader->limits.device_max;
  }
}

/* Rows from the file into `rows` until it holds `n_wanted`. */
static ef_status fill(ef_reader *reader, ef__rows *rows, size_t n_wanted,
                      bool with_limits, ef_error *error) {
  ef_status status = ef__rows_reserve(rows, n_wanted, error);
  while (status == EF_OK && rows->n < n_wanted) {
    char number[32];
    ef__label label;
    bool has_row;
    double *const device =
        rows->n_device > 0 ? rows->device + rows->n * rows->n_device : NULL;
    status = ef__reader_row(reader, with_limits,
                            rows->value + rows->n * rows->width, device, &label,
                            &has_row, error);
    if (status != EF_OK) return status;
    if (!has_row) {
      reader->source_ended = true;
      break;
    }
    if (label.name.length == 0) {
      label.name = number_name(reader->n_rows_seen, number);
    }
    if (with_limits) scale_device(reader, rows, rows->n);
    status = ef__rows_add(rows, reader->table.records.line,
                          reader->table.records.offset, label, error);
  }
  ef__rows_name_all(rows);
  return status;
}

/* Checks the rows that were read before their limits were known. */
static ef_status check_first_rows(ef_reader *reader, ef_error *error) {
  ef__rows *const rows = &reader->rows;
  size_t kept = 0;
  for (size_t i = 0; i < rows->n; ++i) {
    ef_error fault;
    const double *const device =
        rows->n_device > 0 ? rows->device + i * rows->n_device : NULL;
    ef_status status = ef__row_check(
        &reader->table, &reader->layout, &reader->limits, rows->line[i],
        rows->value + i * rows->width, device, &fault);
    if (status == EF_OK) {
      ef__rows_move(rows, i, kept);
      scale_device(reader, rows, kept++);
      continue;
    }
    status = ef__reader_fault(reader, rows->offset[i], &fault, error);
    if (status != EF_OK) return status;
  }
  rows->n = kept;
  ef__rows_name_all(rows);
  return EF_OK;
}

static ef_status refuse_no_rows(const ef_reader *reader, ef_error *error) {
  const ef__table *const table = &reader->table;
  if (reader->n_rows_seen > 0) {
    return ef__header_error(table, SIZE_MAX, error,
                            "all %zu rows are at fault; none is left to use",
                            reader->n_rows_seen);
  }
  return ef__header_error(table, SIZE_MAX, error,
                          "no row follows the header row; add at least one");
}

static ef_status read_first_rows(ef_reader *reader, ef_error *error) {
  ef__rows *const rows = &reader->rows;
  const ef__layout *const layout = &reader->layout;
  rows->width = layout->n_values;
  rows->n_device = layout->n_device;
  rows->has_angles = layout->angle_column != SIZE_MAX;
  ef_status status = fill(reader, rows, FIRST_ROWS, false, error);
  if (status != EF_OK) return status;
  ef__range value = ef__range_none();
  ef__range device = ef__range_none();
  ef__range_add(&value, rows->n * rows->width, rows->value);
  ef__range_add(&device, rows->n * rows->n_device, rows->device);
  ef__decide_from_values(reader, rows->n, value, device);
  status = check_first_rows(reader, error);
  if (status == EF_OK && rows->n == 0 && !reader->source_ended) {
    status = fill(reader, rows, 1, true, error);
  }
  if (status == EF_OK && rows->n == 0) return refuse_no_rows(reader, error);
  return status;
}

/* ---- Opening ----------------------------------------------------------- */

static void fill_head(ef_reader *reader) {
  const ef__layout *const layout = &reader->layout;
  ef_reader_head *const head = &reader->head;
  head->file = reader->table.records.input->name;
  head->title = reader->table.remarks.title;
  head->illuminant = reader->table.remarks.illuminant;
  head->observer = reader->table.remarks.observer;
  head->content = layout->content;
  head->width = reader->rows.width;
  head->kind = reader->limits.kind;
  head->has_names = layout->is_long || layout->name_column != SIZE_MAX;
  head->has_angles = layout->angle_column != SIZE_MAX;
  head->n_device = layout->n_device;
  head->device_name = layout->device_name;
  if (layout->content != EF_CONTENT_SPECTRA) return;
  const ef_grid listed = {
      .count = head->width,
      .wavelength_nm =
          layout->is_long ? reader->wavelength_nm : layout->wavelength_nm};
  head->grid = ef_grid_simplify(&listed);
}

/* The first rows, or all of a table held whole, have been read to decide: of
 * those only what is in the range is handed out. */
static void enter_range(ef_reader *reader) {
  ef__rows *const rows = &reader->rows;
  if (!has_range(reader) || reader->settings.reads_others) return;
  reader->keeps_to_range = true;
  while (reader->next_row < rows->n &&
         is_before_range(reader, rows->offset[reader->next_row])) {
    ++reader->next_row;
  }
  while (rows->n > reader->next_row &&
         is_behind_range(reader, rows->offset[rows->n - 1])) {
    --rows->n;
    reader->source_ended = true;
  }
}

static ef_status read_head(ef_reader *reader, ef_error *error) {
  ef_status status = ef__layout_new(&reader->table, &reader->layout, error);
  if (status == EF_OK) status = ef__decide_from_remarks(reader, error);
  if (status != EF_OK) return status;
  status = reader->layout.is_long ? ef__long_read(reader, error)
                                  : read_first_rows(reader, error);
  if (status != EF_OK) return status;
  if (reader->rows.n == 0) return refuse_no_rows(reader, error);
  fill_head(reader);
  enter_range(reader);
  reader->at_end = reader->source_ended;
  reader->n_skipped_told = reader->n_skipped;
  return EF_OK;
}

static bool settings_are_good(const ef_reader_settings *settings,
                              ef_error *error) {
  if (isfinite(settings->device_max) && settings->device_max >= 0) return true;
  ef__error_set(error, EF_INVALID,
                "the device value of full drive must be a number above zero, "
                "or 0 to leave it open");
  return false;
}

/* Takes the input over. */
static ef_reader *reader_new(ef__input *input,
                             const ef_reader_settings *settings,
                             ef_error *error) {
  ef_reader *const reader = ef__allocate_zeroed(1, sizeof *reader);
  if (reader == NULL) {
    ef__input_free(input);
    ef__error_memory(error, "a table");
    return NULL;
  }
  reader->settings = *settings;
  if (ef__table_open(input, settings->notes, &reader->table, error) != EF_OK ||
      read_head(reader, error) != EF_OK) {
    ef_reader_free(reader);
    return NULL;
  }
  return reader;
}

ef_reader *ef_reader_from_text(const char *name, const char *text,
                               size_t length,
                               const ef_reader_settings *settings,
                               ef_error *error) {
  const ef_reader_settings defaults = ef_reader_settings_default();
  if (settings == NULL) settings = &defaults;
  if (!settings_are_good(settings, error)) return NULL;
  ef__input *const input = ef__input_from_text(name, text, length, error);
  return input == NULL ? NULL : reader_new(input, settings, error);
}

ef_reader *ef_reader_open(const char *path, const ef_reader_settings *settings,
                          ef_error *error) {
  const ef_reader_settings defaults = ef_reader_settings_default();
  if (settings == NULL) settings = &defaults;
  if (!settings_are_good(settings, error)) return NULL;
  ef__span demo;
  switch (ef__demo_find(path, &demo, error)) {
  case EF__DEMO_NONE: break;
  case EF__DEMO_UNKNOWN: return NULL;
  case EF__DEMO_FOUND:
    return ef_reader_from_text(path, demo.text, demo.length, settings, error);
  }
  ef__input *const input = ef__input_open(path, error);
  return input == NULL ? NULL : reader_new(input, settings, error);
}

void ef_reader_free(ef_reader *reader) {
  if (reader == NULL) return;
  ef__ahead_free(reader->ahead);
  ef__table_clear(&reader->table);
  ef__layout_clear(&reader->layout);
  ef__rows_clear(&reader->rows);
  ef__rows_clear(&reader->next);
  free(reader->said.lines);
  free(reader->wavelength_nm);
  free(reader);
}

const ef_reader_head *ef_reader_get_head(const ef_reader *reader) {
  return &reader->head;
}

size_t ef_reader_skipped(const ef_reader *reader) {
  return reader->n_skipped_told;
}

/* ---- Blocks ------------------------------------------------------------ */

static size_t most_rows(const ef_reader *reader, size_t asked) {
  const size_t numbers = reader->rows.width + reader->rows.n_device;
  const size_t most = MOST_VALUES / (numbers > 0 ? numbers : 1);
  const size_t allowed = most > 0 ? most : 1;
  return asked < allowed ? asked : allowed;
}

static void note_end(ef_reader *reader) {
  const size_t n = reader->n_skipped_told;
  if (reader->end_is_noted || n == 0) return;
  reader->end_is_noted = true;
  ef__note(reader->ahead != NULL ? reader->told : reader->settings.notes,
           "%s: %zu row%s left out as faulty", reader->head.file, n,
           n == 1 ? "" : "s");
}

/* ---- Reading ahead ----------------------------------------------------- */

/* Without memory a note is lost, no row is. */
static void keep_note(void *cookie, const char *line) {
  ef__said *const said = cookie;
  const size_t length = strlen(line) + 1;
  if (said->room - said->used < length) {
    const size_t room = 2 * (said->used + length);
    char *const grown = ef__reallocate(said->lines, room, 1);
    if (grown == NULL) return;
    said->lines = grown;
    said->room = room;
  }
  memcpy(said->lines + said->used, line, length);
  said->used += length;
}

static void give_notes(ef_reader *reader) {
  ef__said *const said = &reader->said;
  for (size_t at = 0; at < said->used; at += strlen(said->lines + at) + 1)
    ef__note(reader->told, "%s", said->lines + at);
  said->used = 0;
}

static void read_next(void *cookie) {
  ef_reader *const reader = cookie;
  reader->next_status = fill(reader, &reader->next, reader->next_wanted, true,
                             &reader->next_error);
}

/* A pipe may keep its readers waiting, and then their end as well. */
static bool may_read_ahead(const ef_reader *reader) {
  const ef__input *const input = reader->table.records.input;
  return reader->settings.reads_ahead && !reader->source_ended &&
         (input->descriptor < 0 || input->is_file);
}

static void start_ahead(ef_reader *reader) {
  if (!may_read_ahead(reader)) return;
  reader->ahead = ef__ahead_new(read_next, reader);
  if (reader->ahead == NULL) return;
  reader->next = (ef__rows){.width = reader->rows.width,
                            .n_device = reader->rows.n_device,
                            .has_angles = reader->rows.has_angles};
  reader->told = reader->settings.notes;
  reader->kept = (ef_notes){.write = keep_note, .cookie = &reader->said};
  reader->settings.notes = reader->table.notes = &reader->kept;
}

static void ask_for_next(ef_reader *reader, size_t n_wanted) {
  reader->next.n = 0;
  reader->next.texts_used = 0;
  reader->next_wanted = n_wanted;
  ef__ahead_ask(reader->ahead);
}

static ef_status take_next(ef_reader *reader, ef_error *error) {
  ef__ahead_wait(reader->ahead);
  const ef__rows done = reader->rows;
  reader->rows = reader->next;
  reader->next = done;
  if (reader->next_status != EF_OK && error != NULL)
    *error = reader->next_error;
  return reader->next_status;
}

/* The next rows of the file in place of the last ones. */
static ef_status refill(ef_reader *reader, size_t n_wanted, ef_error *error) {
  ef__rows *const rows = &reader->rows;
  ef_status status;
  reader->next_row = 0;
  if (reader->ahead != NULL) {
    status = take_next(reader, error);
    give_notes(reader);
  } else {
    rows->n = 0;
    rows->texts_used = 0;
    status = fill(reader, rows, n_wanted, true, error);
    if (status == EF_OK) start_ahead(reader);
  }
  reader->n_skipped_told = reader->n_skipped;
  reader->at_end = reader->source_ended || status != EF_OK;
  if (status != EF_OK) rows->n = 0; /* after a fault nothing more comes */
  if (reader->ahead != NULL && !reader->at_end) ask_for_next(reader, n_wanted);
  return status;
}

ef_status ef_reader_next(ef_reader *reader, size_t max_rows, ef_block *block,
                         ef_error *error) {
  ef__rows *const rows = &reader->rows;
  *block = (ef_block){0};
  if (max_rows == 0) {
    return ef__error_set(error, EF_INVALID, "no room for a row was given");
  }
  if (reader->next_row == rows->n && !reader->at_end) {
    const ef_status status =
        refill(reader, most_rows(reader, max_rows), error);
    if (status != EF_OK) return status;
  }
  const size_t left = rows->n - reader->next_row;
  const size_t first = reader->next_row;
  block->n = left < max_rows ? left : max_rows;
  reader->next_row += block->n;
  if (block->n == 0) {
    note_end(reader);
    return EF_OK;
  }
  block->name = rows->name + first;
  block->line = rows->line + first;
  block->offset = rows->offset + first;
  block->value = rows->value + first * rows->width;
  if (rows->n_device > 0) block->device = rows->device + first * rows->n_device;
  if (rows->has_angles) block->angle_deg = rows->angle_deg + first;
  return EF_OK;
}
