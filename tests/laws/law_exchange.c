/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What is written reads back to the same: numbers to the bit, names to the
 * byte. And the fast reader of numbers is ef_number_parse. */
#include <stdlib.h>
#include <unistd.h>

#include <jansson.h>

#include <evenfield/exchange.h>

#include "exchange/exchange_private.h"
#include "gen.h"
#include "near.h"
#include "scratch.h"

/* ---- Numbers ----------------------------------------------------------- */

/* Scans `text` with a separator behind it and compares with ef_number_parse. */
static void check_scan(const char *text) {
  char buffer[96];
  double scanned = 37.23;
  double parsed = 37.23;
  const size_t length = strlen(text);
  assert_true(length + 2 < sizeof buffer);
  memcpy(buffer, text, length);
  strcpy(buffer + length, ",");
  const char *const end =
      ef__decimal_scan(buffer, buffer + length, '.', &scanned);
  const bool is_number = ef_number_parse(text, length, '.', &parsed);
  const bool is_scanned = end == buffer + length;
  if (is_number != is_scanned) {
    fail_msg("'%s' is %sa number", text, is_number ? "" : "no ");
  }
  if (is_number && memcmp(&scanned, &parsed, sizeof parsed) != 0) {
    fail_msg("'%s' is %a, read as %a", text, parsed, scanned);
  }
}

static size_t put_digits(gen *g, size_t n, char *text) {
  for (size_t i = 0; i < n; ++i)
    text[i] = (char)('0' + gen_below(g, 10));
  text[n] = '\0';
  return n;
}

/* Up to 24 digits with a point somewhere and, sometimes, an exponent. */
static void random_decimal(gen *g, char text[96]) {
  size_t n = 0;
  if (gen_below(g, 4) == 0)
    text[n++] = gen_below(g, 2) == 0 ? '-' : '+';
  n += put_digits(g, gen_below(g, 5), text + n);
  if (gen_below(g, 4) != 0)
    text[n++] = '.';
  if (gen_below(g, 3) == 0) {
    for (size_t zeros = gen_below(g, 30); zeros > 0; --zeros)
      text[n++] = '0';
  }
  n += put_digits(g, gen_below(g, 21), text + n);
  if (gen_below(g, 3) == 0) {
    n += (size_t)snprintf(text + n, 16, "e%d", (int)gen_below(g, 80) - 50);
  }
  text[n] = '\0';
}

static void scanning_is_parsing(void **state) {
  (void)state;
  gen g = gen_new(71);
  char text[96];
  for (int i = 0; i < 400000; ++i) {
    random_decimal(&g, text);
    check_scan(text);
  }
}

/* Decimals beside and on the middle between two doubles, where the last digit
 * decides the rounding: m x 2^-k for odd m has its last binary digit just below
 * what 53 bits hold and is a short decimal for small k. */
static void scanning_rounds_ties(void **state) {
  (void)state;
  gen g = gen_new(72);
  for (int i = 0; i < 200000; ++i) {
    char text[96];
    const uint64_t odd = (gen_bits(&g) >> 10) | (UINT64_C(1) << 53) | 1;
    const int k = (int)gen_below(&g, 4);
    const uint64_t whole = odd >> k;
    const uint64_t rest = odd - (whole << k);
    /* rest / 2^k as decimal: k digits, exactly. */
    uint64_t fraction = rest;
    for (int j = 0; j < k; ++j)
      fraction *= 5;
    int n = snprintf(text, sizeof text, "%llu", (unsigned long long)whole);
    if (k > 0) {
      n += snprintf(text + n, sizeof text - (size_t)n, ".%0*llu", k,
                    (unsigned long long)fraction);
    }
    check_scan(text);
    text[n - 1] = (char)(text[n - 1] == '9' ? '8' : text[n - 1] + 1);
    check_scan(text);
    strcpy(text + n, "e-20");
    check_scan(text);
  }
}

static void scanning_shortest_texts(void **state) {
  (void)state;
  gen g = gen_new(73);
  for (int i = 0; i < 200000; ++i) {
    char text[EF_NUMBER_TEXT];
    ef_number_format(i % 2 == 0 ? gen_any_double(&g) : gen_unit(&g), text);
    check_scan(text);
  }
}

static void scanning_odd_texts(void **state) {
  (void)state;
  static const char *const texts[] = {
      "",
      "-",
      ".",
      "+.",
      "1.",
      ".5",
      "-.5e1",
      "1e",
      "1e+",
      "1e+5",
      "e5",
      "0",
      "-0",
      "0e99999999999",
      "00000000000000000000000012.5",
      "1e999",
      "-1e999",
      "1e-999",
      "0x10",
      "1 ",
      " 1",
      "1.2.3",
      "--1",
      "1-",
      "nan",
      "inf",
      "9007199254740993",
      "18446744073709551615",
      "18446744073709551616",
      "4.9e-324",
      "2.4703282292062327e-324",
      "1.7976931348623159e308",
      "0.00000000000000000000000000000000000000000000000000000000123"};
  for (size_t i = 0; i < sizeof texts / sizeof *texts; ++i) {
    check_scan(texts[i]);
  }
}

/* ---- CSV --------------------------------------------------------------- */

/* Any bytes but zero, with more of those that mean something in CSV. */
static void random_name(gen *g, char name[32]) {
  static const char special[] = ",;\t\"\n\r# '";
  const size_t n = 1 + gen_below(g, 12);
  for (size_t i = 0; i < n; ++i) {
    name[i] = gen_below(g, 2) == 0 ? special[gen_below(g, sizeof special - 1)]
                                   : (char)(1 + gen_below(g, 255));
  }
  name[n] = '\0';
}

static void csv_reads_back(void **state) {
  (void)state;
  enum { N_ROWS = 5000 };
  static double value[N_ROWS][3];
  static char name[N_ROWS][32];
  char path[SCRATCH_PATH];
  gen g = gen_new(74);
  scratch_path("t.csv", path);
  ef_output *const output = ef_output_open(path, true, NULL);
  ef_csv *const csv = ef_csv_new(output, NULL);
  ef_csv_comment(csv, "title: random");
  ef_csv_text(csv, "name");
  ef_csv_text(csv, "X");
  ef_csv_text(csv, "Y");
  ef_csv_text(csv, "Z");
  ef_csv_end_row(csv);
  for (int i = 0; i < N_ROWS; ++i) {
    random_name(&g, name[i]);
    ef_csv_text(csv, name[i]);
    for (int k = 0; k < 3; ++k) {
      value[i][k] = gen_any_double(&g);
      if (k == 1)
        value[i][k] = fabs(value[i][k]);
      ef_csv_number(csv, value[i][k]);
    }
    ef_csv_end_row(csv);
  }
  assert_int_equal(ef_csv_finish(csv, NULL), EF_OK);
  assert_int_equal(ef_output_commit(output, NULL), EF_OK);
  ef_error error = {0};
  ef_reader *const reader = ef_reader_open(path, NULL, &error);
  if (reader == NULL)
    fail_msg("%zu: %s", error.line, error.message);
  assert_string_equal(ef_reader_get_head(reader)->title, "random");
  size_t n = 0;
  for (;;) {
    ef_block block;
    assert_int_equal(ef_reader_next(reader, 333, &block, &error), EF_OK);
    if (block.n == 0)
      break;
    assert_true(n + block.n <= N_ROWS);
    assert_same_bits(block.value, value[n], 3 * block.n);
    for (size_t i = 0; i < block.n; ++i) {
      assert_string_equal(block.name[i], name[n + i]);
    }
    n += block.n;
  }
  assert_int_equal(n, N_ROWS);
  ef_reader_free(reader);
  assert_int_equal(unlink(path), 0);
}

/* A name as the form can hold it: no quote and no control character. */
static void random_plain_name(gen *g, char name[32]) {
  random_name(g, name);
  for (char *at = name; *at != '\0'; ++at) {
    if (*at == '"' || (unsigned char)*at < 0x20 || *at == 0x7f)
      *at = '#';
  }
}

static void write_cgats(gen *g, size_t n_rows, size_t n_samples, double *ink,
                        double *value, char (*name)[32], const char *path) {
  static const char *const inks[] = {"CMYK_C", "CMYK_M", "CMYK_Y", "CMYK_K"};
  ef_output *const output = ef_output_open(path, true, NULL);
  ef_cgats *const cgats = ef_cgats_new(output, NULL);
  ef_cgats_keyword(cgats, "FILE_DESCRIPTOR", "random");
  ef_cgats_keyword(cgats, "WEIGHTING_FUNCTION", "ILLUMINANT, D50");
  ef_cgats_keyword(cgats, "OBSERVER", "2 degree");
  ef_cgats_field(cgats, "SAMPLE_NAME");
  for (int i = 0; i < 4; ++i)
    ef_cgats_field(cgats, inks[i]);
  for (size_t k = 0; k < n_samples; ++k) {
    char field[32];
    snprintf(field, sizeof field, "SPECTRAL_NM%zu", 400 + 10 * k);
    ef_cgats_field(cgats, field);
  }
  for (size_t i = 0; i < n_rows; ++i) {
    random_plain_name(g, name[i]);
    ef_cgats_text(cgats, name[i]);
    for (size_t k = 0; k < 4; ++k) {
      ink[4 * i + k] = 100 * (double)gen_below(g, 257) / 256;
      ef_cgats_number(cgats, ink[4 * i + k]);
    }
    gen_smooth(g, n_samples, value + i * n_samples);
    for (size_t k = 0; k < n_samples; ++k)
      ef_cgats_number(cgats, value[i * n_samples + k]);
    ef_cgats_end_row(cgats);
  }
  assert_int_equal(ef_cgats_finish(cgats, NULL), EF_OK);
  assert_int_equal(ef_output_commit(output, NULL), EF_OK);
}

static void cgats_reads_back(void **state) {
  (void)state;
  enum { N_ROWS = 500, N_SAMPLES = 31 };
  static double ink[N_ROWS * 4], value[N_ROWS * N_SAMPLES];
  static char name[N_ROWS][32];
  char path[SCRATCH_PATH];
  gen g = gen_new(75);
  scratch_path("t.txt", path);
  write_cgats(&g, N_ROWS, N_SAMPLES, ink, value, name, path);
  ef_error error = {0};
  ef_reader *const reader = ef_reader_open(path, NULL, &error);
  if (reader == NULL)
    fail_msg("%zu: %s", error.line, error.message);
  const ef_reader_head *const head = ef_reader_get_head(reader);
  assert_string_equal(head->title, "random");
  assert_string_equal(head->illuminant, "D50");
  assert_string_equal(head->observer, "2 degree");
  assert_int_equal(head->n_device, 4);
  assert_int_equal(head->kind, EF_SURFACE);
  assert_int_equal(head->grid.count, N_SAMPLES);
  size_t n = 0;
  for (;;) {
    ef_block block;
    assert_int_equal(ef_reader_next(reader, 77, &block, &error), EF_OK);
    if (block.n == 0)
      break;
    assert_same_bits(block.value, value + n * N_SAMPLES, N_SAMPLES * block.n);
    for (size_t i = 0; i < block.n; ++i, ++n) {
      assert_string_equal(block.name[i], name[n]);
      for (size_t k = 0; k < 4; ++k)
        assert_true(block.device[4 * i + k] == ink[4 * n + k] / 100);
    }
  }
  assert_int_equal(n, N_ROWS);
  ef_reader_free(reader);
  assert_int_equal(unlink(path), 0);
}

static void cgats_refuses_what_it_cannot_hold(void **state) {
  (void)state;
  for (int i = 0; i < 2; ++i) {
    char path[SCRATCH_PATH];
    ef_error error = {0};
    scratch_path("t.txt", path);
    ef_output *const output = ef_output_open(path, true, NULL);
    ef_cgats *const cgats = ef_cgats_new(output, NULL);
    ef_cgats_field(cgats, "LAB_L");
    ef_cgats_number(cgats, i == 0 ? (double)NAN : 1);
    if (i == 1)
      ef_cgats_number(cgats, 2);
    ef_cgats_end_row(cgats);
    assert_int_equal(ef_cgats_finish(cgats, &error), EF_INVALID);
    assert_string_equal(error.message,
                        i == 0 ? "item 1 of row 1 is no finite number, and "
                                 "this form has no empty items"
                               : "row 1 has 2 items for 1 fields");
    ef_output_discard(output);
  }
}

/* The same rows with every separator, mark and line end. */
static void dialects_read_alike(void **state) {
  (void)state;
  static const struct {
    char separator, mark;
    const char *line_end;
  } dialects[] = {{',', '.', "\n"},
                  {';', ',', "\r\n"},
                  {';', '.', "\n"},
                  {'\t', ',', "\n"},
                  {'\t', '.', "\r\n"}};
  for (size_t d = 0; d < sizeof dialects / sizeof *dialects; ++d) {
    gen g = gen_new(75);
    char *const text = malloc(500 * 128);
    double *const value = malloc(500 * 3 * sizeof *value);
    assert_non_null(text);
    assert_non_null(value);
    const char c = dialects[d].separator;
    size_t used =
        (size_t)sprintf(text, "L%ca%cb%s", c, c, dialects[d].line_end);
    for (int i = 0; i < 500; ++i) {
      for (int k = 0; k < 3; ++k) {
        char number[EF_NUMBER_TEXT];
        value[3 * i + k] = gen_between(&g, k == 0 ? 0 : -100, 100);
        ef_number_format(value[3 * i + k], number);
        char *const point = strchr(number, '.');
        if (point != NULL)
          *point = dialects[d].mark;
        used +=
            (size_t)sprintf(text + used, "%s%s", number,
                            k < 2 ? (char[]){c, '\0'} : dialects[d].line_end);
      }
    }
    ef_reader *const reader = ef_reader_from_text("t", text, used, NULL, NULL);
    assert_non_null(reader);
    ef_block block;
    size_t n = 0;
    do {
      assert_int_equal(ef_reader_next(reader, 77, &block, NULL), EF_OK);
      assert_same_bits(block.value, value + 3 * n, 3 * block.n);
      n += block.n;
    } while (block.n > 0);
    assert_int_equal(n, 500);
    ef_reader_free(reader);
    free(value);
    free(text);
  }
}

/* ---- JSON -------------------------------------------------------------- */

/* A character of UTF-8 but U+0000, of one to four bytes. */
static size_t random_character(gen *g, char *to) {
  uint32_t c;
  do {
    c = (uint32_t)(gen_bits(g) & 0x1FFFFF) >> gen_below(g, 21);
  } while (c == 0 || c > 0x10FFFF || (c >= 0xD800 && c <= 0xDFFF));
  if (c < 0x80) {
    to[0] = (char)c;
    return 1;
  }
  const size_t n = c < 0x800 ? 2 : c < 0x10000 ? 3 : 4;
  for (size_t i = n; i-- > 1; c >>= 6)
    to[i] = (char)(0x80 | (c & 0x3F));
  to[0] = (char)((n == 2 ? 0xC0 : n == 3 ? 0xE0 : 0xF0) | c);
  return n;
}

static void json_reads_back(void **state) {
  (void)state;
  enum { N = 20000 };
  static double value[N];
  static char text[N][24];
  char path[SCRATCH_PATH];
  gen g = gen_new(76);
  scratch_path("t.json", path);
  ef_output *const output = ef_output_open(path, true, NULL);
  ef_json *const json = ef_json_new(output, NULL);
  ef_json_begin_array(json, NULL);
  for (int i = 0; i < N; ++i) {
    value[i] = i < 3 ? -0.0 * i : gen_any_double(&g);
    size_t used = 0;
    while (used < 16)
      used += random_character(&g, text[i] + used);
    text[i][used] = '\0';
    ef_json_begin_object(json, NULL);
    ef_json_number(json, "value", value[i]);
    ef_json_text(json, "text", text[i]);
    ef_json_end_object(json);
  }
  ef_json_end_array(json);
  assert_int_equal(ef_json_finish(json, NULL), EF_OK);
  assert_int_equal(ef_output_commit(output, NULL), EF_OK);
  json_error_t error;
  json_t *const parsed = json_load_file(path, JSON_REJECT_DUPLICATES, &error);
  if (parsed == NULL)
    fail_msg("%d: %s", error.line, error.text);
  assert_int_equal(json_array_size(parsed), N);
  for (size_t i = 0; i < N; ++i) {
    const json_t *const at = json_array_get(parsed, i);
    const double back = json_number_value(json_object_get(at, "value"));
    assert_same_bits(&back, &value[i], 1);
    assert_string_equal(json_string_value(json_object_get(at, "text")),
                        text[i]);
  }
  json_decref(parsed);
  assert_int_equal(unlink(path), 0);
}

/* Whatever bytes a name has, the document stays valid. */
static void json_is_always_valid(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  gen g = gen_new(77);
  scratch_path("t.json", path);
  ef_output *const output = ef_output_open(path, true, NULL);
  ef_json *const json = ef_json_new(output, NULL);
  ef_json_begin_object(json, NULL);
  for (int i = 0; i < 20000; ++i) {
    char text[33];
    for (int k = 0; k < 32; ++k) {
      text[k] = (char)(gen_below(&g, 2) == 0 ? 0x80 + gen_below(&g, 128)
                                             : 1 + gen_below(&g, 127));
    }
    text[gen_below(&g, 32)] = '\0';
    text[32] = '\0';
    ef_json_text(json, text, text);
  }
  ef_json_end_object(json);
  assert_int_equal(ef_json_finish(json, NULL), EF_OK);
  assert_int_equal(ef_output_commit(output, NULL), EF_OK);
  json_error_t error;
  json_t *const parsed = json_load_file(path, 0, &error);
  if (parsed == NULL)
    fail_msg("%d: %s", error.line, error.text);
  json_decref(parsed);
  assert_int_equal(unlink(path), 0);
}

/* ---- Ranges ------------------------------------------------------------ */

/* A row of a random table: three numbers, and in front of them a name, often
 * one that needs quotes and holds a separator, a quote or a line end. */
static size_t put_row(gen *g, size_t i, bool has_name, bool is_whole, char sep,
                      char *to) {
  static const char *const names[] = {"s%zu", "\"row, %zu\"", "\"a;\tb %zu\"",
                                      "\"two\nlines %zu\"", "\"say \"\"%zu\"\"\"",
                                      "\"# %zu\""};
  static const char *const marks[] = {".", ","};
  const size_t kind = gen_below(g, 3) == 0 ? gen_below(g, 6) : 0;
  size_t n = has_name ? (size_t)sprintf(to, names[kind], i) : 0;
  for (int k = 0; k < 3; ++k) {
    if (n > 0)
      to[n++] = sep;
    n += (size_t)sprintf(to + n, "%zu", 1 + gen_below(g, 90));
    /* Between semicolons a decimal comma, which a late row may be the first to
     * show. */
    if (!is_whole)
      n += (size_t)sprintf(to + n, "%s%zu", marks[sep == ';'], gen_below(g, 99));
  }
  return n;
}

/* A table with what may stand between rows; the last line may have no end. */
static size_t random_table(gen *g, size_t n_rows, char *text) {
  static const char seps[] = {',', ';', '\t'};
  static const char *const ends[] = {"\n", "\r\n"};
  static const char *const between[] = {"# \"say\" what", "", "  ", ",,,"};
  const char sep = seps[gen_below(g, 3)];
  const char *const end = ends[gen_below(g, 2)];
  const bool has_names = gen_below(g, 3) > 0;
  const size_t first_fraction = gen_below(g, 2) * gen_below(g, n_rows + 1);
  size_t n = 0;
  if (gen_below(g, 2) == 0)
    n += (size_t)sprintf(text, "# title: a \"table\"%s", end);
  if (has_names)
    n += (size_t)sprintf(text + n, "name%c", sep);
  n += (size_t)sprintf(text + n, "L%ca%cb%s", sep, sep, end);
  for (size_t i = 0; i < n_rows; ++i) {
    const size_t kind = gen_below(g, 12);
    if (kind < (sep == ',' ? 4u : 3u))
      n += (size_t)sprintf(text + n, "%s%s", between[kind], end);
    n += put_row(g, i, has_names, i < first_fraction, sep, text + n);
    if (i + 1 < n_rows || gen_below(g, 2) == 0)
      n += (size_t)sprintf(text + n, "%s", end);
  }
  return n;
}

/* All rows of a range, one after the other, as text: line, offset, name and
 * values to the bit. */
static size_t rows_as_text(const char *text, size_t length, size_t first,
                           size_t end, bool ahead, char *out) {
  ef_error error;
  ef_reader_settings settings = ef_reader_settings_default();
  settings.first_byte = first;
  settings.end_byte = end;
  settings.reads_ahead = ahead;
  ef_reader *const reader =
      ef_reader_from_text("table", text, length, &settings, &error);
  if (reader == NULL)
    fail_msg("%s", error.message);
  size_t n = 0;
  for (;;) {
    ef_block block;
    assert_int_equal(ef_reader_next(reader, 37, &block, &error), EF_OK);
    for (size_t i = 0; i < block.n; ++i) {
      const double *const v = block.value + 3 * i;
      n += (size_t)sprintf(out + n, "%zu %zu %s %a %a %a\n", block.line[i],
                           block.offset[i], block.name[i], v[0], v[1], v[2]);
    }
    if (block.n == 0)
      break;
  }
  ef_reader_free(reader);
  return n;
}

/* Ranges that meet give each row once, as the whole gives it: with its name,
 * its line and its decimal mark. */
static void ranges_join(void **state) {
  (void)state;
  enum { MOST_ROWS = 260, ROW_BYTES = 160 };
  gen g = gen_new(81);
  char *const text = malloc(MOST_ROWS * ROW_BYTES);
  char *const whole = malloc(MOST_ROWS * ROW_BYTES);
  char *const joined = malloc(MOST_ROWS * ROW_BYTES);
  for (int round = 0; round < 60; ++round) {
    const size_t length = random_table(&g, 1 + gen_below(&g, MOST_ROWS), text);
    const size_t n = rows_as_text(text, length, 0, 0, false, whole);
    const size_t n_parts = 1 + gen_below(&g, round % 4 == 0 ? length : 9);
    size_t used = 0;
    for (size_t k = 0; k < n_parts; ++k) {
      const size_t end = ef__byte_share(length, k + 1, n_parts);
      used += rows_as_text(text, length, ef__byte_share(length, k, n_parts),
                           end > 0 ? end : 1, round % 2 == 0, joined + used);
    }
    if (used != n || memcmp(joined, whole, n) != 0)
      fail_msg("round %d: %zu parts do not join", round, n_parts);
  }
  free(joined);
  free(whole);
  free(text);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(scanning_is_parsing),
      cmocka_unit_test(scanning_rounds_ties),
      cmocka_unit_test(scanning_shortest_texts),
      cmocka_unit_test(scanning_odd_texts),
      cmocka_unit_test(csv_reads_back),
      cmocka_unit_test(cgats_reads_back),
      cmocka_unit_test(cgats_refuses_what_it_cannot_hold),
      cmocka_unit_test(dialects_read_alike),
      cmocka_unit_test(ranges_join),
      cmocka_unit_test(json_reads_back),
      cmocka_unit_test(json_is_always_valid),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, scratch_make, scratch_remove);
}
