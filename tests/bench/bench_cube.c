/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A spectral image of 150 MB to X, Y, Z, beside a plain read of the same file:
 * once when the system holds the file in memory, which no disk is as fast as,
 * and once when it has been told to forget it. */
#include <fcntl.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include <evenfield/image.h>

#include "bench.h"

enum { WIDTH = 500, HEIGHT = 375, BANDS = 200, SPAN = 1 << 20 };

static char header[64], values[64];
static bool is_cold;
static double sink;
static ef_observer *observer;
static ef_illuminant *d65;

static void fail(const char *what) {
  fprintf(stderr, "%s\n", what);
  exit(1);
}

static int open_values(void) {
  const int descriptor = open(values, O_RDONLY);
  if (descriptor < 0) fail("the file cannot be read");
  if (is_cold) posix_fadvise(descriptor, 0, 0, POSIX_FADV_DONTNEED);
  return descriptor;
}

static void run_read(void *context) {
  static char span[SPAN];
  (void)context;
  const int descriptor = open_values();
  ssize_t n;
  while ((n = read(descriptor, span, sizeof span)) > 0) sink += span[0];
  close(descriptor);
}

static void run_render(void *context) {
  const int *const jobs = context;
  ef_error error = {0};
  close(open_values());
  ef_cube *cube = ef_cube_open(header, NULL, &error);
  ef_render_settings settings = ef_render_settings_default(d65);
  settings.jobs = *jobs;
  ef_render *r =
      cube != NULL ? ef_render_new(cube, observer, &settings, &error) : NULL;
  if (r == NULL) fail(error.message);
  size_t n;
  const double *value;
  do {
    if (ef_render_next(r, &n, &value, &error) != EF_OK) fail(error.message);
    if (n > 0) sink += value[0];
  } while (n > 0);
  ef_render_free(r);
  ef_cube_free(cube);
}

static void write_cube(ef_interleave interleave, bool is_float) {
  FILE *file = fopen(header, "w");
  if (file == NULL) fail("the header cannot be written");
  fprintf(file,
          "ENVI\nsamples = %d\nlines = %d\nbands = %d\ndata type = %d\n"
          "interleave = %s\nbyte order = 0\nwavelength units = nm\n"
          "reflectance scale factor = %d\nwavelength = {",
          WIDTH, HEIGHT * (is_float ? 1 : 2), BANDS, is_float ? 4 : 12,
          ef_interleave_text(interleave), is_float ? 1 : 10000);
  for (int k = 0; k < BANDS; ++k)
    fprintf(file, "%s%g", k > 0 ? ", " : "", 380.0 + 2.0 * k);
  fprintf(file, "}\n");
  fclose(file);
  file = fopen(values, "w");
  if (file == NULL) fail("the values cannot be written");
  static float line[WIDTH * BANDS];
  static uint16_t line_16[2 * WIDTH * BANDS];
  for (size_t i = 0; i < WIDTH * BANDS; ++i) {
    line[i] = 0.001F * (float)(i % 997);
    line_16[2 * i] = line_16[2 * i + 1] = (uint16_t)(10 * (i % 997));
  }
  for (size_t y = 0; y < HEIGHT; ++y)
    fwrite(is_float ? (const void *)line : (const void *)line_16, 4,
           WIDTH * BANDS, file);
  /* Pages that wait to be written cannot be forgotten. */
  if (fflush(file) != 0 || fsync(fileno(file)) != 0 || fclose(file) != 0)
    fail("the values cannot be written");
}

/* In memory by the processor time of one thread, reading and summing in turn;
 * from disk by the wall, two threads. */
static void bench_layout(ef_interleave interleave, bool is_float) {
  static int jobs[2] = {1, 2};
  static const char *const states[2] = {"memory", "disk"};
  char names[2][64], what[120];
  const char *as = ef_interleave_text(interleave);
  const char *type = is_float ? "float" : "16-bit";
  write_cube(interleave, is_float);
  for (int cold = 0; cold < 2; ++cold) {
    is_cold = cold == 1;
    snprintf(names[0], sizeof names[0], "read_%s_%s_%s", as, type,
             states[cold]);
    snprintf(names[1], sizeof names[1], "cube_%s_%s_%s", as, type,
             states[cold]);
    bench_entry entry[] = {{names[0], run_read, NULL, is_cold, 0},
                           {names[1], run_render, &jobs[cold], is_cold, 0}};
    bench_run(2, entry);
    for (int i = 0; i < 2; ++i) {
      char rate[96];
      snprintf(rate, sizeof rate, "%s_rate", entry[i].name);
      bench_value(rate, 4e-9 * WIDTH * HEIGHT * BANDS / entry[i].seconds,
                  "GB/s");
    }
    snprintf(what, sizeof what, "spectral image to XYZ, %s, %s, %s", as, type,
             cold == 0 ? "file in memory" : "from disk, two threads");
    bench_row(what, "plain read", &entry[1], &entry[0], 0);
  }
}

int main(void) {
  snprintf(header, sizeof header, "/tmp/bench_cube_%ld.hdr", (long)getpid());
  snprintf(values, sizeof values, "/tmp/bench_cube_%ld.img", (long)getpid());
  observer = ef_observer_new("cie-1931", NULL);
  d65 = ef_illuminant_new("D65", NULL);
  bench_layout(EF_BIP, true);
  bench_layout(EF_BIL, true);
  bench_layout(EF_BSQ, true);
  bench_layout(EF_BIL, false);
  bench_layout(EF_BSQ, false);
  unlink(header);
  unlink(values);
  ef_observer_free(observer);
  ef_illuminant_free(d65);
  return sink > -1e300 ? 0 : 1;
}
