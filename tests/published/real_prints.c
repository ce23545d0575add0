/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Measured offset prints. The measurements are not part of this repository: the
 * environment variable EVENFIELD_REFERENCE names a folder with
 * surfaces/print_characterization_fogra39l.csv and others; without it the tests
 * are skipped.
 *
 * Characterisations: Fogra FOGRA39L (2006) and ANSI CGATS TR 006 (2007), 1617
 * patches of ISO 12642-2 each, XYZ under D50. Beside them figures that a second
 * implementation worked out once from the same data (print_neugebauer_check,
 * print_tone_value_check). */
#include <stdlib.h>

#include <evenfield/device.h>
#include <evenfield/difference.h>
#include <evenfield/exchange.h>

#include "figures.h"
#include "near.h"

enum { MOST = 1700 };

/* White of the published CIELAB values. */
static const ef_xyz white = {96.42, 100, 82.49};

typedef struct press {
  size_t n_rows;
  double drive[4 * MOST], xyz[3 * MOST];
} press;

static press *read_press(const char *file) {
  figures f = figures_reference(file);
  press *p = calloc(1, sizeof *p);
  assert_true(p != NULL && f.n_rows <= MOST);
  p->n_rows = f.n_rows;
  for (size_t r = 0; r < f.n_rows; r++) {
    for (size_t i = 0; i < 4; i++)
      p->drive[4 * r + i] = figures_number(&f, r, 1 + i) / 100;
    for (size_t c = 0; c < 3; c++)
      p->xyz[3 * r + c] = figures_number(&f, r, 5 + c);
  }
  figures_free(&f);
  return p;
}

/* ---- The model ---------------------------------------------------------- */

typedef struct quality {
  double n; /* Yule-Nielsen factor */
  size_t n_patches;
  double mean, p95, largest;
} quality;

static int by_size(const void *a, const void *b) {
  const double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

static quality summarise(double n, size_t n_patches, double *off) {
  quality q = {.n = n, .n_patches = n_patches};
  for (size_t i = 0; i < n_patches; i++)
    q.mean += off[i] / (double)n_patches;
  qsort(off, n_patches, sizeof *off, by_size);
  /* Between the two values nearest to the share. */
  const double at = 0.95 * (double)(n_patches - 1);
  const size_t below = (size_t)at;
  q.p95 = off[below] + (at - (double)below) * (off[below + 1] - off[below]);
  q.largest = off[n_patches - 1];
  return q;
}

/* True for a patch of all three inks that took no part in the fit. */
static bool is_three_ink_test(const press *p, const ef_print_residual *r) {
  const double *drive = p->drive + 4 * r->row;
  return r->is_test && drive[0] > 0 && drive[1] > 0 && drive[2] > 0;
}

typedef double difference(ef_lab a, ef_lab b);

static double ciede2000(ef_lab a, ef_lab b) {
  return ef_delta_e_ciede2000(a, b, 1, 1, 1);
}

/* Predicts with factor n (0: fitted); over all rows or three-ink tests. */
static quality predict(const press *p, double n, double black,
                       difference *formula, bool only_three) {
  static ef_print_residual residual[MOST];
  static double off[MOST];
  const ef_measurements m = {
      .n_rows = p->n_rows, .n_drives = 4, .drive = p->drive, .xyz = p->xyz};
  ef_halftone_settings settings = ef_halftone_settings_default();
  settings.n = n;
  settings.black = black;
  ef_error error;
  size_t n_residuals, n_patches = 0;
  ef_device *device = ef_halftone_from_measurements(
      "offset", &m, &settings, residual, &n_residuals, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  for (size_t i = 0; i < n_residuals; i++)
    if (!only_three || is_three_ink_test(p, &residual[i]))
      off[n_patches++] = formula(ef_xyz_to_lab(residual[i].measured, white),
                                 ef_xyz_to_lab(residual[i].predicted, white));
  const quality q = summarise(ef_halftone_n(device), n_patches, off);
  ef_device_free(device);
  return q;
}

/* What the literature reaches with broad-band or spectral Yule-Nielsen models
 * of offset prints is a mean of some 2 to 4 CIELAB units (Rolleston & Balasu-
 * bramanian 1993, Wyble & Berns 2000: from memory); the second implementation
 * reaches 2.2 and 2.8 with the best n. The bounds are a little above what was
 * measured here: a change for the worse fails. */
static void check_three_inks(const char *file, double black, double mean,
                             double p95) {
  press *p = read_press(file);
  const quality q = predict(p, 0, black, ciede2000, true);
  printf("# %s, black %g %%: fitted n = %.3f; %zu patches of three inks, "
         "CIEDE2000 mean %.3f, 95 %% below %.3f, largest %.3f\n",
         file, 100 * black, q.n, q.n_patches, q.mean, q.p95, q.largest);
  assert_true(q.n_patches > 70);
  assert_true(q.mean < mean);
  assert_true(q.p95 < p95);
  free(p);
}

static void three_inks_of_fogra39(void **state) {
  (void)state;
  check_three_inks("print_characterization_fogra39l.csv", 0, 2.1, 3.7);
}

static void three_inks_of_tr006(void **state) {
  (void)state;
  check_three_inks("print_characterization_tr006.csv", 0, 1.6, 3.3);
}

static void three_inks_over_black(void **state) {
  (void)state;
  check_three_inks("print_characterization_fogra39l.csv", 0.4, 1.8, 3.2);
}

/* The second implementation joins the points of its curves by straight lines,
 * ours are smooth: a few thousandths of a unit. */
static void agrees_with_second_implementation(void **state) {
  (void)state;
  figures f = figures_reference("print_neugebauer_check.csv");
  deviation mean = {0}, p95 = {0};
  for (size_t r = 0; r < f.n_rows; r++) {
    char where[96];
    const double n = figures_number(&f, r, 1);
    snprintf(where, sizeof where, "print_characterization_%s.csv",
             strcmp(figures_text(&f, r, 0), "fogra39l") == 0 ? "fogra39l"
                                                             : "tr006");
    press *p = read_press(where);
    const quality q = predict(p, n, 0, ef_delta_e_cielab, false);
    assert_int_equal(q.n_patches, (size_t)figures_number(&f, r, 2));
    snprintf(where, sizeof where, "%s, n = %g", figures_text(&f, r, 0), n);
    deviation_add(&mean, q.mean, figures_number(&f, r, 3), where);
    deviation_add(&p95, q.p95, figures_number(&f, r, 4), where);
    free(p);
  }
  deviation_print(&mean, "mean CIELAB difference, two implementations");
  deviation_print(&p95, "95th percentile");
  assert_near(mean.largest, 0, 0.002);
  assert_near(p95.largest, 0, 0.02);
  figures_free(&f);
}

/* ---- Tone values -------------------------------------------------------- */

/* What ISO 10128 takes the tone value of an ink from. */
static double channel(char ink, const double *xyz) {
  switch (ink) {
  case 'c':
    return xyz[0] - 0.55 * xyz[2];
  case 'y':
    return xyz[2];
  default:
    return xyz[1];
  }
}

/* Mean over the repeated patches of one ink at a tone value. */
static double mean_channel(const press *p, char ink, double drive) {
  const size_t i = (size_t)(strchr("cmyk", ink) - "cmyk");
  double sum = 0;
  size_t n = 0;
  for (size_t r = 0; r < p->n_rows; r++) {
    bool is_ink = fabs(p->drive[4 * r + i] - drive) < 1e-9;
    for (size_t k = 0; k < 4; k++)
      is_ink &= k == i || p->drive[4 * r + k] == 0;
    if (!is_ink)
      continue;
    sum += channel(ink, p->xyz + 3 * r);
    n++;
  }
  assert_true(n > 0);
  return sum / (double)n;
}

static void tone_values_of_ramps(void **state) {
  (void)state;
  press *fogra = read_press("print_characterization_fogra39l.csv");
  press *tr006 = read_press("print_characterization_tr006.csv");
  figures f = figures_reference("print_tone_value_check.csv");
  deviation off = {0};
  for (size_t r = 0; r < f.n_rows; r++) {
    const char *condition = figures_text(&f, r, 0);
    const press *p = strcmp(condition, "FOGRA39L") == 0 ? fogra : tr006;
    const char ink = figures_text(&f, r, 1)[0];
    const double percent = figures_number(&f, r, 2);
    const double value =
        ef_tone_value(mean_channel(p, ink, 0), mean_channel(p, ink, 1),
                      mean_channel(p, ink, percent / 100), 1);
    char where[96];
    snprintf(where, sizeof where, "%s %c %g %%", condition, ink, percent);
    deviation_add(&off, 100 * value, figures_number(&f, r, 3), where);
  }
  deviation_print(&off, "tone values, percent");
  /* Half a unit of the third decimal. */
  assert_near(off.largest, 0, 0.5e-3 + 1e-9);
  figures_free(&f);
  free(tr006);
  free(fogra);
}

/* ---- As they are published ---------------------------------------------- */

/* The form in which such data sets are published: 1617 sets of fields. */
static char *as_cgats(const press *p, size_t *length) {
  const size_t room = 256 + 200 * p->n_rows;
  char *text = malloc(room);
  assert_non_null(text);
  size_t n = (size_t)snprintf(
      text, room,
      "ISO28178\nORIGINATOR \"test\"\nFILE_DESCRIPTOR \"offset\"\n"
      "NUMBER_OF_FIELDS 8\nBEGIN_DATA_FORMAT\nSAMPLE_ID CMYK_C CMYK_M CMYK_Y\n"
      "CMYK_K XYZ_X XYZ_Y XYZ_Z\nEND_DATA_FORMAT\nNUMBER_OF_SETS %zu\n"
      "BEGIN_DATA\n",
      p->n_rows);
  for (size_t r = 0; r < p->n_rows; r++) {
    const double *d = p->drive + 4 * r, *x = p->xyz + 3 * r;
    n += (size_t)snprintf(text + n, room - n,
                          "%zu\t%.2f %.2f %.2f %.2f\r\n%.2f %.2f %.2f\r\n",
                          r + 1, 100 * d[0], 100 * d[1], 100 * d[2],
                          100 * d[3], x[0], x[1], x[2]);
  }
  n += (size_t)snprintf(text + n, room - n, "END_DATA\n");
  assert_true(n < room);
  *length = n;
  return text;
}

static void read_as_published(void **state) {
  (void)state;
  press *p = read_press("print_characterization_fogra39l.csv");
  size_t length, n = 0;
  char *text = as_cgats(p, &length);
  ef_error error = {0};
  ef_reader *reader =
      ef_reader_from_text("offset.txt", text, length, NULL, &error);
  if (reader == NULL)
    fail_msg("line %zu: %s", error.line, error.message);
  assert_int_equal(ef_reader_get_head(reader)->content, EF_CONTENT_XYZ);
  assert_int_equal(ef_reader_get_head(reader)->n_device, 4);
  for (;;) {
    ef_block block;
    assert_int_equal(ef_reader_next(reader, 100, &block, &error), EF_OK);
    if (block.n == 0)
      break;
    for (size_t i = 0; i < block.n; i++, n++) {
      for (size_t k = 0; k < 4; k++)
        assert_near(block.device[4 * i + k], p->drive[4 * n + k], 1e-15);
      for (size_t k = 0; k < 3; k++)
        assert_near(block.value[3 * i + k], p->xyz[3 * n + k], 0);
    }
  }
  assert_int_equal(n, 1617);
  ef_reader_free(reader);
  free(text);
  free(p);
}

int main(void) {
  if (figures_no_reference("measured prints"))
    return 0;
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(three_inks_of_fogra39),
      cmocka_unit_test(three_inks_of_tr006),
      cmocka_unit_test(three_inks_over_black),
      cmocka_unit_test(agrees_with_second_implementation),
      cmocka_unit_test(tone_values_of_ramps),
      cmocka_unit_test(read_as_published),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
