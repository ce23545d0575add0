/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "record.h"

#include <stdio.h>
#include <string.h>

record record_of_json(ef_json *json) {
  return (record){.json = json};
}

record record_of_csv(ef_csv *csv, bool is_header) {
  return (record){.csv = csv, .is_header = is_header};
}

/* ---- Objects ----------------------------------------------------------- */

void record_begin(record *r, const char *key) {
  if (r->json != NULL)
    ef_json_begin_object(r->json, key);
  const size_t length = r->is_header ? strlen(r->prefix) : 0;
  if (r->depth < sizeof r->length / sizeof r->length[0]) {
    r->length[r->depth] = length;
  }
  ++r->depth;
  if (key != NULL && r->is_header) {
    snprintf(r->prefix + length, sizeof r->prefix - length, "%s_", key);
  }
}

void record_end(record *r) {
  if (r->json != NULL)
    ef_json_end_object(r->json);
  --r->depth;
  if (r->depth < sizeof r->length / sizeof r->length[0]) {
    r->prefix[r->length[r->depth]] = '\0';
  }
  if (r->depth == 0 && r->csv != NULL)
    ef_csv_end_row(r->csv);
}

/* ---- Values ------------------------------------------------------------ */

/* True when `r` is a header, which has now the column's name. */
static bool wrote_name(record *r, const char *key) {
  if (!r->is_header)
    return false;
  char column[300];
  snprintf(column, sizeof column, "%s%s", r->prefix, key);
  ef_csv_text(r->csv, column);
  return true;
}

void record_number(record *r, const char *key, double value) {
  if (r->json != NULL) {
    ef_json_number(r->json, key, value);
  } else if (!wrote_name(r, key)) {
    ef_csv_number(r->csv, value);
  }
}

void record_text(record *r, const char *key, const char *text) {
  if (r->json != NULL) {
    ef_json_text(r->json, key, text);
  } else if (!wrote_name(r, key)) {
    ef_csv_text(r->csv, text);
  }
}

void record_boolean(record *r, const char *key, bool value) {
  if (r->json != NULL) {
    ef_json_boolean(r->json, key, value);
  } else if (!wrote_name(r, key)) {
    ef_csv_text(r->csv, value ? "true" : "false");
  }
}

void record_numbers(record *r, const char *key, size_t n,
                    const char *const *names, const double *values) {
  if (r->json != NULL) {
    ef_json_begin_array(r->json, key);
    for (size_t i = 0; i < n; ++i)
      ef_json_number(r->json, NULL, values[i]);
    ef_json_end_array(r->json);
    return;
  }
  for (size_t i = 0; i < n; ++i) {
    char column[100] = "";
    if (r->is_header)
      snprintf(column, sizeof column, "%s_%s", key, names[i]);
    record_number(r, column, values[i]);
  }
}

void record_texts(record *r, const char *key, size_t n,
                  const char *const *texts) {
  if (r->json != NULL) {
    ef_json_begin_array(r->json, key);
    for (size_t i = 0; i < n; ++i)
      ef_json_text(r->json, NULL, texts[i]);
    ef_json_end_array(r->json);
    return;
  }
  char joined[2048] = "";
  size_t length = 0;
  for (size_t i = 0; i < n && length < sizeof joined; ++i) {
    length += (size_t)snprintf(joined + length, sizeof joined - length, "%s%s",
                               i == 0 ? "" : "; ", texts[i]);
  }
  record_text(r, key, joined);
}

void record_xyz(record *r, ef_xyz xyz) {
  record_number(r, "X", xyz.X);
  record_number(r, "Y", xyz.Y);
  record_number(r, "Z", xyz.Z);
}

void record_lab(record *r, ef_lab lab) {
  const ef_lch lch = ef_lab_to_lch(lab);
  record_number(r, "L_star", lab.L_star);
  record_number(r, "a_star", lab.a_star);
  record_number(r, "b_star", lab.b_star);
  record_number(r, "C_star", lch.C_star);
  record_number(r, "h_deg", lch.h_deg);
}
