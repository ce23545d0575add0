/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pictures in a published encoding to colours, many pixels at a time. */
#include "device/device_private.h"

#include "base/base_private.h"
#include "kernel/kernels.h"

/* An encoding ready for the kernels. */
typedef struct decoder {
  double tone[4];  /* gamma, offset, slope, joint */
  double matrix[9];
  double level[256]; /* of each 8-bit code */
} decoder;

typedef struct work {
  const decoder *decoder;
  const uint8_t *code;
  const float *rgb;
  double *out;
} work;

enum { CHUNK = 32768 }; /* pixels: 0.1 to 0.3 ms */

/* Row i of the matrix is multiplied by factor[i]. */
static ef_status decoder_set(const ef_encoding *encoding,
                             const double factor[3], decoder *out,
                             ef_error *error) {
  const ef_status status = ef_encoding_matrix(encoding, out->matrix, error);
  if (status != EF_OK)
    return status;
  for (int i = 0; i < 9; ++i)
    out->matrix[i] *= factor[i / 3];
  ef_error failure = {0};
  ef_tone_curve *const curve = ef_tone_curve_new(encoding->tone, &failure);
  if (curve == NULL)
    return ef__error_set(error, failure.status, "%s", failure.message);
  ef__parametric form = {0};
  (void)ef__tone_curve_parametric(curve, &form); /* all encodings' are */
  out->tone[0] = form.gamma;
  out->tone[1] = form.offset;
  out->tone[2] = form.slope;
  out->tone[3] = form.joint;
  for (int i = 0; i < 256; ++i)
    out->level[i] = ef_tone_curve_amount(curve, i / 255.0, NULL);
  ef_tone_curve_free(curve);
  return EF_OK;
}

static void codes_range(void *context, size_t begin, size_t end) {
  const work *const w = context;
  ef__kernels()->codes_to_lab(end - begin, w->code + 3 * begin,
                              w->decoder->level, w->decoder->matrix,
                              w->out + 3 * begin);
}

static void rgb_range(void *context, size_t begin, size_t end) {
  const work *const w = context;
  ef__kernels()->rgb_to_xyz(end - begin, w->rgb + 3 * begin, w->decoder->tone,
                            w->decoder->matrix, w->out + 3 * begin);
}

/* All pixels of `w`, whose decoder is made here. */
static ef_status decode(const ef_encoding *encoding, const double factor[3],
                        size_t n, int jobs,
                        void (*range)(void *, size_t, size_t), work *w,
                        ef_error *error) {
  decoder d;
  const ef_status status = decoder_set(encoding, factor, &d, error);
  if (status != EF_OK)
    return status;
  w->decoder = &d;
  ef__parallel_for(n, CHUNK, jobs, range, w);
  return EF_OK;
}

ef_status ef_encoding_codes_to_lab(const ef_encoding *encoding, size_t n,
                                   const uint8_t *rgb, int jobs, double *lab,
                                   ef_error *error) {
  const ef_xy white = encoding->white;
  /* The white has Y = 1; Lab is relative to it. */
  const double factor[3] = {white.y / white.x, 1,
                            white.y / (1 - white.x - white.y)};
  work w = {.code = rgb, .out = lab};
  return decode(encoding, factor, n, jobs, codes_range, &w, error);
}

ef_status ef_encoding_rgb_to_xyz(const ef_encoding *encoding, size_t n,
                                 const float *rgb, int jobs, double *xyz,
                                 ef_error *error) {
  const double factor[3] = {100, 100, 100};
  work w = {.rgb = rgb, .out = xyz};
  return decode(encoding, factor, n, jobs, rgb_range, &w, error);
}
