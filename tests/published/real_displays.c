/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Measured spectra of real displays. The measurements are not part of this
 * repository: the environment variable EVENFIELD_REFERENCE names a folder with
 * surfaces/display_spd_crt.csv and others; without it the tests are skipped.
 *
 * Primaries: R. Mantiuk, K. J. Kim, A. G. Rempel & W. Heidrich, ACM
 * Transactions on Graphics 30(4), 40 (2011); the authors scaled each set so
 * that its sum is D65. Metamers: 11 colours matched by CIE 1931 on four
 * displays, attributed to C. Shen et al., Color Research and Application
 * (2022). */
#include <stdlib.h>

#include <evenfield/device.h>
#include <evenfield/exchange.h>

#include "near.h"

/* Path of a file of the reference folder. */
static void reference_path(const char *file, char path[1024]) {
  snprintf(path, 1024, "%s/surfaces/%s", getenv("EVENFIELD_REFERENCE"), file);
}

static char *read_text(const char *path, size_t *length) {
  FILE *file = fopen(path, "rb");
  if (file == NULL)
    fail_msg("%s cannot be opened", path);
  fseek(file, 0, SEEK_END);
  *length = (size_t)ftell(file);
  rewind(file);
  char *text = malloc(*length + 1);
  assert_int_equal(fread(text, 1, *length, file), *length);
  text[*length] = '\0';
  fclose(file);
  return text;
}

static ef_spectra *read_lights(const char *path) {
  ef_reader_settings settings = ef_reader_settings_default();
  settings.kind = EF_KIND_LIGHT;
  ef_error error;
  ef_spectra *spectra = ef_spectra_read(path, &settings, &error);
  if (spectra == NULL)
    fail_msg("%s", error.message);
  return spectra;
}

/* ---- Primaries --------------------------------------------------------- */

/* Chromaticities and Y of red, green, blue and their sum (with 683 lm/W), as
 * the header of the file gives them: computed once by a second implementation,
 * trapezoid sums on the instrument's own uneven grid. The sum is the authors'
 * own. */
typedef struct real_display {
  const char *file;
  ef_xyy light[4];
} real_display;

static const real_display crt = {"display_spd_crt.csv",
                                 {{0.6175, 0.3495, 162.96},
                                  {0.3052, 0.5907, 457.83},
                                  {0.1494, 0.0745, 62.20},
                                  {0.3127, 0.3290, 682.99}}};

static const real_display led_lcd = {"display_spd_led_lcd.csv",
                                     {{0.5871, 0.3560, 154.26},
                                      {0.3240, 0.5695, 482.32},
                                      {0.1512, 0.0583, 46.40},
                                      {0.3127, 0.3290, 682.98}}};

static void check_display(const real_display *real) {
  static const char *const names[4] = {"red", "green", "blue", "white"};
  static const double amount[4][3] = {
      {1, 0, 0}, {0, 1, 0}, {0, 0, 1}, {1, 1, 1}};
  char path[1024];
  reference_path(real->file, path);
  ef_error error;
  ef_spectra *spectra = read_lights(path);
  ef_spectra_set_absolute(spectra, true); /* for the factor 683 */
  ef_device *device =
      ef_display_from_spectra("measured", spectra, NULL, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_setup *setup = ef_setup_new(device, observer, NULL, NULL, NULL);
  deviation chromaticity = {0}, luminance = {0};
  for (int i = 0; i < 4; i++) {
    const ef_xyy xyy = ef_xyz_to_xyy(ef_setup_xyz(setup, amount[i], NULL));
    deviation_add(&chromaticity, xyy.x, real->light[i].x, names[i]);
    deviation_add(&chromaticity, xyy.y, real->light[i].y, names[i]);
    deviation_add(&luminance, xyy.Y / ef_setup_scale(setup), real->light[i].Y,
                  names[i]);
  }
  deviation_print(&chromaticity, "x, y of primaries and white");
  deviation_print(&luminance, "Y of primaries and white");
  /* Half a unit of the published digits, and as much again for the trapezoid
   * rule on 1 nm steps against ours. */
  assert_near(chromaticity.largest, 0, 1e-4);
  assert_near(luminance.largest, 0, 0.02);
  ef_setup_free(setup);
  ef_observer_free(observer);
  ef_device_free(device);
  ef_spectra_free(spectra);
}

static void crt_primaries(void **state) {
  (void)state;
  check_display(&crt);
}

static void led_lcd_primaries(void **state) {
  (void)state;
  check_display(&led_lcd);
}

/* ---- Metamers ---------------------------------------------------------- */

/* Rows "display,colour,x_abs,y_abs,z_abs,..." after the comments. */
static size_t read_metamers(const char *path, size_t max, char (*name)[32],
                            double *xyz) {
  size_t length, n = 0;
  char *text = read_text(path, &length);
  for (char *line = strtok(text, "\r\n"); line != NULL && n < max;
       line = strtok(NULL, "\r\n")) {
    char display[16];
    int colour;
    double *v = xyz + 3 * n;
    if (sscanf(line, "%15[a-z_],%d,%lf,%lf,%lf", display, &colour, v, v + 1,
               v + 2) != 5)
      continue;
    snprintf(name[n++], 32, "%s_c%02d", display, colour);
  }
  free(text);
  return n;
}

/* What the trapezoid rule leaves out of a sum: half of either end. */
static double half_ends(const ef_spectra *spectra, size_t i, size_t channel) {
  const ef_table *table = ef_table_find("cie-1931", NULL);
  const ef_grid grid = ef_table_grid(table);
  const ef_grid *samples = ef_spectra_grid(spectra);
  const double *value = ef_spectra_values(spectra) + i * samples->count;
  double sum = 0;
  for (int end = 0; end < 2; end++) {
    const size_t s = end ? samples->count - 1 : 0;
    const double steps =
        (ef_grid_wavelength(samples, s) - grid.start_nm) / grid.step_nm;
    const size_t row = (size_t)lround(steps);
    sum += 0.5 * value[s] * table->value[(1 + channel) * table->n_rows + row];
  }
  return 683 * sum;
}

/* Tristimulus values computed once by a second implementation, trapezoid sums
 * with the CIE 1931 table at 1 nm and 683 lm/W, five decimals. */
static void tristimulus_values_of_metamers(void **state) {
  (void)state;
  enum { MAX = 60 };
  char path[1024], name[MAX][32];
  double expected[3 * MAX], xyz[3 * MAX];
  reference_path("display_metamers_xyz.csv", path);
  const size_t n = read_metamers(path, MAX, name, expected);
  assert_int_equal(n, 42);
  reference_path("display_metamers_spd.csv", path);
  ef_spectra *spectra = read_lights(path);
  assert_int_equal(ef_spectra_count(spectra), n);
  ef_viewing viewing = ef_viewing_default(NULL);
  viewing.absolute = true;
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_weights *weights = ef_observer_weights(
      observer, EF_TRISTIMULUS, ef_spectra_grid(spectra), &viewing, NULL, NULL);
  ef_weights_apply(weights, n, ef_spectra_values(spectra), 0, xyz, NULL);
  deviation off = {0};
  for (size_t i = 0; i < n; i++) {
    size_t index;
    assert_int_equal(ef_spectra_find(spectra, name[i], &index, NULL), EF_OK);
    for (size_t c = 0; c < 3; c++)
      deviation_add(&off, xyz[3 * index + c] - half_ends(spectra, index, c),
                    expected[3 * i + c], name[i]);
  }
  deviation_print(&off, "X, Y, Z of 42 measured colours, cd/m2");
  /* Half a unit of the fifth decimal. */
  assert_near(off.largest, 0, 0.5e-5 + 1e-12);
  ef_weights_free(weights);
  ef_observer_free(observer);
  ef_spectra_free(spectra);
}

int main(void) {
  const char *folder = getenv("EVENFIELD_REFERENCE");
  if (folder == NULL || folder[0] == '\0') {
    printf("1..0 # SKIP EVENFIELD_REFERENCE is not set, measured displays are "
           "left out\n");
    return 0;
  }
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(crt_primaries),
      cmocka_unit_test(led_lcd_primaries),
      cmocka_unit_test(tristimulus_values_of_metamers),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
