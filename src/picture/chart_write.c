/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <string.h>

#include "base/base_private.h"
#include "picture/chart_private.h"

typedef enum file_kind { FILE_NONE, FILE_SVG, FILE_PDF, FILE_PNG } file_kind;

static file_kind kind_of(const char *path) {
  static const char *const ending[] = {"", ".svg", ".pdf", ".png"};
  const size_t length = strlen(path);
  for (int i = FILE_SVG; i <= FILE_PNG; ++i) {
    if (length > 4 && ef__name_equal(path + length - 4, ending[i]))
      return (file_kind)i;
  }
  return FILE_NONE;
}

bool ef_chart_knows(const char *path) {
  return kind_of(path) != FILE_NONE;
}

static ef_status write_stream(const ef_chart *chart, const ef__page *page,
                              file_kind kind, const char *path, bool *has_text,
                              ef_error *error) {
  ef_output *output = ef_output_open(path, chart->settings.overwrite, error);
  if (output == NULL)
    return error != NULL ? error->status : EF_UNWRITABLE;
  const ef_status status = kind == FILE_SVG
                               ? ef__page_svg(page, NULL, output, error)
                               : ef__page_pdf(page, output, has_text, error);
  if (status == EF_OK)
    return ef_output_commit(output, error);
  ef_output_discard(output);
  return status;
}

ef_status ef_chart_write(const ef_chart *chart, const char *path,
                         ef_chart_report *report, ef_error *error) {
  const file_kind kind = kind_of(path);
  if (kind == FILE_NONE) {
    ef__error_set(error, EF_INVALID,
                  "is no kind of chart; expected a name that ends in .svg, "
                  ".pdf or .png");
    return ef__error_place(error, path, 0, 0, NULL);
  }
  ef_chart_report own = {0};
  ef__page page;
  ef_status status = ef__chart_draw(chart, &page, &own, error);
  own.has_text = true;
  if (status == EF_OK && kind == FILE_PNG) {
    status = ef__page_png(&page, path, chart->settings.overwrite, &own.has_text,
                          error);
  } else if (status == EF_OK) {
    status = write_stream(chart, &page, kind, path, &own.has_text, error);
  }
  ef__page_free(&page);
  if (report != NULL)
    *report = own;
  return status;
}
