/* SPDX-License-Identifier: GPL-3.0-or-later */
/* ICC profiles of the system: Debian's packages icc-profiles-free and
 * libgs-common put some thirty under /usr/share/color/icc. Matches through them
 * against lcms2's own inverse. Skipped where the folder holds none; the
 * environment variable EVENFIELD_ICC names another. */
#include <dirent.h>
#include <stdlib.h>
#include <sys/stat.h>

#include <evenfield/difference.h>
#include <evenfield/match.h>
#include <lcms2.h>

#include "gen.h"
#include "near.h"

enum { MOST_FILES = 200, MOST_PATH = 600, N = 300 };

static char path[MOST_FILES][MOST_PATH];
static size_t n_files;

static bool has_ending(const char *name) {
  const size_t length = strlen(name);
  if (length < 5 || name[length - 4] != '.')
    return false;
  const char *e = name + length - 3;
  return (e[0] | 32) == 'i' && (e[1] | 32) == 'c' &&
         ((e[2] | 32) == 'c' || (e[2] | 32) == 'm');
}

static void list_files(const char *folder, int depth) {
  DIR *directory = opendir(folder);
  if (directory == NULL)
    return;
  for (struct dirent *entry; (entry = readdir(directory)) != NULL;) {
    char at[MOST_PATH];
    struct stat about;
    if (entry->d_name[0] == '.' || n_files == MOST_FILES)
      continue;
    if (snprintf(at, sizeof at, "%s/%s", folder, entry->d_name) >= MOST_PATH)
      continue;
    if (stat(at, &about) != 0)
      continue;
    if (S_ISDIR(about.st_mode) && depth > 0)
      list_files(at, depth - 1);
    else if (S_ISREG(about.st_mode) && has_ending(entry->d_name))
      memcpy(path[n_files++], at, sizeof at);
  }
  closedir(directory);
}

static unsigned char *read_file(const char *at, size_t *length) {
  FILE *file = fopen(at, "rb");
  assert_non_null(file);
  fseek(file, 0, SEEK_END);
  *length = (size_t)ftell(file);
  rewind(file);
  unsigned char *bytes = malloc(*length + 1);
  assert_int_equal(fread(bytes, 1, *length, file), *length);
  fclose(file);
  return bytes;
}

static const char *name_of(const char *at) {
  return strrchr(at, '/') + 1;
}

/* Every file is read and says what it is; those that can serve do, with every
 * intent, and the others say why not. */
static void every_profile_is_read(void **state) {
  (void)state;
  size_t n_served = 0;
  for (size_t i = 0; i < n_files; i++) {
    size_t length;
    ef_error error = {0};
    unsigned char *bytes = read_file(path[i], &length);
    ef_profile *profile =
        ef_profile_new(name_of(path[i]), bytes, length, &error);
    if (profile == NULL)
      fail_msg("%s: %s", path[i], error.message);
    const ef_profile_info info = ef_profile_get_info(profile);
    const bool is_served =
        strcmp(info.space, "RGB") == 0 || strcmp(info.space, "CMYK") == 0;
    for (int k = 0; k < 4; k++) {
      ef_profile_settings settings = ef_profile_settings_default();
      settings.intent = (ef_intent)k;
      ef_device *device = ef_profile_device(profile, &settings, &error);
      assert_true((device != NULL) == is_served);
      if (device == NULL)
        assert_int_equal(error.status, EF_NO_ANSWER);
      ef_device_free(device);
    }
    n_served += is_served;
    ef_profile_free(profile);
    free(bytes);
  }
  printf("# %zu profiles read, %zu of them RGB or CMYK\n", n_files, n_served);
  assert_true(n_served > 0);
}

/* lcms2 alone, from bytes: drives to X, Y, Z, or back. */
static void through_lcms(const unsigned char *bytes, size_t length, bool back,
                         size_t n, const double *in, double *out) {
  cmsHPROFILE device = cmsOpenProfileFromMem(bytes, (cmsUInt32Number)length);
  cmsHPROFILE xyz = cmsCreateXYZProfile();
  cmsHTRANSFORM t = cmsCreateTransform(
      back ? xyz : device, back ? TYPE_XYZ_DBL : TYPE_RGB_DBL,
      back ? device : xyz, back ? TYPE_RGB_DBL : TYPE_XYZ_DBL,
      INTENT_RELATIVE_COLORIMETRIC, cmsFLAGS_NOOPTIMIZE | cmsFLAGS_NOCACHE);
  assert_non_null(t);
  cmsDoTransform(t, in, out, (cmsUInt32Number)n);
  cmsDeleteTransform(t);
  cmsCloseProfile(xyz);
  cmsCloseProfile(device);
}

static double largest_difference(size_t n, const double *a, const double *b) {
  const ef_xyz d50 = {96.42, 100, 82.49};
  double worst = 0;
  for (size_t i = 0; i < n; i++) {
    const ef_lab x = ef_xyz_to_lab(
        (ef_xyz){100 * a[3 * i], 100 * a[3 * i + 1], 100 * a[3 * i + 2]}, d50);
    const ef_lab y = ef_xyz_to_lab(
        (ef_xyz){100 * b[3 * i], 100 * b[3 * i + 1], 100 * b[3 * i + 2]}, d50);
    worst = fmax(worst, ef_delta_e_ciede2000(x, y, 1, 1, 1));
  }
  return worst;
}

/* Targets are the profile's own colours of random drives, by lcms2. Our match
 * and lcms2's inverse both go forth again through lcms2. */
static void check_inverse(const char *at, double *worst_own,
                          double *worst_other) {
  static double rgb[3 * N], target[3 * N], scaled[3 * N], ours[3 * N],
      theirs[3 * N], from_ours[3 * N], from_theirs[3 * N];
  static ef_match match[N];
  gen g = gen_new(3801);
  size_t length;
  unsigned char *bytes = read_file(at, &length);
  ef_profile *profile = ef_profile_new(name_of(at), bytes, length, NULL);
  if (strcmp(ef_profile_get_info(profile).space, "RGB") != 0) {
    ef_profile_free(profile);
    free(bytes);
    return;
  }
  ef_device *device = ef_profile_device(profile, NULL, NULL);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_setup *setup = ef_setup_new(device, observer, NULL, NULL, NULL);
  const ef_match_settings settings = {
      .metric = ef_metric_find("ciede2000", NULL), .jnd = NOT_A_NUMBER};
  gen_fill(&g, 3 * N, 0.02, 0.98, rgb);
  through_lcms(bytes, length, false, N, rgb, target);
  for (size_t i = 0; i < 3 * N; i++)
    scaled[i] = target[i] * ef_setup_scale(setup);
  assert_int_equal(ef_match_batch(setup, N, scaled, &settings, 1, match, NULL),
                   EF_OK);
  for (size_t i = 0; i < N; i++)
    memcpy(ours + 3 * i, match[i].nearest.drive, 3 * sizeof *ours);
  through_lcms(bytes, length, true, N, target, theirs);
  through_lcms(bytes, length, false, N, ours, from_ours);
  through_lcms(bytes, length, false, N, theirs, from_theirs);
  const double own = largest_difference(N, target, from_ours);
  const double other = largest_difference(N, from_ours, from_theirs);
  printf(
      "# %s: our match off by %.4f CIEDE2000, from lcms2's inverse by %.4f\n",
      name_of(at), own, other);
  *worst_own = fmax(*worst_own, own);
  *worst_other = fmax(*worst_other, other);
  ef_setup_free(setup);
  ef_observer_free(observer);
  ef_device_free(device);
  ef_profile_free(profile);
  free(bytes);
}

static void match_agrees_with_lcms_inverse(void **state) {
  (void)state;
  double worst_own = 0, worst_other = 0;
  for (size_t i = 0; i < n_files; i++)
    check_inverse(path[i], &worst_own, &worst_other);
  /* lcms2 rounds drives to 16 bits before a table. */
  assert_true(worst_own < 0.02);
  assert_true(worst_other < 0.05);
}

int main(void) {
  const char *folder = getenv("EVENFIELD_ICC");
  if (folder == NULL || folder[0] == '\0')
    folder = "/usr/share/color/icc";
  list_files(folder, 2);
  if (n_files == 0) {
    printf("1..0 # SKIP no ICC profiles in %s, they are left out\n", folder);
    return 0;
  }
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(every_profile_is_read),
      cmocka_unit_test(match_agrees_with_lcms_inverse),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
