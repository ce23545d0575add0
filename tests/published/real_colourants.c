/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Measured and published colourants. The figures are not part of this
 * repository: the environment variable EVENFIELD_REFERENCE names a folder with
 * surfaces/watercolour_mixtures.csv and others; without it the tests are
 * skipped.
 *
 * Watercolours: M.-Y. Chen et al., arXiv 1904.00275 (2019), 13 pigments, layers
 * and binary mixtures on paper. Pigments of C. J. Curtis et al., Computer-
 * generated watercolor, SIGGRAPH 1997, figure 5. The check files were worked
 * out once by a second implementation from the formulas. */
#include <stdlib.h>

#include <evenfield/device.h>
#include <evenfield/difference.h>

#include "figures.h"
#include "near.h"

enum { PIGMENTS = 13, SAMPLES = 41, MOST = 900 };

/* ---- Formulas ----------------------------------------------------------- */

static void kubelka_munk_and_saunderson(void **state) {
  (void)state;
  const ef_surface surface = {0.04, 0.6, true};
  figures f = figures_reference("kubelka_munk_check.csv");
  deviation inside = {0}, plain = {0}, corrected = {0}, back = {0};
  for (size_t r = 0; r < f.n_rows; r++) {
    const char *where = figures_text(&f, r, 0);
    const double measured = figures_number(&f, r, 0);
    const double inner = ef_surface_inside(&surface, measured);
    deviation_add(&inside, inner, figures_number(&f, r, 1), where);
    deviation_add(&plain, ef_km_ratio(measured), figures_number(&f, r, 2),
                  where);
    deviation_add(&corrected, ef_km_ratio(inner), figures_number(&f, r, 3),
                  where);
    const double ratio = ef_km_ratio(inner);
    deviation_add(
        &back,
        ef_surface_outside(
            &surface, ef_km_reflectance(ratio, 1, INFINITE, 0, NULL), NULL),
        measured, where);
  }
  deviation_print(&inside, "inside the surface");
  deviation_print(&plain, "K/S");
  deviation_print(&corrected, "K/S inside");
  /* Half a unit of ten decimals. */
  assert_near(inside.largest, 0, 0.51e-10);
  assert_near(plain.largest, 0, 0.51e-10);
  assert_near(corrected.largest, 0, 0.51e-10);
  assert_near(back.largest, 0, 1e-15);
  figures_free(&f);
}

static void fresnel_constants(void **state) {
  (void)state;
  figures f = figures_reference("fresnel_saunderson_check.csv");
  deviation off = {0};
  for (size_t r = 0; r < f.n_rows; r++) {
    ef_surface surface;
    double diffuse;
    const char *where = figures_text(&f, r, 0);
    ef_surface_from_index(figures_number(&f, r, 0), true, &surface, &diffuse,
                          NULL);
    deviation_add(&off, surface.k1, figures_number(&f, r, 1), where);
    deviation_add(&off, diffuse, figures_number(&f, r, 2), where);
    deviation_add(&off, surface.k2, figures_number(&f, r, 3), where);
  }
  deviation_print(&off, "Fresnel constants");
  assert_near(off.largest, 0, 0.51e-8);
  figures_free(&f);
}

/* Layers of thickness 1 over nothing and over perfect white. */
static void published_pigments(void **state) {
  (void)state;
  figures f = figures_reference("pigments_curtis1997.csv");
  deviation off = {0};
  for (size_t r = 0; r < f.n_rows; r++)
    for (size_t band = 0; band < 3; band++) {
      const double k = figures_number(&f, r, 1 + band);
      const double s = figures_number(&f, r, 4 + band);
      const char *where = figures_text(&f, r, 0);
      deviation_add(&off, ef_km_reflectance(k, s, 1, 0, NULL),
                    figures_number(&f, r, 7 + band), where);
      deviation_add(&off, ef_km_reflectance(k, s, 1, 1, NULL),
                    figures_number(&f, r, 13 + band), where);
    }
  deviation_print(&off, "layers of 12 pigments");
  assert_near(off.largest, 0, 0.51e-8);
  figures_free(&f);
}

/* ---- Watercolours ------------------------------------------------------- */

typedef struct paints {
  size_t n;
  double concentration[MOST * PIGMENTS];
  double thickness[MOST];
  double backing[MOST * SAMPLES];
  double reflectance[MOST * SAMPLES];
} paints;

static double paper[SAMPLES];

static ef_grid grid(void) {
  return (ef_grid){SAMPLES, 380, 10, NULL};
}

/* "p07_020" is pigment 7, number 6 here. */
static size_t pigment_of(const char *key) {
  return (size_t)(10 * (key[1] - '0') + key[2] - '0' - 1);
}

static void add(paints *p, const figures *f, size_t row, const char *first) {
  const size_t at = figures_column(f, first);
  assert_true(p->n < MOST);
  for (size_t s = 0; s < SAMPLES; s++)
    p->reflectance[p->n * SAMPLES + s] = figures_number(f, row, at + s);
  memcpy(p->backing + p->n * SAMPLES, paper, sizeof paper);
  p->thickness[p->n++] = 1;
}

static void read_paper(void) {
  figures f = figures_reference("watercolour_paper.csv");
  for (size_t s = 0; s < SAMPLES; s++)
    paper[s] = figures_number(&f, s, 1);
  figures_free(&f);
}

/* Layers whose identity is sure: those that reproduce the authors' sRGB. */
static void add_layers(paints *p) {
  figures f = figures_reference("watercolour_layers.csv");
  for (size_t r = 0; r < f.n_rows; r++) {
    if (figures_number(&f, r, figures_column(&f, "match_diff")) > 0.6)
      continue;
    const size_t i = pigment_of(figures_text(&f, r, 0));
    p->concentration[p->n * PIGMENTS + i] =
        figures_number(&f, r, figures_column(&f, "quantity_ml"));
    add(p, &f, r, "r_380");
  }
  figures_free(&f);
}

static void add_mixture(paints *p, const figures *f, size_t row) {
  double *c = p->concentration + p->n * PIGMENTS;
  c[pigment_of(figures_text(f, row, 0))] += figures_number(f, row, 2);
  c[pigment_of(figures_text(f, row, 1))] += figures_number(f, row, 3);
  add(p, f, row, "r_380");
}

static bool is_mixture(const figures *f, size_t row) {
  return pigment_of(figures_text(f, row, 0)) !=
         pigment_of(figures_text(f, row, 1));
}

static int by_size(const void *a, const void *b) {
  const double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

typedef double difference(ef_lab a, ef_lab b);

static double ciede2000(ef_lab a, ef_lab b) {
  return ef_delta_e_ciede2000(a, b, 1, 1, 1);
}

typedef struct quality {
  size_t n;
  double mean, median, p95;
} quality;

/* Lab under D65 of the reflectances of rows [0, n). */
static void lab_of(size_t n, const double *reflectance, ef_lab *lab) {
  const ef_grid samples = grid();
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  const ef_viewing viewing = ef_viewing_default(d65);
  ef_weights *weights = ef_observer_weights(observer, EF_TRISTIMULUS, &samples,
                                            &viewing, NULL, NULL);
  double w[3], xyz[3];
  ef_observer_white(observer, EF_TRISTIMULUS, d65, NULL, w, NULL);
  const ef_xyz white = {w[0], w[1], w[2]};
  for (size_t i = 0; i < n; i++) {
    ef_weights_apply(weights, 1, reflectance + i * SAMPLES, 1, xyz, NULL);
    lab[i] = ef_xyz_to_lab((ef_xyz){xyz[0], xyz[1], xyz[2]}, white);
  }
  ef_weights_free(weights);
  ef_illuminant_free(d65);
  ef_observer_free(observer);
}

/* Two pigments of a mixture, as a device on the paper. */
static void predict(const ef_colourants *all, const double *concentration,
                    double *spectrum) {
  size_t index[PIGMENTS], n = 0;
  double c[PIGMENTS];
  for (size_t i = 0; i < PIGMENTS; i++) {
    if (concentration[i] == 0)
      continue;
    index[n] = i;
    c[n++] = concentration[i];
  }
  ef_error error;
  ef_colourants *few = ef_colourants_pick(all, n, index, &error);
  ef_mixture_settings settings = ef_mixture_settings_default();
  settings.thickness = 1;
  settings.substrate = paper;
  ef_device *device = ef_mixture_new("watercolour", few, &settings, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  assert_int_equal(ef_mixture_spectrum(device, c, spectrum, NULL, &error),
                   EF_OK);
  ef_device_free(device);
  ef_colourants_free(few);
}

static quality compare(const ef_colourants *all, const paints *test,
                       difference *formula) {
  static ef_lab measured[MOST], predicted[MOST];
  static double spectrum[MOST * SAMPLES], off[MOST];
  for (size_t i = 0; i < test->n; i++)
    predict(all, test->concentration + i * PIGMENTS, spectrum + i * SAMPLES);
  lab_of(test->n, test->reflectance, measured);
  lab_of(test->n, spectrum, predicted);
  quality q = {.n = test->n};
  for (size_t i = 0; i < q.n; i++) {
    off[i] = formula(measured[i], predicted[i]);
    q.mean += off[i] / (double)q.n;
  }
  qsort(off, q.n, sizeof *off, by_size);
  q.median = off[q.n / 2];
  q.p95 = off[(size_t)(0.95 * (double)(q.n - 1))];
  return q;
}

/* Absorption and scattering of 13 pigments fitted to the pure layers and to
 * every third mixture predict the other mixtures. A single constant added up
 * over the paper, worked out once beside the data, is off by 10.3 CIELAB units
 * in the mean (median 8.9). The bounds are a little above what was measured. */
static void mixtures_of_watercolours(void **state) {
  (void)state;
  static paints fitted, test;
  read_paper();
  add_layers(&fitted);
  figures f = figures_reference("watercolour_mixtures.csv");
  for (size_t r = 0; r < f.n_rows; r++) {
    if (r % 3 == 0)
      add_mixture(&fitted, &f, r);
    else if (is_mixture(&f, r))
      add_mixture(&test, &f, r);
  }
  figures_free(&f);
  const ef_drawdowns d = {.n_drawdowns = fitted.n,
                          .n_colourants = PIGMENTS,
                          .concentration = fitted.concentration,
                          .thickness = fitted.thickness,
                          .backing = fitted.backing,
                          .reflectance = fitted.reflectance,
                          .grid = grid()};
  ef_error error;
  ef_colourants *all = ef_colourants_fit(&d, NULL, NULL, &error);
  if (all == NULL)
    fail_msg("%s", error.message);
  const quality lab = compare(all, &test, ef_delta_e_cielab);
  const quality q = compare(all, &test, ciede2000);
  printf("# fitted to %zu samples; %zu mixtures predicted: CIELAB difference "
         "mean %.2f, median %.2f, 95 %% below %.2f; CIEDE2000 mean %.2f, "
         "median %.2f, 95 %% below %.2f\n",
         fitted.n, q.n, lab.mean, lab.median, lab.p95, q.mean, q.median, q.p95);
  assert_true(q.n > 200);
  assert_true(lab.mean < 6.3 && lab.median < 5.0);
  assert_true(q.mean < 4.2 && q.p95 < 9.5);
  ef_colourants_free(all);
}

int main(void) {
  if (figures_no_reference("measured and published colourants"))
    return 0;
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(kubelka_munk_and_saunderson),
      cmocka_unit_test(fresnel_constants),
      cmocka_unit_test(published_pigments),
      cmocka_unit_test(mixtures_of_watercolours),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
