/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Built-in tables and embedded files: that they are what stands in spectra/,
 * and that they are found by name. */
#include "near.h"

#include "exchange/embedded.h"
#include "figures.h"

#include <dirent.h>
#include <evenfield/spectrum.h>
#include <stdlib.h>

static const char *const groups[] = {"cmf", "cones", "hazards", "illuminants",
                                     "surfaces"};

static void test_order(void **state) {
  (void)state;
  for (size_t i = 1; i < ef_table_count(); ++i) {
    const ef_table *a = ef_table_at(i - 1), *b = ef_table_at(i);
    const int order = strcmp(a->group, b->group);
    assert_true(order < 0 || (order == 0 && strcmp(a->name, b->name) < 0));
  }
  assert_string_equal(ef_table_at(0)->name, "cie-1931");
}

static void test_texts(void **state) {
  (void)state;
  for (size_t i = 0; i < ef_table_count(); ++i) {
    const ef_table *t = ef_table_at(i);
    assert_true(strlen(t->title) > 0 && strlen(t->source) > 0 &&
                strlen(t->quantity) > 0);
    assert_string_equal(t->column[0], "wavelength_nm");
    assert_non_null(t->note);
    /* Data sets of the CIE ask for attribution. */
    const bool of_cie = strncmp(t->name, "cie-", 4) == 0 &&
                        strcmp(t->name, "cie-170-templates") != 0;
    if (of_cie)
      assert_non_null(strstr(t->rights, "CC BY-SA 4.0"));
  }
  assert_string_equal(ef_table_find("lens-age-1987", NULL)->rights, "");
}

/* Number of .csv files in a folder of spectra/. */
static size_t count_files(const char *folder) {
  char path[1024];
  snprintf(path, sizeof path, "%s/../spectra/%s", getenv("EVENFIELD_TESTS"),
           folder);
  DIR *directory = opendir(path);
  if (directory == NULL)
    fail_msg("cannot open %s", path);
  size_t n = 0;
  for (struct dirent *entry; (entry = readdir(directory)) != NULL;) {
    const size_t length = strlen(entry->d_name);
    n += length > 4 && strcmp(entry->d_name + length - 4, ".csv") == 0;
  }
  closedir(directory);
  return n;
}

static void test_every_file_is_in(void **state) {
  (void)state;
  size_t n = 0;
  for (size_t i = 0; i < sizeof groups / sizeof *groups; ++i) {
    n += count_files(groups[i]);
  }
  assert_int_equal(n, ef_table_count());
  assert_int_equal(count_files("demo"), ef__demo_file_count);
}

/* Every cell against the file, bit for bit; an empty cell counts as 0. */
static void test_values(void **state) {
  (void)state;
  size_t n_cells = 0;
  for (size_t i = 0; i < ef_table_count(); ++i) {
    const ef_table *t = ef_table_at(i);
    char folder[64], file[64];
    snprintf(folder, sizeof folder, "../spectra/%s", t->group);
    snprintf(file, sizeof file, "%s.csv", t->name);
    figures f = figures_read(folder, file);
    assert_int_equal(f.n_rows, t->n_rows);
    assert_int_equal(f.n_columns, t->n_columns);
    for (size_t c = 0; c < f.n_columns; ++c) {
      assert_string_equal(f.column[c], t->column[c]);
      for (size_t r = 0; r < f.n_rows; ++r, ++n_cells) {
        const double cell = figures_number(&f, r, c);
        const double expected = isnan(cell) ? 0 : cell;
        assert_same_bits(&t->value[c * t->n_rows + r], &expected, 1);
      }
    }
    figures_free(&f);
  }
  printf("# %zu cells\n", n_cells);
}

static void test_empty_cell_is_zero(void **state) {
  (void)state;
  const ef_table *t = ef_table_find("cie-2006-2", NULL);
  assert_non_null(t);
  const double *s_bar = t->value + ef_table_column(t, "s_bar") * t->n_rows;
  assert_near(s_bar[615 - 390], 5.41843e-6, 0);
  assert_near(s_bar[616 - 390], 0, 0);
  assert_near(s_bar[830 - 390], 0, 0);
}

static void test_find(void **state) {
  (void)state;
  ef_error error = {0};
  const ef_table *t = ef_table_find("CIE-d65", &error);
  assert_non_null(t);
  assert_string_equal(t->name, "cie-d65");
  assert_string_equal(t->group, "illuminants");
  assert_int_equal(t->n_rows, 531);
  assert_int_equal(error.status, EF_OK);
}

static void test_unknown_name(void **state) {
  (void)state;
  ef_error error = {0};
  assert_null(ef_table_find("cie-1913", &error));
  assert_int_equal(error.status, EF_UNKNOWN_NAME);
  assert_string_equal(error.message,
                      "no built-in table is called 'cie-1913'; near names: "
                      "cie-1931, cie-1964");
  assert_null(ef_table_find("daylight", &error));
  assert_error(&error, EF_UNKNOWN_NAME, "near names: daylight-components");
  assert_null(ef_table_find("", &error));
  assert_error(&error, EF_UNKNOWN_NAME, "known: cie-1931, cie-1964, ");
  assert_null(ef_table_find("cie-1913", NULL));
}

static void test_column(void **state) {
  (void)state;
  const ef_table *t = ef_table_find("cie-fl3", NULL);
  assert_non_null(t);
  assert_int_equal(ef_table_column(t, "wavelength_nm"), 0);
  assert_int_equal(ef_table_column(t, "FL3.15"), 15);
  assert_int_equal(ef_table_column(t, "fl3.2"), 2);
  assert_true(ef_table_column(t, "FL3.16") == SIZE_MAX);
  assert_true(ef_table_column(t, "FL3") == SIZE_MAX);
}

static void test_grid(void **state) {
  (void)state;
  for (size_t i = 0; i < ef_table_count(); ++i) {
    const ef_table *t = ef_table_at(i);
    const ef_grid grid = ef_table_grid(t);
    ef_error error;
    assert_int_equal(ef_grid_check(&grid, &error), EF_OK);
    assert_int_equal(grid.count, t->n_rows);
    assert_null(grid.wavelength_nm); /* all of them have even steps */
    for (size_t r = 0; r < t->n_rows; ++r) {
      assert_near(ef_grid_wavelength(&grid, r), t->value[r], 1e-9);
    }
  }
  const ef_grid tcs = ef_table_grid(ef_table_find("cie-tcs", NULL));
  assert_near(tcs.start_nm, 360, 0);
  assert_near(tcs.step_nm, 5, 1e-12);
}

static void test_demo_files(void **state) {
  (void)state;
  for (size_t i = 0; i < ef__demo_file_count; ++i) {
    const ef__embedded_text *e = &ef__demo_files[i];
    if (i > 0)
      assert_true(strcmp(ef__demo_files[i - 1].name, e->name) < 0);
    char path[1024];
    snprintf(path, sizeof path, "%s/../spectra/demo/%s",
             getenv("EVENFIELD_TESTS"), e->name);
    FILE *file = fopen(path, "rb");
    if (file == NULL)
      fail_msg("cannot open %s", path);
    char *text = malloc(e->length + 1);
    assert_non_null(text);
    /* One byte more than there should be. */
    assert_int_equal(fread(text, 1, e->length + 1, file), e->length);
    fclose(file);
    assert_memory_equal(text, e->text, e->length);
    assert_int_equal(e->text[e->length], 0);
    free(text);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_order),
      cmocka_unit_test(test_texts),
      cmocka_unit_test(test_every_file_is_in),
      cmocka_unit_test(test_values),
      cmocka_unit_test(test_empty_cell_is_zero),
      cmocka_unit_test(test_find),
      cmocka_unit_test(test_unknown_name),
      cmocka_unit_test(test_column),
      cmocka_unit_test(test_grid),
      cmocka_unit_test(test_demo_files),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests_name("table", tests, NULL, NULL);
}
