/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "invented_profile.h"

#include "near.h"

#include <stdlib.h>

/* Relative to paper; smooth, and one to one for K below 1. */
ef_lab invented_ink_lab(double c, double m, double y, double k) {
  const double light = 1 - 0.8 * k;
  const ef_lab lab = {(100 - 38 * c - 47 * m - 9 * y + 8 * c * m + 3 * m * y) *
                          light,
                      (-31 * c + 71 * m - 6 * y + 5 * c * m) * light,
                      (-44 * c - 5 * m + 88 * y + 4 * c * y) * light};
  return lab;
}

/* What a sampler needs to know. */
typedef struct table {
  int n_inputs;
  double version; /* versions 2 and 4 encode CIELAB differently */
} table;

static cmsInt32Number sample_ink(const cmsUInt16Number in[],
                                 cmsUInt16Number out[], void *cargo) {
  const table *t = cargo;
  const ef_lab lab =
      invented_ink_lab(in[0] / 65535.0, in[1] / 65535.0, in[2] / 65535.0,
                       t->n_inputs > 3 ? in[3] / 65535.0 : 0);
  const cmsCIELab value = {lab.L_star, lab.a_star, lab.b_star};
  if (t->version < 4)
    cmsFloat2LabEncodedV2(out, &value);
  else
    cmsFloat2LabEncoded(out, &value);
  return 1;
}

/* X, Y, Z of linear light with the primaries of the standard encoding. */
static cmsInt32Number sample_light(const cmsUInt16Number in[],
                                   cmsUInt16Number out[], void *cargo) {
  static const double m[9] = {0.4361, 0.3851, 0.1431, 0.2225, 0.7169,
                              0.0606, 0.0139, 0.0971, 0.7139};
  cmsCIEXYZ xyz;
  cmsCIELab lab;
  double *const to[3] = {&xyz.X, &xyz.Y, &xyz.Z};
  (void)cargo;
  for (int r = 0; r < 3; r++)
    *to[r] = (m[3 * r] * in[0] + m[3 * r + 1] * in[1] + m[3 * r + 2] * in[2]) /
             65535.0;
  cmsXYZ2Lab(NULL, &lab, &xyz);
  cmsFloat2LabEncoded(out, &lab);
  return 1;
}

static void write_text(cmsHPROFILE profile, cmsTagSignature tag,
                       const char *text) {
  cmsMLU *mlu = cmsMLUalloc(NULL, 1);
  cmsMLUsetASCII(mlu, "en", "US", text);
  assert_true(cmsWriteTag(profile, tag, mlu));
  cmsMLUfree(mlu);
}

static cmsHPROFILE new_profile(cmsProfileClassSignature device_class,
                               cmsColorSpaceSignature space, double version) {
  cmsHPROFILE profile = cmsCreateProfilePlaceholder(NULL);
  assert_non_null(profile);
  cmsSetProfileVersion(profile, version);
  cmsSetDeviceClass(profile, device_class);
  cmsSetColorSpace(profile, space);
  cmsSetPCS(profile, cmsSigLabData);
  write_text(profile, cmsSigProfileDescriptionTag, "invented for a test");
  write_text(profile, cmsSigCopyrightTag, "none");
  return profile;
}

static void write_table(cmsHPROFILE profile, cmsTagSignature tag, table t,
                        int n_points, cmsSAMPLER16 sampler) {
  const cmsUInt32Number n = (cmsUInt32Number)t.n_inputs;
  cmsPipeline *pipeline = cmsPipelineAlloc(NULL, n, 3);
  cmsStage *grid =
      cmsStageAllocCLut16bit(NULL, (cmsUInt32Number)n_points, n, 3, NULL);
  assert_true(cmsStageSampleCLut16bit(grid, sampler, &t, 0));
  assert_true(cmsPipelineInsertStage(pipeline, cmsAT_END,
                                     cmsStageAllocToneCurves(NULL, n, NULL)));
  assert_true(cmsPipelineInsertStage(pipeline, cmsAT_END, grid));
  assert_true(cmsPipelineInsertStage(pipeline, cmsAT_END,
                                     cmsStageAllocToneCurves(NULL, 3, NULL)));
  assert_true(cmsWriteTag(profile, tag, pipeline));
  cmsPipelineFree(pipeline);
}

static made_profile save(cmsHPROFILE profile) {
  made_profile made;
  cmsUInt32Number size = 0;
  assert_true(cmsSaveProfileToMem(profile, NULL, &size));
  made.bytes = malloc(size);
  assert_true(cmsSaveProfileToMem(profile, made.bytes, &size));
  made.length = size;
  cmsCloseProfile(profile);
  return made;
}

made_profile make_ink_profile(cmsColorSpaceSignature space, double version) {
  static const cmsTagSignature tags[3] = {cmsSigAToB0Tag, cmsSigAToB1Tag,
                                          cmsSigAToB2Tag};
  const table t = {space == cmsSigCmykData ? 4 : 3, version};
  cmsHPROFILE profile = new_profile(cmsSigOutputClass, space, version);
  const cmsCIEXYZ paper = {0.80, 0.83, 0.71};
  assert_true(cmsWriteTag(profile, cmsSigMediaWhitePointTag, &paper));
  for (int i = 0; i < 3; i++)
    write_table(profile, tags[i], t, 9, sample_ink);
  return save(profile);
}

made_profile make_table_profile(cmsColorSpaceSignature space,
                                cmsProfileClassSignature device_class) {
  cmsHPROFILE profile = new_profile(device_class, space, 4.3);
  assert_true(cmsWriteTag(profile, cmsSigMediaWhitePointTag, cmsD50_XYZ()));
  write_table(profile, cmsSigAToB0Tag, (table){3, 4.3}, 17, sample_light);
  return save(profile);
}

made_profile make_grey_profile(void) {
  cmsHPROFILE profile = new_profile(cmsSigDisplayClass, cmsSigGrayData, 4.3);
  cmsToneCurve *curve = cmsBuildGamma(NULL, 2.2);
  assert_true(cmsWriteTag(profile, cmsSigMediaWhitePointTag, cmsD50_XYZ()));
  assert_true(cmsWriteTag(profile, cmsSigGrayTRCTag, curve));
  cmsFreeToneCurve(curve);
  return save(profile);
}
