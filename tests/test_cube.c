/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Spectral images: whatever way the values lie in the file, a pixel is what its
 * spectrum gives; bands and pixels that are no good are counted; what is written
 * is there whole or not at all. */
#include <signal.h>
#include <stdlib.h>
#include <sys/resource.h>
#include <unistd.h>

#include <evenfield/image.h>

#include "gen.h"
#include "near.h"
#include "scratch.h"

/* ---- Cubes to read ------------------------------------------------------- */

typedef struct shape {
  size_t width, height, n_bands;
  ef_interleave interleave;
  ef_sample_type type;
  bool is_big_endian;
  size_t offset;
} shape;

static const ef_sample_type types[] = {EF_UINT8,   EF_INT16,   EF_INT32,
                                       EF_FLOAT32, EF_FLOAT64, EF_UINT16,
                                       EF_UINT32};

/* A whole number or a float that the type holds exactly. */
static double stored_value(gen *g, ef_sample_type type) {
  switch (type) {
  case EF_UINT8:
    return (double)gen_below(g, 256);
  case EF_INT16:
    return (double)gen_below(g, 65536) - 32768.0;
  case EF_UINT16:
    return (double)gen_below(g, 65536);
  case EF_INT32:
    return (double)gen_below(g, 4294967296) - 2147483648.0;
  case EF_UINT32:
    return (double)gen_below(g, 4294967296);
  case EF_FLOAT32:
    return (double)(float)gen_between(g, -0.1, 1.5);
  default:
    return gen_between(g, -0.1, 1.5);
  }
}

static void put(const shape *s, double value, unsigned char *to) {
  const size_t size = ef_sample_type_bytes(s->type);
  unsigned char bytes[8];
  const float as_float = (float)value;
  /* Integers below zero as their residue. */
  const uint64_t whole =
      s->type == EF_FLOAT32 || s->type == EF_FLOAT64
          ? 0
          : (uint64_t)(int64_t)value;
  uint64_t bits = whole;
  uint32_t float_bits;
  if (s->type == EF_FLOAT32) {
    memcpy(&float_bits, &as_float, 4);
    bits = float_bits;
  } else if (s->type == EF_FLOAT64) {
    memcpy(&bits, &value, 8);
  }
  for (size_t i = 0; i < size; ++i)
    bytes[i] = (unsigned char)(bits >> (8 * i));
  for (size_t i = 0; i < size; ++i)
    to[i] = bytes[s->is_big_endian ? size - 1 - i : i];
}

/* Pixel after pixel to the order of the file. */
static void write_values(const char *name, const shape *s,
                         const double *value) {
  const size_t size = ef_sample_type_bytes(s->type);
  const size_t n = s->width * s->height * s->n_bands;
  unsigned char *bytes = calloc(s->offset + n * size, 1);
  assert_non_null(bytes);
  for (size_t y = 0; y < s->height; ++y) {
    for (size_t x = 0; x < s->width; ++x) {
      for (size_t k = 0; k < s->n_bands; ++k) {
        const size_t pixel = y * s->width + x;
        const size_t at =
            s->interleave == EF_BIP   ? pixel * s->n_bands + k
            : s->interleave == EF_BIL ? (y * s->n_bands + k) * s->width + x
                                      : k * s->width * s->height + pixel;
        put(s, value[pixel * s->n_bands + k], bytes + s->offset + at * size);
      }
    }
  }
  scratch_write(name, bytes, s->offset + n * size);
  free(bytes);
}

static void list(char *to, size_t room, const char *key, size_t n,
                 const double *value) {
  size_t used = strlen(to);
  used += (size_t)snprintf(to + used, room - used, "%s = {", key);
  for (size_t k = 0; k < n; ++k) {
    char number[EF_NUMBER_TEXT];
    ef_number_format(value[k], number);
    used += (size_t)snprintf(to + used, room - used, "%s%s",
                             k == 0 ? "\n " : ",\n ", number);
  }
  snprintf(to + used, room - used, "}\n");
}

enum { MOST_BANDS = 120, HEADER = 16384 };

static void write_cube(const shape *s, const double *nm, const double *value,
                       const char *more) {
  char text[HEADER];
  snprintf(text, sizeof text,
           "ENVI\n; a comment = {\nSamples = %zu\nlines=%zu\nbands  = %zu\n"
           "header  offset = %zu\ndata type = %d\ninterleave = %s\n"
           "byte order = %d\nsensor type = {none of\n this is read}\n"
           "wavelength units = nm\n%s",
           s->width, s->height, s->n_bands, s->offset, (int)s->type,
           ef_interleave_text(s->interleave), s->is_big_endian, more);
  list(text, sizeof text, "wavelength", s->n_bands, nm);
  scratch_write("cube.hdr", text, strlen(text));
  if (value != NULL)
    write_values("cube.img", s, value);
}

static ef_cube *open_cube(const ef_notes *notes) {
  char path[SCRATCH_PATH];
  ef_error error = {0};
  ef_cube_settings settings = ef_cube_settings_default();
  settings.notes = notes;
  scratch_path("cube.hdr", path);
  ef_cube *cube = ef_cube_open(path, &settings, &error);
  if (cube == NULL)
    fail_msg("%s", error.message);
  return cube;
}

static void remove_cube(void) {
  char path[SCRATCH_PATH];
  scratch_path("cube.hdr", path);
  unlink(path);
  scratch_path("cube.img", path);
  unlink(path);
}

static ef_observer *observer;
static ef_illuminant *d65;

static ef_render_settings render_settings(int jobs) {
  ef_render_settings settings = ef_render_settings_default(d65);
  settings.jobs = jobs;
  return settings;
}

/* All channel values, to be freed. */
static double *render_all(const ef_cube *cube,
                          const ef_render_settings *settings,
                          ef_render_info *info) {
  const ef_cube_head *head = ef_cube_get_head(cube);
  ef_error error = {0};
  ef_render *r = ef_render_new(cube, observer, settings, &error);
  if (r == NULL)
    fail_msg("%s", error.message);
  double *all = malloc(head->width * head->height * 3 * sizeof *all);
  size_t n, done = 0;
  const double *value;
  assert_non_null(all);
  do {
    assert_int_equal(ef_render_next(r, &n, &value, &error), EF_OK);
    assert_true(done + n <= head->width * head->height);
    if (n > 0)
      memcpy(all + 3 * done, value, 3 * n * sizeof *all);
    done += n;
  } while (n > 0);
  assert_int_equal(done, head->width * head->height);
  *info = ef_render_get_info(r);
  ef_render_free(r);
  return all;
}

/* ---- Pixels are their spectra -------------------------------------------- */

static void fill_wavelengths(gen *g, size_t n, double *nm) {
  const double first = gen_between(g, 350.0, 500.0);
  const double step = gen_between(g, 1.0, 12.0);
  const bool is_even = gen_below(g, 2) == 0;
  for (size_t k = 0; k < n; ++k) {
    nm[k] = first + (double)k * step +
            (is_even ? 0.0 : gen_between(g, 0.0, 0.9 * step));
  }
}

/* The spectra as doubles through the weights for their grid, in the way of all
 * other spectra. `whole` receives the sums of the terms' sizes. */
static void sum_plainly(const ef_cube_head *head, const double *value,
                        double *xyz, double *whole) {
  const size_t n = head->width * head->height;
  double *spectrum = malloc(n * head->n_used * sizeof *spectrum);
  assert_non_null(spectrum);
  for (size_t i = 0; i < n; ++i) {
    for (size_t k = 0; k < head->n_used; ++k)
      spectrum[i * head->n_used + k] =
          head->gain[k] * value[i * head->n_bands + head->band[k]] +
          head->offset[k];
  }
  const ef_viewing viewing = ef_viewing_default(d65);
  ef_weights *w = ef_observer_weights(observer, EF_TRISTIMULUS, &head->grid,
                                      &viewing, NULL, NULL);
  assert_non_null(w);
  assert_int_equal(ef_weights_apply(w, n, spectrum, 1, xyz, NULL), EF_OK);
  const double *matrix = ef_weights_matrix(w);
  for (size_t c = 0; c < 3; ++c) {
    whole[c] = 0.0;
    for (size_t i = 0; i < n * head->n_used; ++i) {
      const double term =
          fabs(matrix[c * head->n_used + i % head->n_used] * spectrum[i]);
      whole[c] = fmax(whole[c], term * (double)head->n_used);
    }
  }
  ef_weights_free(w);
  free(spectrum);
}

static void check_draw(gen *g, int draw) {
  shape s = {.width = 1 + gen_below(g, 19),
             .height = 1 + gen_below(g, 7),
             .n_bands = 1 + gen_below(g, 40),
             .interleave = (ef_interleave)(draw % 3),
             .type = types[(size_t)draw / 3 % 7],
             .is_big_endian = gen_below(g, 2) == 1,
             .offset = gen_below(g, 3) * 7};
  const size_t n = s.width * s.height * s.n_bands;
  double nm[MOST_BANDS], gain[MOST_BANDS], offset[MOST_BANDS];
  double *value = malloc(n * sizeof *value);
  double *xyz = malloc(3 * s.width * s.height * sizeof *xyz);
  double whole[3];
  char more[HEADER / 2] = "";
  assert_true(value != NULL && xyz != NULL);
  for (size_t i = 0; i < n; ++i)
    value[i] = stored_value(g, s.type);
  fill_wavelengths(g, s.n_bands, nm);
  if (gen_below(g, 2) == 0)
    strcat(more, "reflectance scale factor = 1e4\n");
  if (gen_below(g, 2) == 0) {
    gen_fill(g, s.n_bands, 0.5, 2.0, gain);
    gen_fill(g, s.n_bands, -0.2, 0.2, offset);
    list(more, sizeof more, "data gain values", s.n_bands, gain);
    list(more, sizeof more, "data offset values", s.n_bands, offset);
  }
  write_cube(&s, nm, value, more);
  ef_cube *cube = open_cube(NULL);
  const ef_cube_head *head = ef_cube_get_head(cube);
  const ef_render_settings settings = render_settings(1 + draw % 3);
  ef_render_info info;
  double *seen = render_all(cube, &settings, &info);
  sum_plainly(head, value, xyz, whole);
  /* Rounding of the sums, and the bands that hardly count and are left out. */
  for (size_t i = 0; i < 3 * s.width * s.height; ++i)
    assert_near(seen[i], xyz[i], 3e-12 * whole[i % 3]);
  assert_int_equal(info.n_ignored + info.n_not_numbers, 0);
  free(seen);
  free(value);
  free(xyz);
  ef_cube_free(cube);
}

static void a_pixel_is_its_spectrum(void **state) {
  (void)state;
  gen g = gen_new(8211);
  for (int draw = 0; draw < 84; ++draw)
    check_draw(&g, draw);
  remove_cube();
}

/* Several windows and batches, parts of lines, any number of threads: the same
 * bits however the values lie. */
static void check_large(const shape *base, const double *nm) {
  const size_t n = base->width * base->height;
  double *value = malloc(n * base->n_bands * sizeof *value), *first = NULL;
  gen g = gen_new(5);
  assert_non_null(value);
  for (size_t i = 0; i < n * base->n_bands; ++i)
    value[i] = stored_value(&g, base->type);
  for (int k = 0; k < 3; ++k) {
    shape s = *base;
    s.interleave = (ef_interleave)k;
    write_cube(&s, nm, value, "");
    ef_cube *cube = open_cube(NULL);
    for (int jobs = 1; jobs < 4; ++jobs) {
      const ef_render_settings settings = render_settings(jobs);
      ef_render_info info;
      double *seen = render_all(cube, &settings, &info);
      if (first != NULL)
        assert_same_bits(seen, first, 3 * n);
      if (first == NULL)
        first = seen;
      else
        free(seen);
    }
    ef_cube_free(cube);
  }
  free(first);
  free(value);
}

static void threads_and_layout_change_nothing(void **state) {
  (void)state;
  double nm[MOST_BANDS];
  for (size_t k = 0; k < MOST_BANDS; ++k)
    nm[k] = 380.0 + 3.0 * (double)k;
  /* Lines of 1.44 MB, read in parts; of few bands in blocks of many pixels. */
  const shape wide = {.width = 3001, .height = 4, .n_bands = 120,
                      .type = EF_FLOAT32};
  const shape tall = {.width = 401, .height = 350, .n_bands = 2,
                      .type = EF_UINT8};
  const shape small = {.width = 201, .height = 30, .n_bands = 11,
                       .type = EF_INT16, .is_big_endian = true};
  check_large(&wide, nm);
  check_large(&tall, nm);
  check_large(&small, nm);
  remove_cube();
}

/* ---- Bands --------------------------------------------------------------- */

typedef struct said {
  int n;
  char last[512], all[2048];
} said;

static void hear(void *cookie, const char *line) {
  said *const s = cookie;
  ++s->n;
  snprintf(s->last, sizeof s->last, "%s", line);
  const size_t used = strlen(s->all);
  snprintf(s->all + used, sizeof s->all - used, "%s\n", line);
}

static void bands_are_put_in_order(void **state) {
  (void)state;
  /* Out of order, one twice, one bad, two beyond what eyes see. */
  static const double nm[8] = {600, 500, 400, 500, 450, 1500, 550, 1600};
  const shape s = {.width = 1, .height = 1, .n_bands = 8, .type = EF_UINT8,
                   .interleave = EF_BSQ};
  static const double value[8] = {6, 5, 4, 99, 45, 98, 55, 97};
  said heard = {0};
  const ef_notes notes = {hear, &heard};
  write_cube(&s, nm, value, "bbl = {1, 1, 1, 1, 0, 1, 1, 1}\n"
                            "reflectance scale factor = 10\n");
  ef_cube *cube = open_cube(&notes);
  const ef_cube_head *head = ef_cube_get_head(cube);
  static const size_t order[6] = {2, 1, 6, 0, 5, 7};
  assert_int_equal(head->n_used, 6);
  for (size_t k = 0; k < 6; ++k) {
    assert_int_equal(head->band[k], order[k]);
    assert_near(ef_grid_wavelength(&head->grid, k), nm[order[k]], 0.0);
  }
  assert_false(head->is_sorted);
  assert_int_equal(head->n_repeated, 1);
  assert_int_equal(head->n_marked_bad, 1);
  assert_int_equal(head->kind, EF_KIND_SURFACE);
  assert_non_null(strstr(heard.all, "do not stand in order"));
  assert_non_null(strstr(heard.all, "1 band is of a wavelength that another"));
  assert_non_null(strstr(heard.all, "1 band is marked as bad (bbl)"));
  ef_cube_free(cube);
  remove_cube();
}

/* What lies where no eye sees changes nothing, whatever it holds. */
static void unseen_bands_are_not_read(void **state) {
  (void)state;
  double nm[60], value[2 * 60];
  const shape s = {.width = 2, .height = 1, .n_bands = 60, .type = EF_FLOAT64,
                   .interleave = EF_BIP};
  for (size_t k = 0; k < 60; ++k) {
    nm[k] = 400.0 + 20.0 * (double)k; /* to 1580 nm */
    value[k] = 0.5;
    value[60 + k] = nm[k] < 1000.0 ? 0.5 : NOT_A_NUMBER;
  }
  said heard = {0};
  write_cube(&s, nm, value, "");
  ef_cube *cube = open_cube(NULL);
  ef_render_settings settings = render_settings(1);
  settings.notes = &(ef_notes){hear, &heard};
  ef_render_info info;
  double *seen = render_all(cube, &settings, &info);
  assert_same_bits(seen, seen + 3, 3);
  assert_near(seen[1], 50.0, 1e-9);
  assert_true(info.n_without_weight > 20 && info.longest_nm < 1000.0);
  assert_non_null(strstr(heard.last, "lie where the observer sees nothing"));
  free(seen);
  ef_cube_free(cube);
  remove_cube();
}

/* ---- Pixels without data ------------------------------------------------- */

static void pixels_without_data_are_counted(void **state) {
  (void)state;
  static const double nm[3] = {450, 550, 650};
  const shape s = {.width = 4, .height = 2, .n_bands = 3, .type = EF_FLOAT32,
                   .interleave = EF_BIL, .is_big_endian = true};
  double value[24];
  for (size_t i = 0; i < 24; ++i)
    value[i] = 0.25;
  value[3 * 1 + 2] = -9999.0;
  value[3 * 4 + 0] = -9999.0;
  value[3 * 5 + 1] = NOT_A_NUMBER;
  value[3 * 6 + 0] = INFINITE;
  value[3 * 7 + 0] = NOT_A_NUMBER; /* both: ignored */
  value[3 * 7 + 1] = -9999.0;
  write_cube(&s, nm, value, "data ignore value = -9999\n"
                            "description = {reflectance of seats}\n");
  ef_cube *cube = open_cube(NULL);
  assert_int_equal(ef_cube_get_head(cube)->kind, EF_KIND_SURFACE);
  const ef_render_settings settings = render_settings(1);
  ef_render_info info;
  double *seen = render_all(cube, &settings, &info);
  for (size_t i = 0; i < 8; ++i) {
    const bool has_data = i == 0 || i == 2 || i == 3;
    for (size_t c = 0; c < 3; ++c)
      assert_true(isfinite(seen[3 * i + c]) == has_data);
  }
  assert_int_equal(info.n_pixels, 8);
  assert_int_equal(info.n_ignored, 3);
  assert_int_equal(info.n_not_numbers, 2);
  free(seen);
  ef_cube_free(cube);
  remove_cube();
}

/* Of every type and layout, also where a line has more pixels than a vector. */
static void ignored_values_are_found(void **state) {
  (void)state;
  enum { WIDE = 41, BANDS = 9 };
  double nm[BANDS], value[WIDE * BANDS];
  for (size_t k = 0; k < BANDS; ++k)
    nm[k] = 420.0 + 30.0 * (double)k;
  for (size_t t = 0; t < sizeof types / sizeof *types; ++t) {
    for (int layout = 0; layout < 3; ++layout) {
      const shape s = {.width = WIDE, .height = 1, .n_bands = BANDS,
                       .type = types[t], .interleave = (ef_interleave)layout};
      for (size_t i = 0; i < WIDE * BANDS; ++i)
        value[i] = 1.0 + (double)(i % 7);
      for (size_t x = 0; x < WIDE; x += 4)
        value[x * BANDS + x % BANDS] = 100.0;
      write_cube(&s, nm, value, "data ignore value = 100\n");
      ef_cube *cube = open_cube(NULL);
      const ef_render_settings settings = render_settings(1);
      ef_render_info info;
      double *seen = render_all(cube, &settings, &info);
      for (size_t x = 0; x < WIDE; ++x)
        assert_true(isnan(seen[3 * x]) == (x % 4 == 0));
      assert_int_equal(info.n_ignored, 11);
      free(seen);
      ef_cube_free(cube);
    }
  }
  remove_cube();
}

/* ---- Surfaces or lights -------------------------------------------------- */

static void kind_is_found(void **state) {
  (void)state;
  static const double nm[2] = {500, 600};
  const shape s = {.width = 1, .height = 3, .n_bands = 2, .type = EF_INT16,
                   .interleave = EF_BIP};
  static const double dark[6] = {400, 3, 1, 2, 500, 700};
  static const double bright[6] = {0, 1, 1, 3, 1, 1};
  const double *const values[2] = {dark, bright}; /* line 2 of 3 counts */
  for (int i = 0; i < 2; ++i) {
    said heard = {0};
    const ef_notes notes = {hear, &heard};
    ef_kind kind;
    write_cube(&s, nm, values[i], "");
    ef_cube *cube = open_cube(NULL);
    assert_int_equal(
        ef_cube_find_kind(cube, EF_KIND_AUTO, &notes, &kind, NULL), EF_OK);
    assert_int_equal(kind, i == 0 ? EF_SURFACE : EF_LIGHT);
    assert_non_null(strstr(heard.last, i == 0
                                           ? "values, 1 to 2 in line 2, are "
                                             "taken as reflectances"
                                           : "taken as lights"));
    heard.n = 0;
    assert_int_equal(
        ef_cube_find_kind(cube, EF_KIND_LIGHT, &notes, &kind, NULL), EF_OK);
    assert_int_equal(kind, EF_LIGHT);
    assert_int_equal(heard.n, 0);
    ef_cube_free(cube);
  }
  remove_cube();
}

/* ---- Codes --------------------------------------------------------------- */

/* The nearest code by the definition of the curve: of all codes none stands for
 * a level nearer to the one asked for, counted in codes. */
static void codes_are_the_nearest(void **state) {
  (void)state;
  gen g = gen_new(41);
  const ef_xyz white = {95.04, 100.0, 108.88};
  for (size_t e = 0; e < ef_encoding_count(); ++e) {
    const ef_encoding *encoding = ef_encoding_at(e);
    double to_xyz[9];
    assert_int_equal(ef_encoding_matrix(encoding, to_xyz, NULL), EF_OK);
    ef_tone_curve *curve = ef_tone_curve_new(encoding->tone, NULL);
    const ef_xyz own = ef_xyy_to_xyz(
        (ef_xyy){encoding->white.x, encoding->white.y, 100.0});
    for (int bits = 8; bits <= 16; bits += 8) {
      ef_encoder *encoder =
          ef_encoder_new(encoding, own, EF_ADAPT_NONE, bits, NULL);
      const double most = bits == 8 ? 255.0 : 65535.0;
      for (int draw = 0; draw < 200; ++draw) {
        double drive[3], level[3], xyz[3];
        uint16_t sample[3];
        ef_clipped clipped = {0, 0};
        for (int c = 0; c < 3; ++c) {
          drive[c] = gen_unit(&g) * gen_unit(&g); /* dark ones more often */
          level[c] = 100.0 * ef_tone_curve_amount(curve, drive[c], NULL);
        }
        for (int c = 0; c < 3; ++c)
          xyz[c] = to_xyz[3 * c] * level[0] + to_xyz[3 * c + 1] * level[1] +
                   to_xyz[3 * c + 2] * level[2];
        ef_encoder_apply(encoder, 1, xyz, sample, &clipped);
        for (int c = 0; c < 3; ++c) {
          /* The way back through XYZ costs some 1e-16 of full, which a power
           * curve makes 1e-6 codes of the darkest ones. */
          const double code = sample[c] / 65535.0 * most;
          assert_near(code, drive[c] * most, 0.5 + 1e-4);
        }
        assert_int_equal(clipped.n, 0);
      }
      ef_encoder_free(encoder);
    }
    ef_tone_curve_free(curve);
  }
  assert_null(ef_encoder_new(ef_encoding_at(0), white, EF_ADAPT_NONE, 12,
                             NULL));
}

static void what_lies_outside_is_clipped(void **state) {
  (void)state;
  const ef_xyz d50 = {96.42, 100.0, 82.49};
  ef_encoder *encoder = ef_encoder_new(ef_encoding_find("srgb", NULL), d50,
                                       EF_ADAPT_CAT16, 8, NULL);
  assert_non_null(encoder);
  /* White, a little more, twice as much, black, a pure green, no colour. */
  const double xyz[6 * 3] = {96.42, 100.0, 82.49,  96.45, 100.03, 82.52,
                             192.84, 200.0, 164.98, 0,     0,      0,
                             5.0,   50.0,  3.0,    NOT_A_NUMBER,
                             NOT_A_NUMBER, NOT_A_NUMBER};
  uint16_t sample[18];
  ef_clipped clipped = {0, 0};
  ef_encoder_apply(encoder, 6, xyz, sample, &clipped);
  for (int i = 0; i < 9; ++i)
    assert_int_equal(sample[i], 65535);
  for (int c = 0; c < 3; ++c) {
    assert_int_equal(sample[9 + c], 0);
    assert_int_equal(sample[15 + c], 0);
  }
  assert_int_equal(sample[12], 0);
  assert_int_equal(clipped.n, 2);
  assert_int_equal(clipped.n_bright, 1);
  ef_encoder_free(encoder);
}

/* ---- What is written ----------------------------------------------------- */

enum { SIDE = 100 };

static ef_cube *invented_cube(double *value) {
  static const double nm[5] = {400, 475, 550, 625, 700};
  const shape s = {.width = SIDE, .height = SIDE, .n_bands = 5,
                   .type = EF_FLOAT32, .interleave = EF_BSQ};
  gen g = gen_new(77);
  for (size_t i = 0; i < SIDE * SIDE * 5; ++i)
    value[i] = (double)(float)gen_unit(&g);
  write_cube(&s, nm, value, "");
  return open_cube(NULL);
}

static ef_status write_either(bool is_png, const ef_cube *cube,
                              ef_error *error) {
  char path[SCRATCH_PATH];
  const ef_render_settings settings = render_settings(2);
  ef_clipped clipped;
  ef_render *r = ef_render_new(cube, observer, &settings, NULL);
  ef_encoder *encoder = ef_encoder_new(ef_encoding_find("srgb", NULL),
                                       (ef_xyz){95.04, 100.0, 108.88},
                                       EF_ADAPT_CAT16, 16, NULL);
  scratch_path(is_png ? "out.png" : "out.hdr", path);
  const ef_status status =
      is_png ? ef_render_write_png(r, encoder, path, true, &clipped, error)
             : ef_render_write_cube(r, path, true, "values {X}\nof it", error);
  ef_encoder_free(encoder);
  ef_render_free(r);
  return status;
}

/* The header can be read by the same reader once it is given wavelengths, and
 * the values are those rendered, as floats. */
static void values_are_written_as_floats(void **state) {
  (void)state;
  double *value = malloc(SIDE * SIDE * 5 * sizeof *value);
  ef_cube *cube = invented_cube(value);
  ef_error error = {0};
  assert_int_equal(write_either(false, cube, &error), EF_OK);
  size_t length;
  char *header = scratch_read("out.hdr", &length);
  assert_non_null(strstr(header, "description = {values  X  of it}\n"));
  assert_non_null(strstr(header, "band names = {X, Y, Z}\n"));
  free(header);
  float *floats = (float *)(void *)scratch_read("out.bip", &length);
  assert_int_equal(length, SIDE * SIDE * 3 * sizeof *floats);
  const ef_render_settings settings = render_settings(1);
  ef_render_info info;
  double *seen = render_all(cube, &settings, &info);
  for (size_t i = 0; i < SIDE * SIDE * 3; ++i)
    assert_true(floats[i] == (float)seen[i]);
  free(seen);
  free(floats);
  free(value);
  ef_cube_free(cube);
}

/* The picture's own tags lead back to the colours. */
static void a_picture_shows_the_colours(void **state) {
  (void)state;
  double *value = malloc(SIDE * SIDE * 5 * sizeof *value);
  ef_cube *cube = invented_cube(value);
  ef_error error = {0};
  char path[SCRATCH_PATH];
  assert_int_equal(write_either(true, cube, &error), EF_OK);
  scratch_path("out.png", path);
  ef_picture *picture = ef_picture_open(path, NULL, &error);
  assert_non_null(picture);
  assert_int_equal(ef_picture_get_head(picture)->bits, 16);
  assert_true(ef_picture_get_head(picture)->has_iccp);
  assert_int_equal(ef_picture_get_colours(picture)->source, EF_PNG_CICP);
  const ef_transform_settings how = ef_transform_settings_default();
  ef_transform *to_xyz =
      ef_transform_new(ef_picture_get_profile(picture), NULL, &how, NULL);
  const ef_render_settings settings = render_settings(1);
  ef_render_info info;
  double *seen = render_all(cube, &settings, &info), adapt[9];
  const ef_xyz d65_white = ef_xyy_to_xyz((ef_xyy){0.3127, 0.3290, 100.0});
  const ef_xyz d50_white = {96.42, 100.0, 82.49};
  assert_int_equal(ef_adaptation_matrix(EF_ADAPT_BRADFORD, d65_white, d50_white,
                                        adapt, NULL),
                   EF_OK);
  size_t n_compared = 0;
  for (size_t y = 0; y < SIDE; ++y) {
    uint16_t row[3 * SIDE];
    double in[3 * SIDE], out[3 * SIDE];
    bool has_row;
    assert_int_equal(ef_picture_next_row(picture, row, &has_row, NULL), EF_OK);
    for (size_t i = 0; i < 3 * SIDE; ++i)
      in[i] = row[i] / 65535.0;
    assert_int_equal(ef_transform_apply(to_xyz, SIDE, in, 1, out, NULL), EF_OK);
    for (size_t x = 0; x < SIDE; ++x) {
      const uint16_t *s = row + 3 * x;
      if (s[0] % 65535 == 0 || s[1] % 65535 == 0 || s[2] % 65535 == 0)
        continue; /* clipped, perhaps */
      const double *v = seen + 3 * (y * SIDE + x);
      const ef_xyz at = ef_xyz_transform(adapt, (ef_xyz){v[0], v[1], v[2]});
      const ef_lab shown =
          ef_xyz_to_lab((ef_xyz){out[3 * x], out[3 * x + 1], out[3 * x + 2]},
                        d50_white);
      /* CIE 1931 white of D65 is not its two-figure chromaticity: 0.02. */
      assert_near(ef_delta_e_ciede2000(ef_xyz_to_lab(at, d50_white), shown,
                                       1, 1, 1), 0.0, 0.05);
      ++n_compared;
    }
  }
  assert_true(n_compared > SIDE * SIDE / 3);
  ef_transform_free(to_xyz);
  ef_picture_free(picture);
  free(seen);
  free(value);
  ef_cube_free(cube);
}

/* A disk that is full, a folder that is not there, a file that was cut while it
 * was read: one message, and no new file. */
static void a_failure_leaves_nothing(void **state) {
  (void)state;
  double *value = malloc(SIDE * SIDE * 5 * sizeof *value);
  ef_cube *cube = invented_cube(value);
  char path[SCRATCH_PATH];
  static const char *const names[] = {"out.hdr", "out.bip", "out.png"};
  for (int i = 0; i < 3; ++i) {
    scratch_path(names[i], path);
    unlink(path);
  }
  const size_t before = scratch_count();
  for (int is_png = 0; is_png < 2; ++is_png) {
    ef_error error = {0};
    struct rlimit limit;
    assert_int_equal(getrlimit(RLIMIT_FSIZE, &limit), 0);
    void (*const handler)(int) = signal(SIGXFSZ, SIG_IGN);
    const struct rlimit small = {20000, limit.rlim_max};
    assert_int_equal(setrlimit(RLIMIT_FSIZE, &small), 0);
    const ef_status status = write_either(is_png == 1, cube, &error);
    assert_int_equal(setrlimit(RLIMIT_FSIZE, &limit), 0);
    signal(SIGXFSZ, handler);
    assert_int_equal(status, EF_UNWRITABLE);
    assert_error(&error, EF_UNWRITABLE, "cannot be written: File too large");
    assert_int_equal(scratch_count(), before);
    scratch_path("cube.img", path);
    assert_int_equal(truncate(path, 100), 0);
    assert_int_equal(write_either(is_png == 1, cube, &error), EF_MALFORMED);
    assert_error(&error, EF_MALFORMED, "earlier than when it was opened");
    assert_int_equal(scratch_count(), before);
    ef_cube_free(cube);
    cube = invented_cube(value);
  }
  ef_error error = {0};
  assert_null(ef_cube_out_open("/nowhere/out.hdr", true, 1, 1, 1, names, "",
                               &error));
  assert_error(&error, EF_UNWRITABLE, "its folder does not exist");
  assert_null(ef_cube_out_open("out.img", true, 1, 1, 1, names, "", &error));
  assert_error(&error, EF_INVALID, "a name that ends in .hdr");
  free(value);
  ef_cube_free(cube);
  remove_cube();
}

/* ---- Files beside the header --------------------------------------------- */

static void the_file_beside_is_found(void **state) {
  (void)state;
  static const double nm[1] = {555}, value[1] = {3};
  const shape s = {.width = 1, .height = 1, .n_bands = 1, .type = EF_UINT8};
  char path[SCRATCH_PATH], data[SCRATCH_PATH];
  ef_error error = {0};
  write_cube(&s, nm, NULL, "");
  scratch_path("cube.hdr", path);
  assert_null(ef_cube_open(path, NULL, &error));
  assert_error(&error, EF_UNREADABLE, "no file with its values stands beside");
  static const char *const names[] = {"cube", "cube.raw", "cube.bsq"};
  for (int i = 0; i < 3; ++i) {
    write_values(names[i], &s, value);
    ef_cube *cube = ef_cube_open(path, NULL, &error);
    assert_non_null(cube);
    scratch_path(names[i], data);
    assert_string_equal(ef_cube_get_head(cube)->data_file, data);
    ef_cube_free(cube);
    unlink(data);
  }
  write_values("cube.dat", &s, value);
  write_values("cube.bil", &s, value);
  assert_null(ef_cube_open(path, NULL, &error));
  assert_error(&error, EF_MALFORMED, "the file with its values may be ");
  const ef_cube_settings settings = {.data = data};
  scratch_path("cube.dat", data);
  ef_cube *cube = ef_cube_open(path, &settings, &error);
  assert_non_null(cube);
  ef_cube_free(cube);
  unlink(data);
  scratch_path("cube.bil", data);
  unlink(data);
  scratch_path("cube.hdr", data);
  unlink(data);
}

static int start(void **state) {
  observer = ef_observer_new("cie-1931", NULL);
  d65 = ef_illuminant_new("D65", NULL);
  return observer != NULL && d65 != NULL ? scratch_make(state) : -1;
}

static int finish(void **state) {
  char path[SCRATCH_PATH];
  static const char *const names[] = {"out.hdr", "out.bip", "out.png"};
  for (int i = 0; i < 3; ++i) {
    scratch_path(names[i], path);
    unlink(path);
  }
  ef_observer_free(observer);
  ef_illuminant_free(d65);
  return scratch_remove(state);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(a_pixel_is_its_spectrum),
      cmocka_unit_test(threads_and_layout_change_nothing),
      cmocka_unit_test(bands_are_put_in_order),
      cmocka_unit_test(unseen_bands_are_not_read),
      cmocka_unit_test(pixels_without_data_are_counted),
      cmocka_unit_test(ignored_values_are_found),
      cmocka_unit_test(kind_is_found),
      cmocka_unit_test(codes_are_the_nearest),
      cmocka_unit_test(what_lies_outside_is_clipped),
      cmocka_unit_test(values_are_written_as_floats),
      cmocka_unit_test(a_picture_shows_the_colours),
      cmocka_unit_test(a_failure_leaves_nothing),
      cmocka_unit_test(the_file_beside_is_found),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, start, finish);
}
