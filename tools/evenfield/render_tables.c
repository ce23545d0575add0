/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_tables.h"

#include <string.h>

#include "message.h"

/* ---- Lists ------------------------------------------------------------- */

static ef_status list_as_text(const catalogue *c, const listing *l,
                              ef_output *output, ef_error *error) {
  text out = {0};
  text_format(&out, "%zu %s.\n\n", l->n_cells / l->n_columns, c->what);
  ef_status status = listing_add_text(l, &out, error);
  text_add(&out, "\n");
  text_wrap(&out, c->use, 0);
  if (status == EF_OK)
    status = text_write(&out, output, error);
  text_free(&out);
  return status;
}

static ef_status list_as_csv(const listing *l, ef_output *output,
                             ef_error *error) {
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  ef_error late;
  const ef_status status = listing_write_csv(l, csv, error);
  const ef_status finished =
      ef_csv_finish(csv, status == EF_OK ? error : &late);
  return status != EF_OK ? status : finished;
}

static ef_status list_as_json(const catalogue *c, const listing *l,
                              ef_output *output, ef_error *error) {
  ef_json *json = ef_json_new(output, error);
  if (json == NULL)
    return error->status;
  ef_error late;
  ef_json_begin_object(json, NULL);
  const ef_status status = listing_write_json(l, json, c->name, error);
  ef_json_end_object(json);
  const ef_status finished =
      ef_json_finish(json, status == EF_OK ? error : &late);
  return status != EF_OK ? status : finished;
}

ef_status render_catalogue(const catalogue *c, int format, ef_output *output,
                           ef_error *error) {
  listing l = {0};
  ef_status status = c->fill(&l, error);
  if (status == EF_OK && format == FORMAT_TEXT) {
    status = list_as_text(c, &l, output, error);
  } else if (status == EF_OK && format == FORMAT_CSV) {
    status = list_as_csv(&l, output, error);
  } else if (status == EF_OK) {
    status = list_as_json(c, &l, output, error);
  }
  listing_free(&l);
  return status;
}

/* ---- One table --------------------------------------------------------- */

static void fill_figures(listing *l, const ef_table *table) {
  for (size_t c = 0; c < table->n_columns; ++c) {
    const char *head = c == 0 ? "nm" : table->column[c];
    listing_number_column(l, table->column[c], head, "", -1);
  }
  for (size_t r = 0; r < table->n_rows; ++r) {
    for (size_t c = 0; c < table->n_columns; ++c) {
      listing_number(l, table->value[c * table->n_rows + r]);
    }
  }
}

/* Calls `put` for every line of a remark with its label. */
static void each_line(const char *label, const char *lines, void *to,
                      void (*put)(void *to, const char *label, const char *line,
                                  size_t length)) {
  while (*lines != '\0') {
    const size_t length = strcspn(lines, "\n");
    put(to, label, lines, length);
    lines += length;
    lines += *lines == '\n';
  }
}

static void put_text(void *to, const char *label, const char *line,
                     size_t length) {
  text one = {0};
  text_format(&one, "%.*s", (int)(length < 900 ? length : 900), line);
  text_format(to, "%-10s", label);
  text_wrap(to, one.bytes != NULL ? one.bytes : "", 10);
  text_free(&one);
}

static void put_comment(void *to, const char *label, const char *line,
                        size_t length) {
  text one = {0};
  text_format(&one, "%s: %.*s", label, (int)(length < 900 ? length : 900),
              line);
  ef_csv_comment(to, one.bytes != NULL ? one.bytes : "");
  text_free(&one);
}

static void put_all(const ef_table *t, void *to,
                    void (*put)(void *to, const char *label, const char *line,
                                size_t length)) {
  each_line("title", t->title, to, put);
  each_line("source", t->source, to, put);
  each_line("quantity", t->quantity, to, put);
  each_line("note", t->note, to, put);
  each_line("rights", t->rights, to, put);
}

static ef_status table_as_text(const ef_table *table, const listing *l,
                               ef_output *output, ef_error *error) {
  text out = {0};
  put_all(table, &out, put_text);
  text_add(&out, "\n");
  ef_status status = listing_add_text(l, &out, error);
  if (status == EF_OK)
    status = text_write(&out, output, error);
  text_free(&out);
  return status;
}

static ef_status table_as_csv(const ef_table *table, const listing *l,
                              ef_output *output, ef_error *error) {
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  ef_error late;
  put_all(table, csv, put_comment);
  const ef_status status = listing_write_csv(l, csv, error);
  const ef_status finished =
      ef_csv_finish(csv, status == EF_OK ? error : &late);
  return status != EF_OK ? status : finished;
}

static void write_column(ef_json *json, const ef_table *table, size_t c) {
  ef_json_begin_array(json, c == 0 ? "wavelength_nm" : table->column[c]);
  for (size_t r = 0; r < table->n_rows; ++r) {
    ef_json_number(json, NULL, table->value[c * table->n_rows + r]);
  }
  ef_json_end_array(json);
}

static ef_status table_as_json(const ef_table *table, ef_output *output,
                               ef_error *error) {
  ef_json *json = ef_json_new(output, error);
  if (json == NULL)
    return error->status;
  ef_json_begin_object(json, NULL);
  ef_json_text(json, "name", table->name);
  ef_json_text(json, "title", table->title);
  ef_json_text(json, "source", table->source);
  ef_json_text(json, "quantity", table->quantity);
  ef_json_text(json, "note", table->note);
  ef_json_text(json, "rights", table->rights);
  write_column(json, table, 0);
  ef_json_begin_object(json, "spectra");
  for (size_t c = 1; c < table->n_columns; ++c)
    write_column(json, table, c);
  ef_json_end_object(json);
  ef_json_end_object(json);
  return ef_json_finish(json, error);
}

ef_status render_table(const ef_table *table, int format, ef_output *output,
                       ef_error *error) {
  if (format == FORMAT_JSON)
    return table_as_json(table, output, error);
  listing l = {0};
  fill_figures(&l, table);
  const ef_status status = format == FORMAT_CSV
                               ? table_as_csv(table, &l, output, error)
                               : table_as_text(table, &l, output, error);
  listing_free(&l);
  return status;
}

/* ---- Demo files -------------------------------------------------------- */

ef_status render_demo(size_t i, int format, ef_output *output,
                      ef_error *error) {
  size_t length;
  const char *file = ef_demo_text(i, &length);
  if (format != FORMAT_JSON) {
    return ef_output_write(output, file, length, error);
  }
  text whole = {0};
  for (size_t k = 0; k < length; k += 500) {
    const size_t n = length - k < 500 ? length - k : 500;
    text_format(&whole, "%.*s", (int)n, file + k);
  }
  ef_json *json = ef_json_new(output, error);
  if (json == NULL) {
    text_free(&whole);
    return error->status;
  }
  ef_json_begin_object(json, NULL);
  ef_json_text(json, "name", ef_demo_name(i));
  ef_json_text(json, "csv", whole.bytes != NULL ? whole.bytes : "");
  ef_json_end_object(json);
  text_free(&whole);
  return ef_json_finish(json, error);
}
