/* SPDX-License-Identifier: GPL-3.0-or-later */
/* MacLeod-Boynton chromaticity, CIE 170-2:2015 (MacLeod & Boynton
 * 1979, doi 10.1364/JOSA.69.001183). */
#include <evenfield/colour.h>

#include <math.h>

ef_mb ef_lms_to_mb(ef_lms lms, ef_mb_scale scale) {
  const double luminance = scale.k_l * lms.cone_l + scale.k_m * lms.cone_m;
  if (!(luminance > 0)) {
    return (ef_mb){(double)NAN, (double)NAN, luminance};
  }
  return (ef_mb){scale.k_l * lms.cone_l / luminance,
                 scale.k_s * lms.cone_s / luminance, luminance};
}

ef_lms ef_mb_to_lms(ef_mb mb, ef_mb_scale scale) {
  if (mb.luminance == 0) return (ef_lms){0, 0, 0};
  return (ef_lms){mb.mb_l * mb.luminance / scale.k_l,
                  (1 - mb.mb_l) * mb.luminance / scale.k_m,
                  mb.mb_s * mb.luminance / scale.k_s};
}
