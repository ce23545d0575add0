/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A frame of 1024 x 1024 pixels with a Gabor patch or a grating as a PNG file,
 * beside libpng with its defaults writing the same samples to memory. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include <png.h>

#include <evenfield/exchange.h>

#include "bench.h"

enum { SIDE = 1024 };

static uint16_t *sample;
static int bits;
static size_t peer_bytes;
static char path[64];

static void fill_row(void *cookie, size_t y, uint16_t *row) {
  (void)cookie;
  memcpy(row, sample + y * SIDE * 3, SIDE * 3 * sizeof *row);
}

/* Into a file that takes its name when it is whole and on the disk. */
static void run_ours(void *context) {
  (void)context;
  const ef_png_rows rows = {.fill = fill_row};
  ef_error error;
  if (ef_png_write_rows(path, true, SIDE, SIDE, bits, &rows, NULL, &error) ==
      EF_OK)
    return;
  fprintf(stderr, "%s\n", error.message);
  exit(1);
}

static void count_bytes(png_structp png, png_bytep bytes, size_t length) {
  (void)png;
  (void)bytes;
  peer_bytes += length;
}

static void flush_nothing(png_structp png) {
  (void)png;
}

static void run_peer(void *context) {
  (void)context;
  static png_byte row[SIDE * 6];
  peer_bytes = 0;
  png_structp png =
      png_create_write_struct(PNG_LIBPNG_VER_STRING, NULL, NULL, NULL);
  png_infop info = png_create_info_struct(png);
  png_set_write_fn(png, NULL, count_bytes, flush_nothing);
  png_set_IHDR(png, info, SIDE, SIDE, bits, PNG_COLOR_TYPE_RGB,
               PNG_INTERLACE_NONE, PNG_COMPRESSION_TYPE_BASE,
               PNG_FILTER_TYPE_BASE);
  png_write_info(png, info);
  for (size_t y = 0; y < SIDE; ++y) {
    for (size_t i = 0; i < SIDE * 3; ++i) {
      const uint16_t s = sample[y * SIDE * 3 + i];
      if (bits == 16) row[2 * i] = (png_byte)(s >> 8);
      if (bits == 16) row[2 * i + 1] = (png_byte)(s & 255);
      if (bits == 8) row[i] = (png_byte)(s / 257);
    }
    png_write_row(png, row);
  }
  png_write_end(png, info);
  png_destroy_write_struct(&png, &info);
}

static double gabor(double x, double y) {
  return exp(-0.5 * (x * x + y * y)) * sin(4 * 3.14159265 * (x + 0.3 * y));
}

static double grating(double x, double y) {
  (void)y;
  return sin(4 * 3.14159265 * x);
}

static void bench_frame(const char *name, double (*pattern)(double, double),
                        int n_bits) {
  static const double direction[3] = {0.4, -0.24, 0.05};
  bits = n_bits;
  for (size_t y = 0; y < SIDE; ++y) {
    for (size_t x = 0; x < SIDE; ++x) {
      const double value =
          pattern(((double)x - 512) / 128, ((double)y - 512) / 128);
      for (size_t c = 0; c < 3; ++c) {
        const double drive = 0.5 + direction[c] * value;
        sample[3 * (SIDE * y + x) + c] =
            (uint16_t)(bits == 16 ? drive * 65535 + 0.5
                                  : 257 * floor(drive * 255 + 0.5));
      }
    }
  }
  char names[3][64], what[96];
  snprintf(names[0], sizeof names[0], "png_%s%d_libpng", name, bits);
  snprintf(names[1], sizeof names[1], "png_%s%d", name, bits);
  snprintf(names[2], sizeof names[2], "png_%s%d_size", name, bits);
  bench_entry entry[] = {{names[0], run_peer, NULL, false, 0},
                         {names[1], run_ours, NULL, false, 0}};
  bench_run(2, entry);
  bench_per_item(2, entry, 1);
  snprintf(what, sizeof what, "PNG of a 1024 x 1024 frame, %s, %d bits", name,
           bits);
  bench_row(what, "libpng, defaults", &entry[1], &entry[0], 3);
  struct stat file;
  if (stat(path, &file) == 0)
    bench_value(names[2], (double)file.st_size / (double)peer_bytes,
                "of the size of libpng's");
}

int main(void) {
  sample = bench_allocate((size_t)SIDE * SIDE * 3, sizeof *sample);
  snprintf(path, sizeof path, "/tmp/bench_png_%ld.png", (long)getpid());
  bench_frame("gabor", gabor, 8);
  bench_frame("gabor", gabor, 16);
  bench_frame("grating", grating, 8);
  bench_frame("grating", grating, 16);
  unlink(path);
  free(sample);
  return 0;
}
