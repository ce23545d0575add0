/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A misprint in a smooth table stands out in the second differences: one value
 * off by e puts e, -2e, e there, and second differences of these, divided by
 * six, have e itself at the row in question. The size of that "kink" is judged
 * against its neighbours, so that neither the height of the curve nor the
 * rounding of the source matters. Beside the tables as they are, the test
 * alters every row in turn and counts how often the alteration is found: it
 * shows what this net catches.
 *
 * Left out: lights (they have lines and edges), the daylight components
 * (straight lines between tens of nm), hazard weights (joined formulas), the
 * test colour samples (edges; pub_checksums.py has their every digit), and the
 * lens components, too short and steep: they must fall, no more. */
#include "near.h"

#include <evenfield/spectrum.h>
#include <stdlib.h>

enum { REACH = 10, CLOSE = 2, MAX_ROWS = 471 };

/* The largest kink, in neighbours' kinks, that a column may show: little above
 * what the published columns have. Those of the observers were interpolated in
 * pieces, with joints every 5 or 10 nm (up to 12); those of three or four
 * figures have rounding and nothing else (up to 4). */
typedef struct smooth_figure {
  const char *table;
  const char *column; /* NULL: all */
  double limit;
  double misprint; /* relative error of one value ... */
  double found;    /* ... that is found in this share of the rows */
} smooth_figure;

/* The other columns of cie-s026 are in cie-2006-10 and scotopic-1951. */
static const smooth_figure smooth_figures[] = {
    {"cie-1931", NULL, 12, 0.01, 0.99},
    {"cie-1964", NULL, 12, 0.01, 0.99},
    {"scotopic-1951", NULL, 3, 0.01, 0.99},
    {"cie-2006-2", NULL, 9, 0.002, 0.99},
    {"cie-2006-10", NULL, 9, 0.002, 0.99},
    {"cie-s026", "melanopic", 3, 0.03, 0.90},
    {"cie-170-templates", NULL, 5, 0.1, 0.85},
};
enum { N_FIGURES = sizeof smooth_figures / sizeof *smooth_figures };

static double kink(const double *v, size_t i) {
  return fabs(v[i - 2] - 4 * v[i - 1] + 6 * v[i] - 4 * v[i + 1] + v[i + 2]) / 6;
}

/* One unit of the last decimal of the shortest text that means this value. */
static double last_unit(double value) {
  char text[EF_NUMBER_TEXT];
  ef_number_format(value, text);
  const char *exponent = strpbrk(text, "eE");
  const char *point = strchr(text, '.');
  const int power = exponent != NULL ? atoi(exponent + 1) : 0;
  const size_t length =
      exponent != NULL ? (size_t)(exponent - text) : strlen(text);
  const int decimals =
      point != NULL ? (int)(length - (size_t)(point - text)) - 1 : 0;
  return pow(10, power - decimals);
}

static int by_value(const void *a, const void *b) {
  const double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* What kinks around row i are like: the upper quartile of those 3 to 10 rows
 * away, and the smallest unit in which the values nearby are given. */
static double usual_kink(const double *v, size_t n, size_t i) {
  double near[2 * REACH];
  size_t n_near = 0;
  double unit = (double)INFINITY;
  for (size_t k = i < REACH ? 0 : i - REACH; k <= i + REACH && k < n; ++k) {
    const size_t away = k < i ? i - k : k - i;
    if (away > 0 && away <= 4 && v[k] != 0)
      unit = fmin(unit, last_unit(v[k]));
    if (away <= CLOSE || k < 2 || k + 2 >= n)
      continue;
    near[n_near++] = kink(v, k);
  }
  qsort(near, n_near, sizeof *near, by_value);
  return near[n_near * 3 / 4] + unit;
}

static double ratio(const double *v, size_t n, size_t i) {
  return kink(v, i) / usual_kink(v, n, i);
}

/* One column without the zeros at its ends, which are no curve. */
typedef struct curve {
  const char *name;
  const double *nm;
  const double *value;
  size_t n;
} curve;

static curve curve_of(const ef_table *table, size_t column) {
  const double *v = table->value + column * table->n_rows;
  size_t first = 0, end = table->n_rows;
  while (first < end && v[first] == 0)
    ++first;
  while (end > first && v[end - 1] == 0)
    --end;
  return (curve){table->column[column], table->value + first, v + first,
                 end - first};
}

/* The curves that a line of the list means; returns their number. */
static size_t curves_of(const smooth_figure *f, curve curves[8]) {
  const ef_table *table = ef_table_find(f->table, NULL);
  assert_non_null(table);
  size_t n = 0;
  for (size_t c = 1; c < table->n_columns; ++c) {
    if (f->column == NULL || strcmp(f->column, table->column[c]) == 0) {
      curves[n++] = curve_of(table, c);
    }
  }
  assert_true(n > 0);
  return n;
}

static void test_no_kink(void **state) {
  (void)state;
  for (size_t t = 0; t < N_FIGURES; ++t) {
    const smooth_figure *f = &smooth_figures[t];
    curve curves[8];
    const size_t n_curves = curves_of(f, curves);
    double largest = 0, where_nm = 0;
    for (size_t c = 0; c < n_curves; ++c) {
      for (size_t i = 2; i + 2 < curves[c].n; ++i) {
        const double r = ratio(curves[c].value, curves[c].n, i);
        if (r <= largest)
          continue;
        largest = r;
        where_nm = curves[c].nm[i];
      }
    }
    printf("# %s: largest kink %.1f at %g nm, limit %g\n", f->table, largest,
           where_nm, f->limit);
    assert_true(largest <= f->limit);
  }
}

/* Alters each row of a curve by itself; counts the alterations and those that
 * are found. Rows below 1 % of the peak are too rounded for this. */
static void alter_rows(const smooth_figure *f, const curve *line,
                       size_t *n_altered, size_t *n_found) {
  double altered[MAX_ROWS];
  assert_true(line->n <= MAX_ROWS);
  memcpy(altered, line->value, line->n * sizeof *altered);
  double peak = 0;
  for (size_t i = 0; i < line->n; ++i)
    peak = fmax(peak, fabs(altered[i]));
  for (size_t i = 2; i + 2 < line->n; ++i) {
    const double value = altered[i];
    if (fabs(value) < 0.01 * peak)
      continue;
    altered[i] = value * (1 + f->misprint);
    ++*n_altered;
    *n_found += ratio(altered, line->n, i) > f->limit;
    altered[i] = value;
  }
}

static void test_misprint_is_found(void **state) {
  (void)state;
  for (size_t t = 0; t < N_FIGURES; ++t) {
    const smooth_figure *f = &smooth_figures[t];
    curve curves[8];
    const size_t n_curves = curves_of(f, curves);
    size_t n_altered = 0, n_found = 0;
    for (size_t c = 0; c < n_curves; ++c) {
      alter_rows(f, &curves[c], &n_altered, &n_found);
    }
    const double share = (double)n_found / (double)n_altered;
    printf("# %s: an error of %g %% is found in %.1f %% of %zu cells\n",
           f->table, 100 * f->misprint, 100 * share, n_altered);
    assert_true(share >= f->found);
  }
}

/* Pokorny, Smith & Lutze 1987: both parts fall with wavelength and end at 0. */
static void test_lens_falls(void **state) {
  (void)state;
  const ef_table *table = ef_table_find("lens-age-1987", NULL);
  assert_non_null(table);
  for (size_t c = 1; c < table->n_columns; ++c) {
    const double *v = table->value + c * table->n_rows;
    for (size_t r = 1; r < table->n_rows; ++r)
      assert_true(v[r] <= v[r - 1]);
    assert_near(v[table->n_rows - 1], 0, 0);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_no_kink),
      cmocka_unit_test(test_misprint_is_found),
      cmocka_unit_test(test_lens_falls),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests_name("law_smooth_tables", tests, NULL, NULL);
}
