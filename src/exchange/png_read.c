/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pictures read row by row through libpng. It leaves its calls by longjmp on
 * failure: what may jump stands in functions of its own, each with its setjmp,
 * and all that they change lives in the struct. */
#include "exchange/exchange_private.h"

#include <errno.h>
#include <setjmp.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include <png.h>

#include "base/base_private.h"

enum {
  SIGNATURE = 8,
  MOST_A_SIDE = 1000000,
  MOST_WARNINGS = 3 /* told of one file */
};
/* Bytes that one ancillary chunk may take once unpacked. */
#define MOST_CHUNK ((png_alloc_size_t)64 << 20)

enum { MOST_REASON = 160 };

struct ef_png {
  char *name;
  int descriptor; /* -1: memory */
  bool owns_descriptor;
  const unsigned char *memory;
  size_t memory_left;
  size_t n_read;
  ef_png_settings settings;
  ef_png_head head;
  png_structp png;
  png_infop info;
  size_t n_channels; /* of a row as libpng hands it out: 3, or 4 with alpha */
  bool is_wide;      /* 16 bits a sample */
  bool is_interlaced;
  png_byte *bytes;   /* of a row, or of all rows of an interlaced picture */
  png_bytep *row;    /* of an interlaced picture */
  size_t row_bytes;
  size_t y;          /* rows handed out */
  bool is_over;      /* an error, or the end */
  int n_warnings;
  bool is_cut;       /* the file ended too early */
  int read_errno;
  char reason[MOST_REASON];
  char damage[MOST_REASON]; /* of a colour tag */
};

/* ---- What libpng calls --------------------------------------------------- */

static void keep_text(const char *message, char out[MOST_REASON]) {
  const size_t length = strlen(message);
  const size_t kept = length < MOST_REASON - 1 ? length : MOST_REASON - 1;
  memcpy(out, message, kept);
  out[kept] = '\0';
}

static size_t take(ef_png *p, png_bytep to, size_t length) {
  if (p->descriptor < 0) {
    const size_t n = length < p->memory_left ? length : p->memory_left;
    memcpy(to, p->memory, n);
    p->memory += n;
    p->memory_left -= n;
    return n;
  }
  size_t n = 0;
  while (n < length) {
    const ssize_t got = read(p->descriptor, to + n, length - n);
    if (got < 0 && errno == EINTR)
      continue;
    if (got < 0)
      p->read_errno = errno;
    if (got <= 0)
      break;
    n += (size_t)got;
  }
  return n;
}

static void read_bytes(png_structp png, png_bytep to, size_t length) {
  ef_png *const p = png_get_io_ptr(png);
  const size_t n = take(p, to, length);
  p->n_read += n;
  if (n == length)
    return;
  p->is_cut = p->read_errno == 0;
  png_error(png, "the file ends too early");
}

static void keep_reason(png_structp png, png_const_charp message) {
  ef_png *const p = png_get_error_ptr(png);
  keep_text(message, p->reason);
  png_longjmp(png, 1);
}

/* What libpng finds wrong with a chunk that it then leaves out: a colour tag
 * may be among them. */
static void tell_warning(png_structp png, png_const_charp message) {
  ef_png *const p = png_get_error_ptr(png);
  if (p->n_warnings++ < MOST_WARNINGS)
    ef__note(p->settings.notes, "%s: left out as damaged: %s", p->name,
             message);
  if (strncmp(message, "iCCP", 4) == 0 && p->damage[0] == '\0')
    keep_text(message, p->damage);
}

/* ---- The head ------------------------------------------------------------ */

static double fixed_at(const png_byte *at) {
  return 1e-5 * ((double)at[0] * 16777216.0 + (double)at[1] * 65536.0 +
                 (double)at[2] * 256.0 + (double)at[3]);
}

/* A colour chunk byte by byte: cICP is younger than libpng 1.6.39, and of the
 * others it makes one colour space, in which a damaged chunk spoils a good one. */
static void take_chunk(ef_png_head *h, const png_unknown_chunk *chunk) {
  const png_byte *data = chunk->data;
  if (memcmp(chunk->name, "cICP", 4) == 0 && chunk->size == 4) {
    h->has_cicp = true;
    h->primaries = data[0];
    h->transfer = data[1];
    h->matrix = data[2];
    h->is_full_range = data[3] == 1;
  } else if (memcmp(chunk->name, "sRGB", 4) == 0 && chunk->size == 1) {
    h->has_srgb = data[0] <= 3;
    h->srgb_intent = data[0];
  } else if (memcmp(chunk->name, "gAMA", 4) == 0 && chunk->size == 4) {
    h->gamma = fixed_at(data);
    h->has_gamma = h->gamma > 0.0;
  } else if (memcmp(chunk->name, "cHRM", 4) == 0 && chunk->size == 32) {
    ef_xy *const to[4] = {&h->white, &h->red, &h->green, &h->blue};
    h->has_chromaticities = true;
    for (size_t i = 0; i < 4; ++i)
      *to[i] = (ef_xy){fixed_at(data + 8 * i), fixed_at(data + 8 * i + 4)};
  }
}

static void find_profile(ef_png *p) {
  png_charp name;
  png_bytep profile;
  png_uint_32 length;
  int method;
  if (png_get_iCCP(p->png, p->info, &name, &method, &profile, &length) == 0)
    return;
  p->head.has_iccp = true; /* owned by libpng as long as the picture is open */
  p->head.profile_name = name;
  p->head.profile = profile;
  p->head.profile_length = length;
}

static void find_tags(ef_png *p) {
  png_unknown_chunkp chunk;
  const int n = png_get_unknown_chunks(p->png, p->info, &chunk);
  for (int i = 0; i < n; ++i)
    take_chunk(&p->head, &chunk[i]);
  find_profile(p);
}

static const char *layout_name(int colour_type) {
  switch (colour_type) {
  case PNG_COLOR_TYPE_GRAY:
    return "grey";
  case PNG_COLOR_TYPE_GRAY_ALPHA:
    return "grey with alpha";
  case PNG_COLOR_TYPE_PALETTE:
    return "palette";
  case PNG_COLOR_TYPE_RGB_ALPHA:
    return "RGB with alpha";
  default:
    return "RGB";
  }
}

static void find_layout(ef_png *p) {
  ef_png_head *const h = &p->head;
  const int type = png_get_color_type(p->png, p->info);
  h->width = png_get_image_width(p->png, p->info);
  h->height = png_get_image_height(p->png, p->info);
  h->bits = png_get_bit_depth(p->png, p->info);
  h->layout = layout_name(type);
  h->is_grey = (type & PNG_COLOR_MASK_COLOR) == 0;
  h->has_alpha = (type & PNG_COLOR_MASK_ALPHA) != 0 ||
                 png_get_valid(p->png, p->info, PNG_INFO_tRNS) != 0;
  p->is_wide = h->bits == 16;
  p->is_interlaced =
      png_get_interlace_type(p->png, p->info) != PNG_INTERLACE_NONE;
}

/* Rows of three or four samples, 8 or 16 bits each. */
static void ask_for_rows(ef_png *p) {
  png_set_expand(p->png); /* palettes, few bits, transparent colours */
  if (p->head.is_grey)
    png_set_gray_to_rgb(p->png);
  png_set_interlace_handling(p->png);
  png_read_update_info(p->png, p->info);
  p->n_channels = png_get_channels(p->png, p->info);
  p->row_bytes = png_get_rowbytes(p->png, p->info);
}

/* All of the head that may jump; false when it did. */
static bool read_head(ef_png *p) {
  static const png_byte as_they_are[] = "cICP\0sRGB\0gAMA\0cHRM";
  if (setjmp(png_jmpbuf(p->png)) != 0)
    return false;
  png_set_read_fn(p->png, p, read_bytes);
  png_set_sig_bytes(p->png, SIGNATURE);
  png_set_user_limits(p->png, MOST_A_SIDE, MOST_A_SIDE);
  png_set_chunk_malloc_max(p->png, MOST_CHUNK);
  png_set_keep_unknown_chunks(p->png, PNG_HANDLE_CHUNK_ALWAYS,
                              as_they_are, 4);
  png_read_info(p->png, p->info);
  find_layout(p);
  find_tags(p);
  ask_for_rows(p);
  return true;
}

/* ---- Refusals ------------------------------------------------------------ */

static ef_status refuse(ef_png *p, ef_error *error) {
  p->is_over = true;
  if (p->read_errno != 0)
    ef__error_set(error, EF_UNREADABLE, "reading failed: %s",
                  strerror(p->read_errno));
  else if (p->is_cut)
    ef__error_set(error, EF_MALFORMED,
                  "the picture is cut off: the file ends after %zu bytes, "
                  "within row %zu of %zu",
                  p->n_read, p->y + 1 < p->head.height ? p->y + 1
                                                       : p->head.height,
                  p->head.height);
  else
    ef__error_set(error, EF_MALFORMED, "the picture is damaged: %s",
                  p->reason);
  ef__error_place(error, p->name, 0, 0, NULL);
  return p->read_errno != 0 ? EF_UNREADABLE : EF_MALFORMED;
}

static ef_status refuse_head(ef_png *p, ef_error *error) {
  if (!p->is_cut || p->read_errno != 0)
    return refuse(p, error);
  ef__error_set(error, EF_MALFORMED,
                "the picture is cut off: the file ends after %zu bytes, in "
                "front of any pixel",
                p->n_read);
  ef__error_place(error, p->name, 0, 0, NULL);
  return EF_MALFORMED;
}

static ef_status check_signature(ef_png *p, ef_error *error) {
  png_byte signature[SIGNATURE];
  const size_t n = take(p, signature, SIGNATURE);
  p->n_read = n;
  if (n == SIGNATURE && png_sig_cmp(signature, 0, SIGNATURE) == 0)
    return EF_OK;
  if (p->read_errno != 0)
    return refuse(p, error);
  ef__error_set(error, EF_MALFORMED,
                n == 0 ? "is an empty file; expected a PNG picture"
                       : "is no PNG picture: it does not start with the eight "
                         "bytes of one");
  ef__error_place(error, p->name, 0, 0, NULL);
  return EF_MALFORMED;
}

static ef_status check_size(ef_png *p, ef_error *error) {
  size_t n_pixels;
  const ef_png_head *const h = &p->head;
  if (ef__size_multiply(h->width, h->height, &n_pixels) &&
      n_pixels <= p->settings.max_pixels)
    return EF_OK;
  ef__error_set(error, EF_MALFORMED,
                "says that it has %zu x %zu pixels; at most %zu in all are read",
                h->width, h->height, p->settings.max_pixels);
  ef__error_place(error, p->name, 0, 0, NULL);
  return EF_MALFORMED;
}

/* ---- Opening ------------------------------------------------------------- */

ef_png_settings ef_png_settings_default(void) {
  return (ef_png_settings){.max_pixels = (size_t)400000000,
                           .max_bytes = (size_t)1 << 30};
}

static ef_status make_room(ef_png *p, ef_error *error) {
  const size_t n_rows = p->is_interlaced ? p->head.height : 1;
  size_t n_bytes;
  if (!ef__size_multiply(n_rows, p->row_bytes, &n_bytes) ||
      n_bytes > p->settings.max_bytes) {
    ef__error_set(error, EF_MALFORMED,
                  "is interlaced, so that it must be held whole, and its %zu x "
                  "%zu pixels take more than %zu bytes; save it without "
                  "interlacing",
                  p->head.width, p->head.height, p->settings.max_bytes);
    ef__error_place(error, p->name, 0, 0, NULL);
    return EF_MALFORMED;
  }
  p->bytes = ef__allocate_zeroed(n_rows, p->row_bytes);
  if (p->is_interlaced)
    p->row = ef__allocate(n_rows, sizeof *p->row);
  if (p->bytes == NULL || (p->is_interlaced && p->row == NULL))
    return ef__error_memory(error, "a picture");
  for (size_t y = 0; p->is_interlaced && y < n_rows; ++y)
    p->row[y] = p->bytes + y * p->row_bytes;
  return EF_OK;
}

static ef_status start(ef_png *p, ef_error *error) {
  ef_status status = check_signature(p, error);
  if (status != EF_OK)
    return status;
  p->png = png_create_read_struct(PNG_LIBPNG_VER_STRING, p, keep_reason,
                                  tell_warning);
  if (p->png != NULL)
    p->info = png_create_info_struct(p->png);
  if (p->info == NULL)
    return ef__error_memory(error, "a picture");
  if (!read_head(p))
    return refuse_head(p, error);
  status = check_size(p, error);
  return status == EF_OK ? make_room(p, error) : status;
}

static ef_png *png_new(const char *name, const ef_png_settings *settings,
                       ef_error *error) {
  ef_png *p = ef__allocate_zeroed(1, sizeof *p);
  if (p != NULL) {
    p->descriptor = -1;
    p->settings = settings != NULL ? *settings : ef_png_settings_default();
    p->name = ef__copy_text(name, strlen(name));
  }
  if (p == NULL || p->name == NULL) {
    ef_png_free(p);
    ef__error_memory(error, "a picture");
    return NULL;
  }
  p->head.file = p->name;
  p->head.damage = p->damage;
  return p;
}

ef_png *ef_png_open(const char *path, const ef_png_settings *settings,
                    ef_error *error) {
  if (path == NULL) {
    ef__error_set(error, EF_INVALID, "a picture needs a path");
    return NULL;
  }
  const bool is_standard = strcmp(path, "-") == 0;
  ef_png *p = png_new(is_standard ? "standard input" : path, settings, error);
  if (p == NULL)
    return NULL;
  p->descriptor = is_standard ? STDIN_FILENO : ef__open_file(path, error);
  p->owns_descriptor = !is_standard;
  if (p->descriptor >= 0 && start(p, error) == EF_OK)
    return p;
  ef_png_free(p);
  return NULL;
}

ef_png *ef_png_from_bytes(const char *name, const void *bytes, size_t length,
                          const ef_png_settings *settings, ef_error *error) {
  if (name == NULL || bytes == NULL) {
    ef__error_set(error, EF_INVALID, "a picture needs a name and its bytes");
    return NULL;
  }
  ef_png *p = png_new(name, settings, error);
  if (p == NULL)
    return NULL;
  p->memory = bytes;
  p->memory_left = length;
  if (start(p, error) == EF_OK)
    return p;
  ef_png_free(p);
  return NULL;
}

void ef_png_free(ef_png *png) {
  if (png == NULL)
    return;
  png_destroy_read_struct(&png->png, &png->info, NULL);
  if (png->owns_descriptor && png->descriptor >= 0)
    close(png->descriptor);
  free(png->row);
  free(png->bytes);
  free(png->name);
  free(png);
}

const ef_png_head *ef_png_get_head(const ef_png *png) {
  return &png->head;
}

/* PNG third edition, 4.3: cICP, then iCCP, then sRGB, then gAMA and cHRM. */
ef_png_source ef_png_get_source(const ef_png_head *head) {
  return head->has_cicp                                ? EF_PNG_CICP
         : head->has_iccp                              ? EF_PNG_ICCP
         : head->has_srgb                              ? EF_PNG_SRGB
         : head->has_gamma || head->has_chromaticities ? EF_PNG_GAMA
                                                       : EF_PNG_UNTAGGED;
}

/* ---- Rows ---------------------------------------------------------------- */

static bool read_pixels(ef_png *p) {
  if (setjmp(png_jmpbuf(p->png)) != 0)
    return false;
  if (!p->is_interlaced)
    png_read_row(p->png, p->bytes, NULL);
  else if (p->y == 0)
    png_read_image(p->png, p->row);
  return true;
}

/* What follows the last row: the end of the pixels and of the file. */
static bool read_end(ef_png *p) {
  if (setjmp(png_jmpbuf(p->png)) != 0)
    return false;
  png_read_end(p->png, NULL);
  return true;
}

static uint16_t sample_at(const ef_png *p, const png_byte *row, size_t i) {
  return p->is_wide ? (uint16_t)((unsigned)row[2 * i] << 8 | row[2 * i + 1])
                    : (uint16_t)(row[i] * 257u);
}

/* The colours of a row; false at `*x` when a pixel is not opaque. */
static bool unpack(const ef_png *p, const png_byte *row, uint16_t *sample,
                   size_t *x) {
  const size_t n = p->n_channels;
  for (*x = 0; *x < p->head.width; ++*x) {
    for (size_t c = 0; c < 3; ++c)
      sample[3 * *x + c] = sample_at(p, row, n * *x + c);
    if (n == 4 && sample_at(p, row, 4 * *x + 3) != 65535u)
      return false;
  }
  return true;
}

ef_status ef_png_next_row(ef_png *png, uint16_t *sample, bool *has_row,
                          ef_error *error) {
  ef_png *const p = png;
  *has_row = false;
  if (p->is_over)
    return EF_OK;
  if (p->y == p->head.height) {
    p->is_over = true;
    return read_end(p) ? EF_OK : refuse(p, error);
  }
  if (!read_pixels(p))
    return refuse(p, error);
  size_t x;
  const png_byte *row = p->is_interlaced ? p->row[p->y] : p->bytes;
  if (!unpack(p, row, sample, &x)) {
    p->is_over = true;
    ef__error_set(error, EF_MALFORMED,
                  "pixel %zu of row %zu is not opaque, and what is seen of it "
                  "depends on what lies behind; flatten the picture first",
                  x + 1, p->y + 1);
    ef__error_place(error, p->name, 0, 0, NULL);
    return EF_MALFORMED;
  }
  ++p->y;
  *has_row = true;
  return EF_OK;
}
