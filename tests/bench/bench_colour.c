/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pixels and colours from space to space beside lcms2's floating-point
 * transforms, and CAM16-UCS differences beside our own scalar form. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include <lcms2.h>

#include <evenfield/colour.h>
#include <evenfield/device.h>
#include <evenfield/difference.h>

#include "bench.h"
#include "gen.h"

enum { N = 1000000 };

static uint8_t *code;
static float *rgb;
static double *xyz, *sample, *out, *second;
static const ef_xyz d50 = {96.42, 100, 82.49};

/* ---- lcms2 -------------------------------------------------------------- */

typedef struct peer {
  cmsHTRANSFORM transform;
  const void *from;
} peer;

static void run_peer(void *context) {
  const peer *const p = context;
  cmsDoTransform(p->transform, p->from, out, N);
}

static peer peer_of(cmsHPROFILE from, cmsUInt32Number from_type, cmsHPROFILE to,
                    cmsUInt32Number to_type, const void *values) {
  const peer p = {cmsCreateTransform(from, from_type, to, to_type,
                                     INTENT_RELATIVE_COLORIMETRIC,
                                     cmsFLAGS_NOCACHE),
                  values};
  if (p.transform != NULL) return p;
  fprintf(stderr, "lcms2 has no such transform\n");
  exit(1);
}

/* ---- Ours --------------------------------------------------------------- */

static void run_codes(void *context) {
  ef_encoding_codes_to_lab(context, N, code, 1, out, NULL);
}

static void run_rgb(void *context) {
  ef_encoding_rgb_to_xyz(context, N, rgb, 1, out, NULL);
}

static void run_lab(void *context) {
  (void)context;
  ef_xyz_to_lab_batch(N, xyz, d50, out);
}

static void run_ucs(void *context) {
  const ef_metric *const metric = context;
  const ef_conditions conditions = ef_conditions_default(d50);
  ef_metric_coordinates_batch(metric, N, xyz, &conditions, 1, out);
  ef_metric_coordinates_batch(metric, N, sample, &conditions, 1, second);
  ef_metric_difference_batch(metric, N, out, second, 1, out);
}

static void run_ucs_scalar(void *context) {
  const ef_metric *const metric = context;
  const ef_cam_viewing viewing = ef_cam_viewing_default(d50);
  const ef_ucs_shape shape = ef_ucs_shape_default();
  ef_cam_model model;
  ef_cam_model_set(EF_CAM_16, &viewing, &model, NULL);
  for (size_t i = 0; i < N; ++i) {
    const double *const a = xyz + 3 * i, *const b = sample + 3 * i;
    const ef_ucs p = ef_cam_to_ucs(
        ef_xyz_to_cam((ef_xyz){a[0], a[1], a[2]}, &model), shape);
    const ef_ucs q = ef_cam_to_ucs(
        ef_xyz_to_cam((ef_xyz){b[0], b[1], b[2]}, &model), shape);
    const double r[3] = {p.J_prime, p.a_prime, p.b_prime};
    const double s[3] = {q.J_prime, q.a_prime, q.b_prime};
    second[i] = ef_metric_difference(metric, r, s);
  }
}

static void run_pair(const char *what, const char *peer_title,
                     bench_entry entry[2], double wanted) {
  bench_run(2, entry);
  bench_per_item(2, entry, N);
  bench_row(what, peer_title, &entry[1], &entry[0], wanted);
}

int main(void) {
  gen g = gen_new(1);
  code = bench_allocate(3 * N, sizeof *code);
  rgb = bench_allocate(3 * N, sizeof *rgb);
  xyz = bench_allocate(3 * N, sizeof *xyz);
  sample = bench_allocate(3 * N, sizeof *sample);
  out = bench_allocate(3 * N, sizeof *out);
  second = bench_allocate(3 * N, sizeof *second);
  double *const unit = bench_allocate(3 * N, sizeof *unit);
  for (size_t i = 0; i < 3 * N; ++i) {
    code[i] = (uint8_t)gen_below(&g, 256);
    rgb[i] = (float)gen_unit(&g);
  }
  /* Colours of surfaces: mixtures of the white, some of each channel. */
  for (size_t i = 0; i < 3 * N; ++i) {
    const double level = gen_between(&g, 20, 80);
    xyz[i] = level;
    sample[i] = level + gen_between(&g, -3, 3);
    unit[i] = level / 100;
  }
  const cmsHPROFILE srgb = cmsCreate_sRGBProfile();
  const cmsHPROFILE lab = cmsCreateLab4Profile(NULL);
  const cmsHPROFILE as_xyz = cmsCreateXYZProfile();
  const ef_encoding *const encoding = ef_encoding_find("srgb", NULL);
  const ef_metric *const ucs = ef_metric_find("cam16-ucs", NULL);
  void *const ours = (void *)(uintptr_t)encoding;

  peer codes = peer_of(srgb, TYPE_RGB_8, lab, TYPE_Lab_DBL, code);
  bench_entry first[2] = {{"codes_to_lab_lcms2", run_peer, &codes, false, 0},
                          {"codes_to_lab", run_codes, ours, false, 0}};
  run_pair("sRGB, 8 bits, to L*a*b*, double", "lcms2", first, 20);

  peer floats = peer_of(srgb, TYPE_RGB_FLT, as_xyz, TYPE_XYZ_DBL, rgb);
  bench_entry then[2] = {{"rgb_to_xyz_lcms2", run_peer, &floats, false, 0},
                         {"rgb_to_xyz", run_rgb, ours, false, 0}};
  run_pair("sRGB, float, to X, Y, Z, double", "lcms2", then, 7);

  peer doubles = peer_of(as_xyz, TYPE_XYZ_DBL, lab, TYPE_Lab_DBL, unit);
  bench_entry next[2] = {{"xyz_to_lab_lcms2", run_peer, &doubles, false, 0},
                         {"xyz_to_lab", run_lab, NULL, false, 0}};
  run_pair("X, Y, Z to L*a*b*, double", "lcms2", next, 5);

  bench_entry last[2] = {
      {"cam16_ucs_scalar", run_ucs_scalar, (void *)(uintptr_t)ucs, false, 0},
      {"cam16_ucs", run_ucs, (void *)(uintptr_t)ucs, false, 0}};
  run_pair("CAM16-UCS difference of X, Y, Z", "our scalar form", last, 5);
  double largest = 0;
  run_ucs((void *)(uintptr_t)ucs);
  run_ucs_scalar((void *)(uintptr_t)ucs);
  for (size_t i = 0; i < N; ++i)
    largest = fmax(largest, fabs(out[i] - second[i]));
  bench_value("cam16_ucs_error", largest, "units");
  return 0;
}
