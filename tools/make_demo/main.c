/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Makes the demo scenario of spectra/demo/, a small ferry company that does
 * not exist: its paints, ticket kiosk, leaflet press, deck seats and the
 * laboratory that tests its crews. Every shape and number here is invented.
 *
 *   make_demo DIR           writes all files into DIR
 *   make_demo --check DIR   compares them byte for byte with those in DIR
 *
 * Spectra are sums of bells and steps, put through the model that fits the
 * thing: Kubelka-Munk for paints and plastics, filters over a backlight for the
 * kiosk, Yule-Nielsen and Neugebauer for the press. Instruments add noise from
 * a stream of fixed seed, one per file, so that a change in one file leaves the
 * others alone. Only libm is used. */
#include <errno.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "demo.h"

static const struct demo_file {
  const char *name;
  void (*write)(FILE *out);
} demo_files[] = {
  {"colour-pairs.csv", write_colour_pairs},
  {"flicker-settings.csv", write_flicker_settings},
  {"kiosk-measurements.csv", write_kiosk_measurements},
  {"kiosk-primaries.csv", write_kiosk_primaries},
  {"lab-display.csv", write_lab_display},
  {"leaflet-press.csv", write_leaflet_press},
  {"livery-colourants.csv", write_livery_colourants},
  {"livery.csv", write_livery},
  {"pair-answers.csv", write_pair_answers},
  {"panel-responses.csv", write_panel_responses},
  {"seats-deliveries.csv", write_seats_deliveries},
  {"seats-standard.csv", write_seats_standard},
  {"shop-light.csv", write_shop_light},
  {"signal-colours.csv", write_signal_colours},
};

static FILE *open_demo(const char *dir, const char *name, const char *mode) {
  char path[4096];
  const int length = snprintf(path, sizeof path, "%s/%s", dir, name);
  if (length < 0 || (size_t)length >= sizeof path) {
    fprintf(stderr, "%s: path too long\n", dir);
    return NULL;
  }
  FILE *const file = fopen(path, mode);
  if (file == NULL) {
    fprintf(stderr, "%s: %s\n", path, strerror(errno));
  }
  return file;
}

static bool write_file(const struct demo_file *file, const char *dir) {
  FILE *const out = open_demo(dir, file->name, "wb");
  if (out == NULL) {
    return false;
  }
  file->write(out);
  const bool failed = ferror(out) != 0;
  if (fclose(out) != 0 || failed) {
    fprintf(stderr, "%s/%s: not written whole\n", dir, file->name);
    return false;
  }
  return true;
}

/* Line of the first byte in which two files differ, 0 if none. */
static long first_difference(FILE *a, FILE *b) {
  long line = 1;
  for (;;) {
    const int x = getc(a);
    const int y = getc(b);
    if (x != y) {
      return line;
    }
    if (x == EOF) {
      return 0;
    }
    line += x == '\n';
  }
}

static bool check_file(const struct demo_file *file, const char *dir) {
  FILE *const kept = open_demo(dir, file->name, "rb");
  FILE *const made = tmpfile();
  long line = -1;
  if (made == NULL) {
    fprintf(stderr, "temporary file: %s\n", strerror(errno));
  } else if (kept != NULL) {
    file->write(made);
    rewind(made);
    line = first_difference(made, kept);
    if (line > 0) {
      fprintf(stderr, "%s/%s:%ld: differs from what make_demo makes\n", dir,
              file->name, line);
    }
  }
  if (kept != NULL) {
    fclose(kept);
  }
  if (made != NULL) {
    fclose(made);
  }
  return line == 0;
}

int main(int argc, char **argv) {
  const bool check = argc == 3 && strcmp(argv[1], "--check") == 0;
  if (!check && argc != 2) {
    fprintf(stderr, "usage: make_demo DIR | make_demo --check DIR\n");
    return EXIT_FAILURE;
  }
  bool good = true;
  for (size_t i = 0; i < sizeof demo_files / sizeof demo_files[0]; i++) {
    good &= check ? check_file(&demo_files[i], argv[2])
                  : write_file(&demo_files[i], argv[1]);
  }
  return good ? EXIT_SUCCESS : EXIT_FAILURE;
}
