/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "command.h"

#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "render_tables.h"
#include "result.h"

static ef_status unknown_demo(const char *name, ef_error *error) {
  const size_t n = ef_demo_count();
  const char **known = malloc((n + 1) * sizeof *known);
  if (known == NULL) {
    return message_fail(error, EF_NO_MEMORY, "out of memory for names");
  }
  for (size_t i = 0; i < n; ++i)
    known[i] = ef_demo_name(i);
  size_t nearest;
  const size_t n_near = ef_nearest_names(name, known, n, 1, &nearest);
  message_fail(error, EF_UNKNOWN_NAME,
               "the demo has no file \"%.100s\"%s%s "
               "(`evenfield tables demo` lists them)",
               name, n_near > 0 ? "; nearest: " : "",
               n_near > 0 ? known[nearest] : "");
  free(known);
  return EF_UNKNOWN_NAME;
}

static ef_status demo_by_name(const char *name, int format, ef_output *output,
                              ef_error *error) {
  for (size_t i = 0; i < ef_demo_count(); ++i) {
    if (strcmp(ef_demo_name(i), name) == 0) {
      return render_demo(i, format, output, error);
    }
  }
  return unknown_demo(name, error);
}

/* Neither a list nor a table: the nearest of both. */
static ef_status unknown_name(const char *name, ef_error *error) {
  const catalogue *lists;
  const size_t n_lists = catalogue_all(&lists);
  const size_t n = n_lists + ef_table_count();
  const char **known = malloc(n * sizeof *known);
  if (known == NULL) {
    return message_fail(error, EF_NO_MEMORY, "out of memory for names");
  }
  for (size_t i = 0; i < n; ++i) {
    known[i] = i < n_lists ? lists[i].name : ef_table_at(i - n_lists)->name;
  }
  size_t near[2];
  const size_t n_near = ef_nearest_names(name, known, n, 2, near);
  message_fail(error, EF_UNKNOWN_NAME,
               "no table and no list is called "
               "\"%.100s\"%s%s%s%s (`evenfield tables` lists them)",
               name, n_near > 0 ? "; nearest: " : "",
               n_near > 0 ? known[near[0]] : "", n_near > 1 ? ", " : "",
               n_near > 1 ? known[near[1]] : "");
  free(known);
  return EF_UNKNOWN_NAME;
}

static ef_status run(const char *name, int format, ef_output *output,
                     ef_error *error) {
  if (strncmp(name, "demo:", 5) == 0) {
    return demo_by_name(name + 5, format, output, error);
  }
  const catalogue *list = catalogue_find(name);
  if (list != NULL)
    return render_catalogue(list, format, output, error);
  ef_error ignored;
  const ef_table *table = ef_table_find(name, &ignored);
  if (table == NULL)
    return unknown_name(name, error);
  return render_table(table, format, output, error);
}

exit_code command_tables(const command_options *options) {
  const exit_code code = result_check_usage(options, 1);
  if (code != EXIT_DONE)
    return code;
  ef_error error = {0};
  ef_output *output = result_open(options, &error);
  const char *name = options->n_files > 0 ? options->files[0] : "tables";
  const ef_status status = output == NULL
                               ? error.status
                               : run(name, options->format, output, &error);
  return result_close(output, status, &error);
}
