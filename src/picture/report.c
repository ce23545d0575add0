/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Reports as HTML (the living standard of WHATWG), also well-formed XML but for
 * its elements without an end. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"
#include "exchange/exchange_private.h"
#include "picture/chart_private.h"
#include "picture/picture_private.h"
#include "picture/report_private.h"

/* What is open and must be closed before something else begins. */
typedef enum open_part { PART_NONE, PART_TERMS, PART_CHARTS } open_part;

struct ef_report {
  ef__report_writer to;   /* the file */
  ef__report_writer lead; /* what stands before the first section */
  ef__report_writer front; /* sections before the others */
  ef__report_writer body; /* the sections, kept until all are known */
  ef__report_writer *at;  /* one of the three */
  open_part part;
  size_t n_sections, n_charts, n_tables;
  ef__report_writer contents, front_contents; /* links to the sections */
  char *title, *answer;
  char *section; /* title of the one being written */
};

/* ---- Markup ------------------------------------------------------------ */

void ef__report_put(ef__report_writer *w, const char *markup) {
  if (w->status == EF_OK)
    w->status = ef_output_text(w->output, markup, &w->error);
}

static void put_bytes(ef__report_writer *w, const char *bytes, size_t n) {
  if (w->status == EF_OK)
    w->status = ef_output_write(w->output, bytes, n, &w->error);
}

static void put_text(ef__report_writer *w, const char *text) {
  char *clean = ef__allocate(strlen(text) + 1, 1);
  if (clean == NULL) {
    if (w->status == EF_OK)
      w->status = ef__error_memory(&w->error, "a report");
    return;
  }
  ef__text_clean(clean, text);
  for (const char *at = clean; *at != '\0';) {
    const size_t plain = strcspn(at, "&<>\"");
    put_bytes(w, at, plain);
    at += plain;
    if (*at == '\0')
      break;
    ef__report_put(w, *at == '&'   ? "&amp;"
                      : *at == '<' ? "&lt;"
                      : *at == '>' ? "&gt;"
                                   : "&quot;");
    ++at;
  }
  free(clean);
}

static void put_count(ef__report_writer *w, size_t n) {
  char text[24];
  snprintf(text, sizeof text, "%zu", n);
  ef__report_put(w, text);
}

/* Closes what is open unless it is `wanted`, and opens that. */
static void open_for(ef_report *r, open_part wanted) {
  static const char *const begin[] = {"", "<dl>\n", "<div class=\"charts\">\n"};
  static const char *const end[] = {"", "</dd>\n</dl>\n", "</div>\n"};
  if (r->part == wanted)
    return;
  ef__report_put(r->at, end[r->part]);
  ef__report_put(r->at, begin[wanted]);
  r->part = wanted;
}

/* ---- Beginning --------------------------------------------------------- */

/* A writer that keeps what it is given. */
static ef__report_writer keeper(void) {
  ef__report_writer w = {.status = EF_OK};
  w.output = ef_output_memory(&w.error);
  if (w.output == NULL)
    w.status = w.error.status;
  return w;
}

ef_report *ef_report_open(const char *path, const char *title, bool overwrite,
                          ef_error *error) {
  ef_report *r = ef__allocate_zeroed(1, sizeof *r);
  if (r == NULL) {
    ef__error_memory(error, "a report");
    return NULL;
  }
  r->title = ef__copy_text(title, strlen(title));
  r->lead = keeper();
  r->front = keeper();
  r->body = keeper();
  r->at = &r->lead;
  r->contents = keeper();
  r->front_contents = keeper();
  if (r->title == NULL || r->lead.status != EF_OK || r->body.status != EF_OK ||
      r->front.status != EF_OK || r->contents.status != EF_OK ||
      r->front_contents.status != EF_OK) {
    ef__error_memory(error, "a report");
    ef_report_discard(r);
    return NULL;
  }
  r->to.output = ef_output_open(path, overwrite, error);
  if (r->to.output != NULL)
    return r;
  ef_report_discard(r);
  return NULL;
}

void ef_report_answer(ef_report *r, const char *text) {
  free(r->answer);
  r->answer = ef__copy_text(text, strlen(text));
  if (r->answer == NULL && r->at->status == EF_OK)
    r->at->status = ef__error_memory(&r->at->error, "a report");
}

void ef_report_discard(ef_report *r) {
  if (r == NULL)
    return;
  ef_output_discard(r->to.output);
  ef_output_discard(r->lead.output);
  ef_output_discard(r->body.output);
  ef_output_discard(r->front.output);
  ef_output_discard(r->contents.output);
  ef_output_discard(r->front_contents.output);
  free(r->title);
  free(r->answer);
  free(r->section);
  free(r);
}

/* ---- Words ------------------------------------------------------------- */

static void end_section(ef_report *r) {
  open_for(r, PART_NONE);
  if (r->at != &r->lead)
    ef__report_put(r->at, "</section>\n");
}

static void begin_section(ef_report *r, const char *title,
                          ef__report_writer *at, ef__report_writer *contents) {
  end_section(r);
  r->at = at;
  ++r->n_sections;
  free(r->section);
  r->section = ef__copy_text(title, strlen(title));
  ef__report_put(at, "<section aria-labelledby=\"s");
  put_count(at, r->n_sections);
  ef__report_put(at, "\">\n<h2 id=\"s");
  put_count(at, r->n_sections);
  ef__report_put(at, "\">");
  put_text(at, title);
  ef__report_put(at, "</h2>\n");
  ef__report_put(contents, "<li><a href=\"#s");
  put_count(contents, r->n_sections);
  ef__report_put(contents, "\">");
  put_text(contents, title);
  ef__report_put(contents, "</a></li>\n");
}

void ef_report_section(ef_report *r, const char *title) {
  begin_section(r, title, &r->body, &r->contents);
}

void ef_report_front(ef_report *r, const char *title) {
  begin_section(r, title, &r->front, &r->front_contents);
}

void ef_report_paragraph(ef_report *r, const char *text) {
  open_for(r, PART_NONE);
  ef__report_put(r->at, "<p>");
  put_text(r->at, text);
  ef__report_put(r->at, "</p>\n");
}

void ef_report_caution(ef_report *r, const char *text) {
  open_for(r, PART_NONE);
  ef__report_put(r->at, "<p class=\"caution\">");
  put_text(r->at, text);
  ef__report_put(r->at, "</p>\n");
}

static void put_term(ef_report *r, const char *term, const char *text,
                     bool is_code) {
  const bool goes_on = r->part == PART_TERMS && term[0] == '\0';
  const bool is_first = r->part != PART_TERMS;
  open_for(r, PART_TERMS);
  if (goes_on) {
    ef__report_put(r->at, "<br>\n");
  } else {
    ef__report_put(r->at, is_first ? "<dt>" : "</dd>\n<dt>");
    put_text(r->at, term);
    ef__report_put(r->at, "</dt>\n<dd>");
  }
  ef__report_put(r->at, is_code ? "<code>" : "");
  put_text(r->at, text);
  ef__report_put(r->at, is_code ? "</code>" : "");
}

void ef_report_term(ef_report *r, const char *term, const char *text) {
  put_term(r, term, text, false);
}

void ef_report_term_code(ef_report *r, const char *term, const char *text) {
  put_term(r, term, text, true);
}

/* ---- Tables ------------------------------------------------------------ */

/* Columns from `c` on that the first head of `c` stands over. */
static size_t span_of(size_t n, const ef_report_column *column, size_t c) {
  size_t end = c + 1;
  while (end < n && column[end].head == NULL)
    ++end;
  return end - c;
}

/* Columns under one head stand apart from what is before and after them. */
static void put_class(ef_report *r, size_t n, const ef_report_column *column,
                      size_t c) {
  const bool is_apart =
      c > 0 && column[c].head != NULL &&
      (span_of(n, column, c) > 1 || column[c - 1].head == NULL);
  if (column[c].is_text || is_apart)
    ef__report_put(r->at, !is_apart           ? " class=\"t\""
                          : column[c].is_text ? " class=\"t g\""
                                              : " class=\"g\"");
}

static void put_heads(ef_report *r, size_t n, const ef_report_column *column) {
  bool has_units = false;
  for (size_t c = 0; c < n; ++c)
    has_units = has_units || column[c].unit[0] != '\0';
  ef__report_put(r->at, "<thead>\n<tr>");
  for (size_t c = 0; c < n;) {
    const size_t span = span_of(n, column, c);
    /* What has no second line reaches down to the rows. */
    const bool is_deep = has_units && span == 1 && column[c].unit[0] == '\0';
    ef__report_put(r->at, "<th");
    put_class(r, n, column, c);
    if (span > 1) {
      ef__report_put(r->at, " colspan=\"");
      put_count(r->at, span);
      ef__report_put(r->at, "\" scope=\"colgroup\">");
    } else {
      ef__report_put(r->at, is_deep ? " rowspan=\"2\" scope=\"col\">"
                                    : " scope=\"col\">");
    }
    put_text(r->at, column[c].head != NULL ? column[c].head : "");
    ef__report_put(r->at, "</th>");
    c += span;
  }
  ef__report_put(r->at, "</tr>\n");
  if (has_units) {
    ef__report_put(r->at, "<tr>");
    for (size_t c = 0; c < n; ++c) {
      if (span_of(n, column, c) == 1 && column[c].head != NULL &&
          column[c].unit[0] == '\0')
        continue;
      ef__report_put(r->at, "<th scope=\"col\"");
      put_class(r, n, column, c);
      ef__report_put(r->at, ">");
      put_text(r->at, column[c].unit);
      ef__report_put(r->at, "</th>");
    }
    ef__report_put(r->at, "</tr>\n");
  }
  ef__report_put(r->at, "</thead>\n");
}

static void put_row(ef_report *r, size_t n, const ef_report_column *column,
                    const char *const *cell) {
  ef__report_put(r->at, "<tr>");
  for (size_t c = 0; c < n; ++c) {
    const bool is_name = c == 0 && column[c].is_text;
    ef__report_put(r->at, is_name ? "<th scope=\"row\"" : "<td");
    put_class(r, n, column, c);
    ef__report_put(r->at, ">");
    put_text(r->at, cell[c]);
    ef__report_put(r->at, is_name ? "</th>" : "</td>");
  }
  ef__report_put(r->at, "</tr>\n");
}

void ef_report_table(ef_report *r, const char *caption, size_t n_columns,
                     const ef_report_column *column, size_t n_rows,
                     const char *const *cell) {
  open_for(r, PART_NONE);
  ++r->n_tables;
  /* What scrolls can be reached and scrolled by keys. */
  ef__report_put(r->at, "<div class=\"wide\" role=\"region\" tabindex=\"0\" "
                        "aria-labelledby=\"t");
  put_count(r->at, r->n_tables);
  ef__report_put(r->at, "\">\n<table>\n<caption id=\"t");
  put_count(r->at, r->n_tables);
  /* What the heading says already is for those who hear the page. */
  const bool is_said = r->section != NULL && strcmp(r->section, caption) == 0;
  ef__report_put(r->at, is_said ? "\"><span class=\"heard\">" : "\"><span>");
  put_text(r->at, caption);
  ef__report_put(r->at, "</span></caption>\n");
  put_heads(r, n_columns, column);
  ef__report_put(r->at, "<tbody>\n");
  for (size_t i = 0; i < n_rows; ++i)
    put_row(r, n_columns, column, cell + i * n_columns);
  ef__report_put(r->at, "</tbody>\n</table>\n</div>\n");
}

/* ---- Pictures ---------------------------------------------------------- */

void ef_report_chart(ef_report *r, const ef_chart *chart) {
  open_for(r, PART_CHARTS);
  ++r->n_charts;
  char id[24];
  snprintf(id, sizeof id, "c%zu", r->n_charts);
  ef__report_put(r->at, "<figure>\n");
  ef__page page;
  ef_chart_report report;
  ef_error error = {0};
  ef_status status = ef__chart_draw(chart, &page, &report, &error);
  if (r->at->status == EF_OK && status == EF_OK)
    status = ef__page_svg(&page, id, r->at->output, &error);
  if (r->at->status == EF_OK && status != EF_OK) {
    r->at->status = status;
    r->at->error = error;
  }
  ef__page_free(&page);
  const char *about = chart->settings.description;
  if (about != NULL) {
    ef__report_put(r->at, "<figcaption>");
    put_text(r->at, about);
    ef__report_put(r->at, "</figcaption>\n");
  }
  ef__report_put(r->at, "</figure>\n");
}

/* RFC 4648, section 4. */
static void put_base64(ef__report_writer *w, const unsigned char *byte,
                       size_t n) {
  static const char digit[] = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuv"
                              "wxyz0123456789+/";
  for (size_t i = 0; i < n; i += 3) {
    const size_t left = n - i < 3 ? n - i : 3;
    const uint32_t bits = (uint32_t)byte[i] << 16 |
                          (left > 1 ? (uint32_t)byte[i + 1] << 8 : 0u) |
                          (left > 2 ? (uint32_t)byte[i + 2] : 0u);
    const char four[4] = {digit[bits >> 18 & 63u], digit[bits >> 12 & 63u],
                          left > 1 ? digit[bits >> 6 & 63u] : '=',
                          left > 2 ? digit[bits & 63u] : '='};
    put_bytes(w, four, sizeof four);
  }
}

static void put_swatch(ef_report *r, const ef_swatch *s,
                       const ef_swatch_settings *settings,
                       const ef_report_halves *halves, size_t *n_clipped) {
  ef__report_writer picture = keeper();
  ef_swatch_report report = {0};
  if (picture.status == EF_OK) {
    picture.status = ef__swatch_write_to(picture.output, s, settings, &report,
                                         &picture.error);
  }
  size_t length = 0;
  const char *bytes = NULL;
  if (picture.status == EF_OK)
    bytes = ef_output_bytes(picture.output, &length);
  if (picture.status != EF_OK && r->at->status == EF_OK) {
    r->at->status = picture.status;
    r->at->error = picture.error;
  }
  *n_clipped += report.n_clipped;
  char difference[EF_NUMBER_TEXT];
  ef_number_format_fixed(s->difference, 2, difference);
  ef__report_put(r->at, "<li><figure><img alt=\"");
  put_text(r->at, s->name);
  ef__report_put(r->at, ": ");
  put_text(r->at, halves->left);
  ef__report_put(r->at, " left, ");
  put_text(r->at, halves->right);
  ef__report_put(r->at, s->shown ? " right" : " right; ");
  put_text(r->at, s->shown ? "" : halves->mark);
  ef__report_put(r->at, "\" width=\"");
  put_count(r->at, settings->width);
  ef__report_put(r->at, "\" height=\"");
  put_count(r->at, settings->width / 2);
  ef__report_put(r->at, "\" src=\"data:image/png;base64,");
  if (bytes != NULL)
    put_base64(r->at, (const unsigned char *)bytes, length);
  ef__report_put(r->at, "\"><figcaption>");
  put_text(r->at, s->name);
  if (!isnan(s->difference)) {
    ef__report_put(r->at, "<br>");
    ef__report_put(r->at, difference);
    ef__report_put(r->at, " ");
    put_text(r->at, settings->difference_symbol);
  }
  ef__report_put(r->at, "</figcaption></figure></li>\n");
  ef_output_discard(picture.output);
}

void ef_report_swatches(ef_report *r, size_t n, const ef_swatch *swatch,
                        const ef_swatch_settings *settings,
                        const ef_report_halves *halves, size_t *n_clipped) {
  size_t clipped = 0;
  open_for(r, PART_NONE);
  ef__report_put(r->at, "<ul class=\"swatches\">\n");
  for (size_t i = 0; i < n; ++i)
    put_swatch(r, &swatch[i], settings, halves, &clipped);
  ef__report_put(r->at, "</ul>\n");
  if (n_clipped != NULL)
    *n_clipped = clipped;
}

/* ---- The end ----------------------------------------------------------- */

/* What was kept goes on to the file. */
static void pass_on(ef__report_writer *to, ef__report_writer *from) {
  size_t length = 0;
  const char *bytes = NULL;
  if (from->status == EF_OK)
    bytes = ef_output_bytes(from->output, &length);
  if (to->status == EF_OK && from->status != EF_OK) {
    to->status = from->status;
    to->error = from->error;
  }
  if (bytes != NULL)
    put_bytes(to, bytes, length);
}

static void put_document(ef_report *r) {
  ef__report_writer *w = &r->to;
  ef__report_put(
      w, "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n"
         "<meta charset=\"utf-8\">\n"
         "<meta name=\"viewport\" content=\"width=device-width, "
         "initial-scale=1\">\n"
         "<meta http-equiv=\"Content-Security-Policy\" content=\"default-src "
         "'none'; style-src 'unsafe-inline'; img-src data:\">\n"
         "<meta name=\"generator\" content=\"Evenfield ");
  put_text(w, ef_version());
  ef__report_put(w, "\">\n<link rel=\"icon\" href=\"data:,\">\n<title>");
  put_text(w, r->title);
  ef__report_put(w, "</title>\n<style>\n");
  ef__report_style(w);
  ef__report_put(w, "</style>\n</head>\n<body>\n<header>\n<p class=\"asked\">");
  put_text(w, r->title);
  ef__report_put(w, "</p>\n<h1>");
  put_text(w, r->answer != NULL ? r->answer : r->title);
  ef__report_put(w, "</h1>\n");
  pass_on(w, &r->lead);
  ef__report_put(w, "</header>\n");
  if (r->n_sections > 1) {
    ef__report_put(w, "<nav aria-label=\"Contents\">\n<ul>\n");
    pass_on(w, &r->front_contents);
    pass_on(w, &r->contents);
    ef__report_put(w, "</ul>\n</nav>\n");
  }
  ef__report_put(w, "<main>\n");
  pass_on(w, &r->front);
    pass_on(w, &r->body);
  ef__report_put(w, "</main>\n<footer>\n<p>Made by Evenfield ");
  put_text(w, ef_version());
  ef__report_put(w, ". This page needs no network and runs no script.</p>\n"
                    "</footer>\n</body>\n</html>\n");
}

ef_status ef_report_close(ef_report *r, ef_error *error) {
  end_section(r);
  put_document(r);
  ef_status status = r->to.status;
  if (status == EF_OK) {
    status = ef_output_commit(r->to.output, error);
    r->to.output = NULL;
  } else if (error != NULL) {
    *error = r->to.error;
  }
  ef_report_discard(r);
  return status;
}
