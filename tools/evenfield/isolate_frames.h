/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --frames: the frames of `isolate`, their folder and its record. */
#ifndef COMMAND_ISOLATE_FRAMES_H
#define COMMAND_ISOLATE_FRAMES_H

#include <evenfield/stimulus.h>

#include "option.h"

typedef struct isolate_scene isolate_scene;
typedef struct isolate_result isolate_result;

/** One picture of a frame. */
typedef struct isolate_picture {
  char file[32];
  size_t first; /**< primary in its first channel */
  uint32_t crc; /**< CRC-32 (as in PNG) of its samples, 16 bits each, the
                     upper byte first, row by row */
} isolate_picture;

/** What is to be shown; `frames` NULL when no option of frames was given. */
typedef struct isolate_show {
  ef_frames *frames;
  ef_frame_settings settings;
  ef_frame_area area;
  ef_flash flash;
  ef_stripes stripes;
  bool has_dither;
  ef_dither_effect dither;
  size_t n_pictures;
  isolate_picture *picture; /**< once they are written */
} isolate_show;

/** True when options ask for frames, or for what they would be. */
bool isolate_shows(const command_options *options);
/** --size-deg, or what goes with the form. */
double isolate_size_deg(const command_options *options);
/** Prepares the frames; free with isolate_show_free in every case. */
ef_status isolate_show_new(isolate_show *show, const isolate_scene *s,
                           const ef_isolation *way, const ef_notes *notes,
                           ef_error *error);
void isolate_show_free(isolate_show *show);
/** Writes the folder of --frames. */
ef_status isolate_show_write(isolate_show *show, const isolate_scene *s,
                             const isolate_result *r, const char *place,
                             ef_error *error);

/* ---- isolate_record.c -------------------------------------------------- */

/** Writes stimulus.json: all that was asked for with the texts of all files,
 * the display's spectra, the answer, and every picture with its checksum. */
ef_status isolate_record_write(const isolate_show *show, const isolate_scene *s,
                               const isolate_result *r, const char *path,
                               ef_error *error);

#endif
