/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Colours to codes of a published encoding. The nearest code is found among the
 * levels at which codes change, so that it is the exact one for any curve. */
#include "image/image_private.h"

#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"

enum { SLOTS = 65536 };

struct ef_encoder {
  const ef_encoding *encoding;
  double matrix[9]; /* XYZ to levels, 1 for full */
  int most;         /* code of full */
  int step;         /* of a code in 16-bit range */
  double low, high; /* levels beyond these are clipped */
  uint16_t *first;  /* SLOTS + 1: changes below each slot of levels */
  double *change;   /* `most` levels; below change[c] lies code c or less */
};

const ef_encoding *ef__encoder_encoding(const ef_encoder *encoder) {
  return encoder->encoding;
}

int ef__encoder_bits(const ef_encoder *encoder) {
  return encoder->most == 255 ? 8 : 16;
}

static ef_status set_matrix(ef_encoder *e, ef_xyz white,
                            ef_adaptation adaptation, ef_error *error) {
  double to_xyz[9], from_xyz[9], adapt[9];
  const ef_xy own = e->encoding->white;
  if (!(white.Y > 0.0) || !isfinite(white.X) || !isfinite(white.Z))
    return ef__error_set(error, EF_INVALID,
                         "the white of a picture needs a luminance");
  ef_status status = ef_encoding_matrix(e->encoding, to_xyz, error);
  if (status != EF_OK)
    return status;
  (void)ef__mat3_inverse(to_xyz, from_xyz); /* its primaries are independent */
  const double scale = 1.0 / white.Y;
  status = ef_adaptation_matrix(
      adaptation, (ef_xyz){scale * white.X, 1.0, scale * white.Z},
      ef_xyy_to_xyz((ef_xyy){own.x, own.y, 1.0}), adapt, error);
  if (status != EF_OK)
    return status;
  ef__mat3_multiply(from_xyz, adapt, e->matrix);
  for (int i = 0; i < 9; ++i)
    e->matrix[i] *= scale;
  return EF_OK;
}

static ef_status set_changes(ef_encoder *e, ef_error *error) {
  ef_error reason = {0};
  ef_tone_curve *curve = ef_tone_curve_new(e->encoding->tone, &reason);
  if (curve == NULL)
    return ef__error_set(error, reason.status, "%s", reason.message);
  for (int c = 0; c < e->most; ++c)
    e->change[c] = ef_tone_curve_amount(curve, (c + 0.5) / e->most, NULL);
  ef_tone_curve_free(curve);
  int c = 0;
  for (int slot = 0; slot <= SLOTS; ++slot) {
    while (c < e->most && e->change[c] * SLOTS < slot)
      ++c;
    e->first[slot] = (uint16_t)c;
  }
  /* Half a code; steep curves have less than noise there. */
  e->low = -fmax(e->change[0], 1e-6);
  e->high = 2.0 - e->change[e->most - 1];
  return EF_OK;
}

ef_encoder *ef_encoder_new(const ef_encoding *encoding, ef_xyz white,
                           ef_adaptation adaptation, int bits,
                           ef_error *error) {
  if (bits != 8 && bits != 16) {
    ef__error_set(error, EF_INVALID, "pictures have 8 or 16 bits, not %d",
                  bits);
    return NULL;
  }
  ef_encoder *e = ef__allocate_zeroed(1, sizeof *e);
  if (e == NULL) {
    ef__error_memory(error, "an encoding");
    return NULL;
  }
  e->encoding = encoding;
  e->most = bits == 8 ? 255 : 65535;
  e->step = 65535 / e->most;
  e->first = ef__allocate(SLOTS + 1, sizeof *e->first);
  e->change = ef__allocate((size_t)e->most, sizeof *e->change);
  ef_status status = e->first != NULL && e->change != NULL
                         ? set_matrix(e, white, adaptation, error)
                         : ef__error_memory(error, "an encoding");
  if (status == EF_OK)
    status = set_changes(e, error);
  if (status == EF_OK)
    return e;
  ef_encoder_free(e);
  return NULL;
}

void ef_encoder_free(ef_encoder *encoder) {
  if (encoder == NULL)
    return;
  free(encoder->first);
  free(encoder->change);
  free(encoder);
}

/* The code of a level in [0, 1]: how many changes are not above it. */
static int code_of(const ef_encoder *e, double level) {
  const int slot = (int)(level * SLOTS);
  int low = e->first[slot], high = slot < SLOTS ? e->first[slot + 1] : e->most;
  while (low < high) {
    const int middle = (low + high) / 2;
    if (e->change[middle] <= level)
      low = middle + 1;
    else
      high = middle;
  }
  return low;
}

void ef_encoder_apply(const ef_encoder *encoder, size_t n, const double *xyz,
                      uint16_t *sample, ef_clipped *clipped) {
  const ef_encoder *const e = encoder;
  for (size_t i = 0; i < n; ++i, xyz += 3, sample += 3) {
    bool is_clipped = false, is_bright = false;
    for (int c = 0; c < 3; ++c) {
      const double *row = e->matrix + 3 * c;
      const double level = row[0] * xyz[0] + row[1] * xyz[1] + row[2] * xyz[2];
      is_clipped = is_clipped || level < e->low || level > e->high;
      is_bright = is_bright || level > e->high;
      /* NaN is not above 0. */
      const double within = level > 0.0 ? fmin(level, 1.0) : 0.0;
      sample[c] = (uint16_t)(code_of(e, within) * e->step);
    }
    clipped->n += is_clipped;
    clipped->n_bright += is_bright;
  }
}
