/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Names to built-in tables. The tables are constants of the library: nothing
 * is read, allocated or built when it starts. */
#include "base/base_private.h"
#include "spectrum/embedded_tables.h"

#include <assert.h>

size_t ef_table_count(void) {
  return ef__table_count;
}

const ef_table *ef_table_at(size_t i) {
  assert(i < ef__table_count);
  return i < ef__table_count ? &ef__tables[i] : NULL;
}

const ef_table *ef_table_find(const char *name, ef_error *error) {
  for (size_t i = 0; i < ef__table_count; ++i) {
    if (ef__name_equal(name, ef__tables[i].name))
      return &ef__tables[i];
  }
  ef__error_unknown(error, "built-in table", name, ef__table_names,
                    ef__table_count);
  return NULL;
}

size_t ef_table_column(const ef_table *table, const char *column) {
  for (size_t c = 0; c < table->n_columns; ++c) {
    if (ef__name_equal(column, table->column[c]))
      return c;
  }
  return SIZE_MAX;
}

ef_grid ef_table_grid(const ef_table *table) {
  const ef_grid rows = {.count = table->n_rows, .wavelength_nm = table->value};
  return ef_grid_simplify(&rows);
}
