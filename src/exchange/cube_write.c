/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Spectral images written: a header and the values beside it, both or none. */
#include "exchange/exchange_private.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/base_private.h"

enum { BLOCK = 4096 };

struct ef_cube_out {
  ef_output *values, *header;
  char *values_name;
  size_t n_bands;
  size_t n_left; /* pixels that are still to come */
  float block[BLOCK];
};

static bool host_is_big_endian(void) {
  const uint16_t one = 1;
  unsigned char first;
  memcpy(&first, &one, 1);
  return first == 0;
}

/* Braces and line ends would end the text. */
static ef_status put_words(ef_output *output, const char *text,
                           ef_error *error) {
  char word[256];
  size_t n = 0;
  for (; *text != '\0' && n + 1 < sizeof word; ++text) {
    const bool is_plain = (unsigned char)*text >= ' ' && *text != '{' &&
                          *text != '}';
    word[n++] = is_plain ? *text : ' ';
  }
  word[n] = '\0';
  return ef_output_text(output, word, error);
}

static ef_status put_header(ef_output *output, size_t width, size_t height,
                            size_t n_bands, const char *const *band_name,
                            const char *description, ef_error *error) {
  char text[400];
  ef_status status = ef_output_text(output, "ENVI\ndescription = {", error);
  if (status == EF_OK)
    status = put_words(output, description, error);
  snprintf(text, sizeof text,
           "}\nsamples = %zu\nlines = %zu\nbands = %zu\nheader offset = 0\n"
           "file type = ENVI Standard\ndata type = %d\ninterleave = bip\n"
           "byte order = %d\nband names = {",
           width, height, n_bands, (int)EF_FLOAT32, host_is_big_endian());
  if (status == EF_OK)
    status = ef_output_text(output, text, error);
  for (size_t k = 0; k < n_bands && status == EF_OK; ++k) {
    status = ef_output_text(output, k > 0 ? ", " : "", error);
    if (status == EF_OK)
      status = put_words(output, band_name[k], error);
  }
  return status == EF_OK ? ef_output_text(output, "}\n", error) : status;
}

ef_cube_out *ef_cube_out_open(const char *path, bool overwrite, size_t width,
                              size_t height, size_t n_bands,
                              const char *const *band_name,
                              const char *description, ef_error *error) {
  const size_t n = strlen(path);
  if (n <= 4 || strcmp(path + n - 4, ".hdr") != 0 || width == 0 ||
      height == 0 || n_bands == 0) {
    ef__error_set(error, EF_INVALID,
                  "a spectral image is written to a name that ends in .hdr, "
                  "with a pixel and a band or more");
    return NULL;
  }
  ef_error own = {0};
  if (error == NULL)
    error = &own;
  ef_cube_out *out = ef__allocate_zeroed(1, sizeof *out);
  if (out == NULL) {
    ef__error_memory(error, "a spectral image");
    return NULL;
  }
  out->n_bands = n_bands;
  out->n_left = width * height;
  out->values_name = ef__copy_text(path, n);
  ef_status status = EF_NO_MEMORY;
  if (out->values_name == NULL) {
    ef__error_memory(error, "a name");
  } else {
    memcpy(out->values_name + n - 4, ".bip", 4);
    out->header = ef_output_open(path, overwrite, error);
    if (out->header != NULL)
      out->values = ef_output_open(out->values_name, overwrite, error);
    if (out->values != NULL)
      status = put_header(out->header, width, height, n_bands, band_name,
                          description, error);
  }
  if (status == EF_OK)
    return out;
  ef_cube_out_discard(out);
  return NULL;
}

ef_status ef_cube_out_write(ef_cube_out *out, size_t n, const double *value,
                            ef_error *error) {
  if (n > out->n_left)
    return ef__error_set(error, EF_INVALID,
                         "more pixels come than were announced");
  out->n_left -= n;
  size_t left = n * out->n_bands;
  ef_status status = EF_OK;
  while (left > 0 && status == EF_OK) {
    const size_t some = left < BLOCK ? left : BLOCK;
    for (size_t i = 0; i < some; ++i)
      out->block[i] = (float)value[i];
    status = ef_output_write(out->values, out->block,
                             some * sizeof *out->block, error);
    value += some;
    left -= some;
  }
  return status;
}

ef_status ef_cube_out_commit(ef_cube_out *out, ef_error *error) {
  ef_status status = EF_OK;
  if (out->n_left > 0)
    status = ef__error_set(error, EF_INVALID, "%zu pixels have not come",
                           out->n_left);
  if (status == EF_OK) {
    status = ef_output_commit(out->values, error);
    out->values = NULL;
  }
  if (status == EF_OK) {
    status = ef_output_commit(out->header, error);
    out->header = NULL;
    if (status != EF_OK)
      unlink(out->values_name); /* values without their header are nothing */
  }
  ef_cube_out_discard(out);
  return status;
}

void ef_cube_out_discard(ef_cube_out *out) {
  if (out == NULL)
    return;
  ef_output_discard(out->values);
  ef_output_discard(out->header);
  free(out->values_name);
  free(out);
}
