/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Profiles made of displays: their structure, byte by byte as ICC.1 has it, and
 * what lcms2 reads from them. */
#include <stdlib.h>

#include <evenfield/device.h>
#include <evenfield/difference.h>
#include <evenfield/exchange.h>
#include <lcms2.h>

#include "device/device_private.h"
#include "fail_alloc.h"
#include "gen.h"
#include "invented_display.h"
#include "invented_print.h"
#include "near.h"

static char noted[2000];

static void keep_note(void *cookie, const char *line) {
  (void)cookie;
  const size_t used = strlen(noted);
  snprintf(noted + used, sizeof noted - used, "%s\n", line);
}

static const ef_notes sink = {keep_note, NULL};

typedef struct made {
  unsigned char *bytes;
  size_t length;
} made;

static made make(const ef_device *display) {
  made m;
  ef_error error;
  noted[0] = '\0';
  if (ef_profile_make_display("ticket kiosk", display, &sink, &m.bytes,
                              &m.length, &error) != EF_OK)
    fail_msg("%s", error.message);
  return m;
}

/* ---- Structure ----------------------------------------------------------- */

static size_t u32(const unsigned char *at) {
  return (size_t)at[0] << 24 | (size_t)at[1] << 16 | (size_t)at[2] << 8 | at[3];
}

static double s15f16(const unsigned char *at) {
  return (double)(int32_t)(uint32_t)u32(at) / 65536;
}

/* The tag's data; its length; NULL when there is none. */
static const unsigned char *find_tag(const made *m, const char *tag,
                                     size_t *length) {
  const size_t n = u32(m->bytes + 128);
  for (size_t i = 0; i < n; i++) {
    const unsigned char *entry = m->bytes + 132 + 12 * i;
    if (memcmp(entry, tag, 4) != 0)
      continue;
    const size_t at = u32(entry + 4), size = u32(entry + 8);
    assert_true(at % 4 == 0 && at >= 132 + 12 * n && at + size <= m->length);
    if (length != NULL)
      *length = size;
    return m->bytes + at;
  }
  return NULL;
}

/* Header (7.2), the tags that a display profile of three components needs (8.4)
 * and the types they have to be of (clause 9). */
static void structure_is_that_of_the_standard(void **state) {
  (void)state;
  static const char *const needed[][2] = {
      {"desc", "mluc"}, {"cprt", "mluc"}, {"wtpt", "XYZ "}, {"chad", "sf32"},
      {"rXYZ", "XYZ "}, {"gXYZ", "XYZ "}, {"bXYZ", "XYZ "}, {"lumi", "XYZ "}};
  static const char *const curves[] = {"rTRC", "gTRC", "bTRC"};
  ef_device *display = invented_display(true);
  const made m = make(display);
  const unsigned char *b = m.bytes;
  assert_int_equal(u32(b), m.length);
  assert_int_equal(m.length % 4, 0);
  assert_int_equal(b[8], 4);
  assert_memory_equal(b + 12, "mntrRGB XYZ ", 12);
  assert_memory_equal(b + 36, "acsp", 4);
  assert_near(s15f16(b + 68), 0.9642, 1e-5);
  assert_near(s15f16(b + 72), 1, 0);
  assert_near(s15f16(b + 76), 0.8249, 1e-5);
  for (size_t i = 0; i < sizeof needed / sizeof *needed; i++) {
    const unsigned char *tag = find_tag(&m, needed[i][0], NULL);
    if (tag == NULL)
      fail_msg("no tag %s", needed[i][0]);
    assert_memory_equal(tag, needed[i][1], 4);
    assert_int_equal(u32(tag + 4), 0);
  }
  for (size_t i = 0; i < 3; i++) {
    size_t length;
    const unsigned char *tag = find_tag(&m, curves[i], &length);
    assert_memory_equal(tag, "curv", 4);
    assert_int_equal(u32(tag + 8), 4096);
    assert_int_equal(length, 12 + 2 * 4096);
  }
  free(m.bytes);
  ef_device_free(display);
}

static void read_xyz(const made *m, const char *tag, double xyz[3]) {
  const unsigned char *at = find_tag(m, tag, NULL);
  for (int c = 0; c < 3; c++)
    xyz[c] = s15f16(at + 8 + 4 * c);
}

/* `chad` takes the measured white to D50 as linear Bradford does, the columns
 * sum to D50, the media white is D50, and `lumi` is the luminance. */
static void white_is_at_d50(void **state) {
  (void)state;
  ef_device *display = invented_display(true);
  const made m = make(display);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_setup *setup = ef_setup_new(display, observer, NULL, NULL, NULL);
  double sum[3] = {0}, column[3], matrix[9];
  static const char *const columns[] = {"rXYZ", "gXYZ", "bXYZ"};
  for (int i = 0; i < 3; i++) {
    read_xyz(&m, columns[i], column);
    for (int c = 0; c < 3; c++)
      sum[c] += column[c];
  }
  assert_near(sum[0], 0.9642, 4 / 65536.0);
  assert_near(sum[1], 1, 4 / 65536.0);
  assert_near(sum[2], 0.8249, 4 / 65536.0);
  read_xyz(&m, "wtpt", column);
  assert_near(column[0], 0.9642, 1e-5);
  read_xyz(&m, "lumi", column);
  assert_near(column[1], ef_setup_luminance_cd_m2(setup), 1e-4);
  ef_adaptation_matrix(EF_ADAPT_BRADFORD, ef_setup_white(setup),
                       (ef_xyz){96.42, 100, 82.49}, matrix, NULL);
  const unsigned char *chad = find_tag(&m, "chad", NULL);
  for (int k = 0; k < 9; k++)
    assert_near(s15f16(chad + 8 + 4 * k), matrix[k], 2e-4);
  ef_setup_free(setup);
  ef_observer_free(observer);
  free(m.bytes);
  ef_device_free(display);
}

/* ---- Read back ----------------------------------------------------------- */

/* What lcms2 makes of n drives, X, Y, Z with Y = 100. */
static void read_back(const made *m, size_t n, const double *drive,
                      double *xyz) {
  cmsHPROFILE from =
      cmsOpenProfileFromMem(m->bytes, (cmsUInt32Number)m->length);
  cmsHPROFILE to = cmsCreateXYZProfile();
  assert_non_null(from);
  cmsHTRANSFORM t =
      cmsCreateTransform(from, TYPE_RGB_DBL, to, TYPE_XYZ_DBL,
                         INTENT_RELATIVE_COLORIMETRIC, cmsFLAGS_NOOPTIMIZE);
  assert_non_null(t);
  cmsDoTransform(t, drive, xyz, (cmsUInt32Number)n);
  for (size_t i = 0; i < 3 * n; i++)
    xyz[i] *= 100;
  cmsDeleteTransform(t);
  cmsCloseProfile(to);
  cmsCloseProfile(from);
}

/* Largest CIEDE2000 difference between what was measured, its white at D50 by
 * linear Bradford, and what lcms2 reads. */
static double worst_difference(const made *m, size_t n, const double *drive,
                               const ef_xyz *measured, ef_xyz white) {
  const ef_xyz d50 = {96.42, 100, 82.49};
  double matrix[9], worst = 0;
  double *xyz = malloc(3 * n * sizeof *xyz);
  ef_adaptation_matrix(EF_ADAPT_BRADFORD, white, d50, matrix, NULL);
  read_back(m, n, drive, xyz);
  for (size_t i = 0; i < n; i++) {
    const ef_lab a = ef_xyz_to_lab(ef_xyz_transform(matrix, measured[i]), d50);
    const ef_lab b = ef_xyz_to_lab(
        (ef_xyz){xyz[3 * i], xyz[3 * i + 1], xyz[3 * i + 2]}, d50);
    worst = fmax(worst, ef_delta_e_ciede2000(a, b, 1, 1, 1));
  }
  free(xyz);
  return worst;
}

/* The display measured: corners, ramps, greys and mixtures. */
static void made_profile_gives_the_measured_colours(void **state) {
  (void)state;
  enum { N = 400 };
  static double drive[3 * N];
  static ef_xyz measured[N];
  gen g = gen_new(3701);
  ef_device *display = invented_display(true);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_setup *setup = ef_setup_new(display, observer, NULL, NULL, NULL);
  const made m = make(display);
  for (size_t i = 0; i < N; i++) {
    double amount[3];
    for (size_t c = 0; c < 3; c++) {
      const double level = (double)(i / 8) / (N / 8 - 1);
      drive[3 * i + c] =
          i % 8 < 7 ? ((i % 8 + 1) >> c & 1 ? level : 0) : gen_unit(&g);
      amount[c] = ef_device_amount(display, c, drive[3 * i + c], NULL);
    }
    measured[i] = ef_setup_xyz(setup, amount, NULL);
  }
  const double worst =
      worst_difference(&m, N, drive, measured, ef_setup_white(setup));
  printf("# %d colours of a display with black, read back by lcms2: largest "
         "CIEDE2000 %.4f\n",
         N, worst);
  assert_true(worst < 0.05);
  assert_string_equal(noted, "");
  free(m.bytes);
  ef_setup_free(setup);
  ef_observer_free(observer);
  ef_device_free(display);
}

/* The kiosk of the scenario, from its measurements: noise, ramps and all. What
 * the display itself does not add up is no fault of the profile. */
static void kiosk_is_profiled(void **state) {
  (void)state;
  size_t length = 0;
  const char *text = NULL;
  ef_error error;
  for (size_t i = 0; i < ef_demo_count(); i++)
    if (strcmp(ef_demo_name(i), "kiosk-measurements") == 0)
      text = ef_demo_text(i, &length);
  assert_non_null(text);
  ef_reader *reader = ef_reader_from_text("kiosk", text, length, NULL, &error);
  ef_block block;
  assert_int_equal(ef_reader_next(reader, 1000, &block, &error), EF_OK);
  const ef_reader_head *head = ef_reader_get_head(reader);
  ef_measurements table = {.n_rows = block.n,
                           .n_drives = 3,
                           .drive = block.device,
                           .absolute = head->absolute};
  if (head->content == EF_CONTENT_SPECTRA) {
    table.spectrum = block.value;
    table.grid = head->grid;
  } else {
    table.xyz = block.value;
  }
  ef_device *display =
      ef_display_from_measurements("kiosk", &table, NULL, NULL, NULL, &error);
  assert_non_null(display);
  const made m = make(display);
  ef_profile *profile = ef_profile_new("kiosk", m.bytes, m.length, &error);
  assert_non_null(profile);
  assert_string_equal(ef_profile_get_info(profile).missing, "");
  static ef_residual residual[1000];
  assert_int_equal(ef_profile_check(profile, &table, NULL, residual, &error),
                   EF_OK);
  double worst_single = 0, worst_mixture = 0;
  for (size_t r = 0; r < block.n; r++) {
    const double *d = block.device + 3 * r;
    const double off = ef_delta_e_ciede2000(
        ef_xyz_to_lab(residual[r].measured, residual[r].white),
        ef_xyz_to_lab(residual[r].predicted, residual[r].white), 1, 1, 1);
    const bool is_single = (d[0] > 0) + (d[1] > 0) + (d[2] > 0) < 2;
    double *worst = is_single ? &worst_single : &worst_mixture;
    *worst = fmax(*worst, off);
  }
  printf("# kiosk: single channels to %.3f CIEDE2000, mixtures to %.3f\n",
         worst_single, worst_mixture);
  assert_true(worst_single < 0.5);
  assert_true(worst_mixture < 1.5);
  ef_profile_free(profile);
  free(m.bytes);
  ef_device_free(display);
  ef_reader_free(reader);
}

/* A display without black keeps its closed curves: `para`, exact. */
static void closed_curves_stay_closed(void **state) {
  (void)state;
  ef_device *display = ef_display_from_encoding("p3-d65", NULL, NULL);
  const made m = make(display);
  assert_memory_equal(find_tag(&m, "gTRC", NULL), "para", 4);
  assert_null(find_tag(&m, "lumi", NULL));
  made again;
  assert_int_equal(ef_profile_make_display("ticket kiosk", display, NULL,
                                           &again.bytes, &again.length, NULL),
                   EF_OK);
  assert_int_equal(again.length, m.length);
  assert_memory_equal(again.bytes, m.bytes, m.length);
  free(again.bytes);
  free(m.bytes);
  ef_device_free(display);
}

/* A black that is no mixture of the primaries: as near as they come, and a note
 * says by how much. */
static void foreign_black_is_noted(void **state) {
  (void)state;
  double light[4 * INVENTED_SAMPLES];
  static const char *const names[] = {"black", "red", "green", "blue"};
  const ef_grid grid = invented_grid();
  ef_error error;
  double black[INVENTED_SAMPLES];
  invented_lights(light);
  invented_bell(3e-4, 500, 6, black); /* a green outside of them all */
  for (size_t i = 0; i < 4; i++)
    for (size_t s = 0; s < INVENTED_SAMPLES; s++)
      light[i * INVENTED_SAMPLES + s] += black[s];
  ef_spectra *spectra = ef_spectra_new(4, names, &grid, EF_LIGHT, light, NULL);
  ef_device *display = ef_display_from_spectra("kiosk", spectra, NULL, &error);
  assert_non_null(display);
  const made m = make(display);
  assert_non_null(strstr(noted, "kiosk: the black is no mixture of the "
                                "primaries, which is all that a matrix profile "
                                "can say; left out of it (white Y = 100): X "));
  double xyz[3];
  const double none[3] = {0};
  read_back(&m, 1, none, xyz);
  assert_true(xyz[1] > 0);
  free(m.bytes);
  ef_device_free(display);
  ef_spectra_free(spectra);
}

/* ---- What is refused ----------------------------------------------------- */

static void refuse(const char *description, const ef_device *device,
                   ef_status status, const char *message) {
  made m;
  ef_error error = {0};
  assert_int_equal(ef_profile_make_display(description, device, NULL, &m.bytes,
                                           &m.length, &error),
                   status);
  assert_string_equal(error.message, message);
}

static void devices_without_a_matrix(void **state) {
  (void)state;
  double primary[8 * PRINT_SAMPLES];
  const ef_grid grid = print_grid();
  print_primaries(3, primary);
  ef_device *print =
      ef_halftone_new("leaflet", NULL, &grid, primary, NULL, NULL);
  refuse("x", print, EF_NO_ANSWER,
         "'leaflet' (halftone) reflects light; a matrix profile describes "
         "displays");
  ef_device_free(print);
  double light[4 * INVENTED_SAMPLES];
  static const char *const names[] = {"a", "b", "c", "d"};
  const ef_grid samples = invented_grid();
  invented_lights(light);
  ef_spectra *spectra =
      ef_spectra_new(4, names, &samples, EF_LIGHT, light, NULL);
  ef_device *four = ef_display_from_spectra("quad", spectra, NULL, NULL);
  refuse("x", four, EF_NO_ANSWER,
         "'quad' has 4 primaries; a matrix profile has 3");
  ef_device_free(four);
  ef_spectra_free(spectra);
  ef_device *display = invented_display(false);
  refuse("caf\xC3\xA9", display, EF_INVALID,
         "the description of a profile must be plain ASCII");
  refuse(NULL, display, EF_INVALID,
         "a profile needs a description, a display and a place for its bytes");
  ef_device_free(display);
}

static bool attempt(void *context) {
  made m = {NULL, 0};
  const ef_status status =
      ef_profile_make_display("x", context, NULL, &m.bytes, &m.length, NULL);
  assert_true(status == EF_OK || status == EF_NO_MEMORY);
  free(m.bytes);
  return status == EF_OK;
}

static void no_memory(void **state) {
  (void)state;
  ef_device *display = invented_display(true);
  assert_true(fail_alloc_each(attempt, display) > 3);
  ef_device_free(display);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(structure_is_that_of_the_standard),
      cmocka_unit_test(white_is_at_d50),
      cmocka_unit_test(made_profile_gives_the_measured_colours),
      cmocka_unit_test(kiosk_is_profiled),
      cmocka_unit_test(closed_curves_stay_closed),
      cmocka_unit_test(foreign_black_is_noted),
      cmocka_unit_test(devices_without_a_matrix),
      cmocka_unit_test(no_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
