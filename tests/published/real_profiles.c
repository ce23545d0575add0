/* SPDX-License-Identifier: GPL-3.0-or-later */
/* ICC profiles of the system: Debian's packages icc-profiles-free (RGB) and
 * libgs-common (RGB and CMYK) put some thirty under /usr/share/color/icc.
 * Matches through them against lcms2's own inverses, with every intent. Skipped
 * where the folder holds none; the environment variable EVENFIELD_ICC names
 * another. */
#include <dirent.h>
#include <stdlib.h>
#include <sys/stat.h>

#include <evenfield/difference.h>
#include <evenfield/match.h>
#include <lcms2.h>

#include "gen.h"
#include "near.h"

enum { MOST_FILES = 200, MOST_PATH = 600, INTENTS = 4, N = 100 };

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

/* ---- lcms2 alone -------------------------------------------------------- */

typedef struct file {
  const char *name;
  unsigned char *bytes;
  size_t length;
  ef_profile *profile;
  bool is_cmyk;
} file;

static file open_file(const char *at) {
  file f = {.name = name_of(at)};
  f.bytes = read_file(at, &f.length);
  f.profile = ef_profile_new(f.name, f.bytes, f.length, NULL);
  f.is_cmyk = strcmp(ef_profile_get_info(f.profile).space, "CMYK") == 0;
  return f;
}

static void close_file(file *f) {
  ef_profile_free(f->profile);
  free(f->bytes);
}

static cmsUInt32Number cms_intent(ef_intent intent) {
  static const cmsUInt32Number theirs[INTENTS] = {
      [EF_INTENT_PERCEPTUAL] = INTENT_PERCEPTUAL,
      [EF_INTENT_RELATIVE] = INTENT_RELATIVE_COLORIMETRIC,
      [EF_INTENT_SATURATION] = INTENT_SATURATION,
      [EF_INTENT_ABSOLUTE] = INTENT_ABSOLUTE_COLORIMETRIC};
  return theirs[intent];
}

/* Drives to X, Y, Z with Y = 1 for n colours, or back. Ink is counted in
 * percent. The version of the other end is 2: with 4 lcms2 scales the black of
 * perceptual and saturation unasked. */
static void through_lcms(const file *f, ef_intent intent, bool back, size_t n,
                         const double *in, double *out) {
  cmsHPROFILE device =
      cmsOpenProfileFromMem(f->bytes, (cmsUInt32Number)f->length);
  cmsHPROFILE xyz = cmsCreateXYZProfile();
  cmsSetProfileVersion(xyz, 2.1);
  const cmsUInt32Number format = f->is_cmyk ? TYPE_CMYK_DBL : TYPE_RGB_DBL;
  cmsHTRANSFORM t = cmsCreateTransform(
      back ? xyz : device, back ? TYPE_XYZ_DBL : format, back ? device : xyz,
      back ? format : TYPE_XYZ_DBL, cms_intent(intent),
      cmsFLAGS_NOOPTIMIZE | cmsFLAGS_NOCACHE);
  assert_non_null(t);
  cmsDoTransform(t, in, out, (cmsUInt32Number)n);
  cmsDeleteTransform(t);
  cmsCloseProfile(xyz);
  cmsCloseProfile(device);
}

static double off(const double *a, const double *b) {
  const ef_xyz d50 = {96.42, 100, 82.49};
  const ef_lab x =
      ef_xyz_to_lab((ef_xyz){100 * a[0], 100 * a[1], 100 * a[2]}, d50);
  const ef_lab y =
      ef_xyz_to_lab((ef_xyz){100 * b[0], 100 * b[1], 100 * b[2]}, d50);
  return ef_delta_e_ciede2000(x, y, 1, 1, 1);
}

typedef struct quality {
  size_t n;
  double mean, most;
} quality;

static void add_to(quality *q, double value) {
  q->mean = (q->mean * (double)q->n + value) / (double)(q->n + 1);
  q->most = fmax(q->most, value);
  q->n++;
}

static quality differences(size_t n, const double *a, const double *b) {
  quality q = {0};
  for (size_t i = 0; i < n; i++)
    add_to(&q, off(a + 3 * i, b + 3 * i));
  return q;
}

/* ---- Our match ---------------------------------------------------------- */

/* Drives of the nearest colours to n targets, black fixed. */
static void match_all(const file *f, ef_intent intent, double black, size_t n,
                      const double *target, double *drive) {
  static double scaled[3 * N];
  static ef_match match[N];
  ef_profile_settings settings = ef_profile_settings_default();
  settings.intent = intent;
  settings.black = black;
  ef_device *device = ef_profile_device(f->profile, &settings, NULL);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_setup *setup = ef_setup_new(device, observer, NULL, NULL, NULL);
  const ef_match_settings matching = {
      .metric = ef_metric_find("ciede2000", NULL), .jnd = NOT_A_NUMBER};
  for (size_t i = 0; i < 3 * n; i++)
    scaled[i] = target[i] * ef_setup_scale(setup);
  assert_int_equal(ef_match_batch(setup, n, scaled, &matching, 1, match, NULL),
                   EF_OK);
  for (size_t i = 0; i < n; i++)
    memcpy(drive + 3 * i, match[i].nearest.drive, 3 * sizeof *drive);
  ef_setup_free(setup);
  ef_observer_free(observer);
  ef_device_free(device);
}

/* ---- RGB ---------------------------------------------------------------- */

/* Targets are the profile's own colours of random drives, by lcms2. Our match
 * and lcms2's inverse both go forth again through lcms2. */
static void check_rgb(const file *f, quality *worst_own, quality *worst_other) {
  static double rgb[3 * N], target[3 * N], ours[3 * N], theirs[3 * N],
      from_ours[3 * N], from_theirs[3 * N];
  gen g = gen_new(3801);
  quality own = {0}, other = {0};
  for (int k = 0; k < INTENTS; k++) {
    const ef_intent intent = (ef_intent)k;
    gen_fill(&g, 3 * N, 0.02, 0.98, rgb);
    through_lcms(f, intent, false, N, rgb, target);
    match_all(f, intent, 0, N, target, ours);
    through_lcms(f, intent, true, N, target, theirs);
    through_lcms(f, intent, false, N, ours, from_ours);
    through_lcms(f, intent, false, N, theirs, from_theirs);
    add_to(&own, differences(N, target, from_ours).most);
    add_to(&other, differences(N, from_ours, from_theirs).most);
  }
  printf("# %s: our match off by %.4f CIEDE2000, from lcms2's inverse by "
         "%.4f, with 4 intents\n",
         f->name, own.most, other.most);
  add_to(worst_own, own.most);
  add_to(worst_other, other.most);
}

static void match_agrees_with_lcms_inverse(void **state) {
  (void)state;
  quality own = {0}, other = {0};
  for (size_t i = 0; i < n_files; i++) {
    file f = open_file(path[i]);
    if (strcmp(ef_profile_get_info(f.profile).space, "RGB") == 0)
      check_rgb(&f, &own, &other);
    close_file(&f);
  }
  /* lcms2 rounds drives to 16 bits before a table. */
  assert_true(own.most < 0.02);
  assert_true(other.most < 0.05);
}

/* ---- CMYK --------------------------------------------------------------- */

static const double blacks[] = {0, 0.25, 0.6};
enum { BLACKS = sizeof blacks / sizeof *blacks };

/* lcms2's Newton search for the inks of a colour with black fixed, in the
 * profile's table for the intent. */
static void newton_of_lcms(const file *f, ef_intent intent, size_t n,
                           const double *cmyk, double *found) {
  static const cmsTagSignature tags[INTENTS] = {
      [EF_INTENT_PERCEPTUAL] = cmsSigAToB0Tag,
      [EF_INTENT_RELATIVE] = cmsSigAToB1Tag,
      [EF_INTENT_SATURATION] = cmsSigAToB2Tag,
      [EF_INTENT_ABSOLUTE] = cmsSigAToB1Tag};
  cmsHPROFILE handle =
      cmsOpenProfileFromMem(f->bytes, (cmsUInt32Number)f->length);
  cmsPipeline *table = cmsReadTag(
      handle, cmsIsTag(handle, tags[intent]) ? tags[intent] : cmsSigAToB0Tag);
  assert_non_null(table);
  for (size_t i = 0; i < n; i++) {
    cmsFloat32Number in[4], colour[4], out[4];
    for (size_t c = 0; c < 4; c++)
      in[c] = (cmsFloat32Number)(cmyk[4 * i + c] / 100);
    cmsPipelineEvalFloat(in, colour, table);
    colour[3] = in[3];
    cmsPipelineEvalReverseFloat(colour, out, NULL, table);
    for (size_t c = 0; c < 4; c++)
      found[4 * i + c] = 100 * (double)out[c];
  }
  cmsCloseProfile(handle);
}

static void with_black(size_t n, const double *cmy, double black,
                       double *cmyk) {
  for (size_t i = 0; i < n; i++) {
    for (size_t c = 0; c < 3; c++)
      cmyk[4 * i + c] = 100 * cmy[3 * i + c];
    cmyk[4 * i + 3] = 100 * black;
  }
}

/* Black fixed at some levels: our match and lcms2's Newton search find the same
 * colour. Inks themselves need not be the same where a table folds. */
static void check_black_fixed(const file *f) {
  static double cmy[3 * N], cmyk[4 * N], target[3 * N], ours[3 * N],
      theirs[4 * N], from_ours[3 * N], from_theirs[3 * N];
  gen g = gen_new(3802);
  quality own = {0}, inks = {0};
  size_t n_converged = 0, n_all = 0;
  for (int k = 0; k < INTENTS * BLACKS; k++) {
    const ef_intent intent = (ef_intent)(k % INTENTS);
    const double black = blacks[k / INTENTS];
    gen_fill(&g, 3 * N, 0.02, 0.98, cmy);
    with_black(N, cmy, black, cmyk);
    through_lcms(f, intent, false, N, cmyk, target);
    newton_of_lcms(f, intent, N, cmyk, theirs);
    match_all(f, intent, black, N, target, ours);
    with_black(N, ours, black, cmyk);
    through_lcms(f, intent, false, N, cmyk, from_ours);
    through_lcms(f, intent, false, N, theirs, from_theirs);
    for (size_t i = 0; i < N; i++) {
      add_to(&own, off(target + 3 * i, from_ours + 3 * i));
      n_all++;
      if (off(target + 3 * i, from_theirs + 3 * i) > 0.02)
        continue; /* their search has not ended there */
      n_converged++;
      for (size_t c = 0; c < 3; c++)
        add_to(&inks, fabs(theirs[4 * i + c] - cmyk[4 * i + c]));
    }
  }
  printf("# %s, black fixed: our match off by %.4f CIEDE2000 at most (mean "
         "%.4f); lcms2's search ended in %zu of %zu, with inks that differ "
         "from ours by %.3f %% in the mean, at most %.2f %%\n",
         f->name, own.most, own.mean, n_converged, n_all, inks.mean, inks.most);
  /* Made-up tables of 5 points are flat where inks and black add up to more
   * than all: amounts are few digits there, and the largest is such a colour.
   * Measured tables stay below 0.01. */
  assert_true(own.mean < 0.002 && own.most < 0.3);
  assert_true(n_converged > n_all / 3);
  assert_true(inks.mean < 0.01 && inks.most < 0.5);
}

/* The profile's own way back chooses a black. With that black our match comes
 * as near to the colour, or nearer: the way back is off by what the profile's
 * two ways differ. */
static void check_way_back(const file *f) {
  enum { FEW = 12 };
  gen g = gen_new(3803);
  quality own = {0}, other = {0}, inks = {0};
  for (int k = 0; k < INTENTS * FEW; k++) {
    const ef_intent intent = (ef_intent)(k % INTENTS);
    double cmyk[4], target[3], theirs[4], ours[3], mine[4], a[3], b[3];
    gen_fill(&g, 4, 5, 75, cmyk);
    cmyk[3] *= 0.4;
    through_lcms(f, intent, false, 1, cmyk, target);
    through_lcms(f, intent, true, 1, target, theirs);
    match_all(f, intent, theirs[3] / 100, 1, target, ours);
    with_black(1, ours, theirs[3] / 100, mine);
    through_lcms(f, intent, false, 1, mine, a);
    through_lcms(f, intent, false, 1, theirs, b);
    add_to(&own, off(target, a));
    add_to(&other, off(target, b));
    for (size_t c = 0; c < 3; c++)
      add_to(&inks, fabs(theirs[c] - mine[c]));
    assert_true(off(target, a) <= off(target, b) + 0.01);
  }
  printf(
      "# %s, black of the way back: our match off by %.4f CIEDE2000 at most "
      "(mean %.4f), the way back by %.3f (mean %.3f); inks differ by %.2f %% "
      "in the mean, at most %.2f %%\n",
      f->name, own.most, own.mean, other.most, other.mean, inks.mean,
      inks.most);
}

static void inks_agree_with_lcms(void **state) {
  (void)state;
  for (size_t i = 0; i < n_files; i++) {
    file f = open_file(path[i]);
    if (f.is_cmyk) {
      check_black_fixed(&f);
      check_way_back(&f);
    }
    close_file(&f);
  }
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
      cmocka_unit_test(inks_agree_with_lcms),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
