/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "pictures.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "message.h"

/* ---- Collecting -------------------------------------------------------- */

pictures pictures_new(const char *folder, const ef_notes *notes) {
  return (pictures){.folder = folder, .notes = notes};
}

void pictures_free(pictures *p) {
  for (size_t i = 0; i < p->n; ++i) {
    free(p->pair[i].name);
    free(p->pair[i].file);
  }
  free(p->pair);
  free(p->sheet);
  *p = (pictures){0};
}

ef_status pictures_add(pictures *p, const char *name, ef_xyz target,
                       ef_xyz match, bool shown, double difference,
                       ef_error *error) {
  if (p->n >= PICTURES_MOST) {
    return message_fail(error, EF_INVALID,
                        "there are more than %d targets: "
                        "pictures are drawn of fewer",
                        PICTURES_MOST);
  }
  if (p->n == p->room) {
    const size_t room = 2 * p->room + 64;
    picture_pair *grown = realloc(p->pair, room * sizeof *grown);
    if (grown == NULL) {
      return message_fail(error, EF_NO_MEMORY, "out of memory for pictures");
    }
    p->pair = grown;
    p->room = room;
  }
  char *copy = strdup(name);
  if (copy == NULL) {
    return message_fail(error, EF_NO_MEMORY, "out of memory for pictures");
  }
  p->pair[p->n++] =
      (picture_pair){copy, NULL, target, match, shown, difference};
  return EF_OK;
}

static ef_status begin(void *self, const match_scene *s, ef_error *error) {
  (void)self;
  (void)s;
  (void)error;
  return EF_OK;
}

static ef_status collect(void *self, const match_scene *s,
                         const ef_block *block, const ef_match *matches,
                         ef_error *error) {
  ef_status status = EF_OK;
  for (size_t i = 0; i < block->n && status == EF_OK; ++i) {
    const ef_match *m = &matches[i];
    const ef_shown *shown = match_achieved(s, m);
    status = pictures_add(self, block->name[i], m->target, shown->xyz,
                          m->in_gamut, shown->difference, error);
  }
  return status;
}

static ef_status end(void *self, const match_scene *s, const match_summary *sum,
                     ef_error *error) {
  (void)sum;
  return pictures_write(self, ef_setup_white(s->setup), s->metric, s->options,
                        error);
}

match_sink pictures_sink(pictures *p) {
  return (match_sink){.self = p, .begin = begin, .rows = collect, .end = end};
}

/* ---- File names -------------------------------------------------------- */

/* DIR/NNN-name.png: letters, digits and bytes of other scripts stay, what may
 * mean something to a shell or a file system becomes one dash. */
static char *file_of(const char *folder, size_t number, const char *name) {
  enum { MOST_BYTES = 80 };
  const size_t room = strlen(folder) + MOST_BYTES + 40;
  char *path = malloc(room);
  if (path == NULL)
    return NULL;
  size_t length = (size_t)snprintf(path, room, "%s/%03zu", folder, number);
  const size_t most = length + MOST_BYTES;
  bool wants_dash = true;
  for (; *name != '\0' && length + 6 < most; ++name) {
    const unsigned char c = (unsigned char)*name;
    const bool stays = (c >= '0' && c <= '9') || (c >= 'a' && c <= 'z') ||
                       (c >= 'A' && c <= 'Z') || c >= 0x80u;
    if (stays) {
      if (wants_dash)
        path[length++] = '-';
      path[length++] = (char)c;
    }
    wants_dash = !stays;
  }
  /* Not in the middle of a UTF-8 character. */
  while (((unsigned char)*name & 0xC0u) == 0x80u && path[length - 1] != '-') {
    if (((unsigned char)path[--length] & 0xC0u) == 0xC0u)
      break;
  }
  snprintf(path + length, room - length, ".png");
  return path;
}

static ef_status name_files(pictures *p, bool overwrite, ef_error *error) {
  const char *folder = p->folder;
  const size_t room = strlen(folder) + 16;
  p->sheet = malloc(room);
  bool complete = p->sheet != NULL;
  if (complete)
    snprintf(p->sheet, room, "%s/sheet.png", folder);
  for (size_t i = 0; i < p->n && complete; ++i) {
    p->pair[i].file = file_of(folder, i + 1, p->pair[i].name);
    complete = p->pair[i].file != NULL;
  }
  if (!complete) {
    return message_fail(error, EF_NO_MEMORY, "out of memory for file names");
  }
  for (size_t i = 0; i <= p->n && !overwrite; ++i) {
    const char *file = i < p->n ? p->pair[i].file : p->sheet;
    if (access(file, F_OK) != 0)
      continue;
    message_fail(error, EF_EXISTS,
                 "is there already; --force overwrites it, "
                 "or choose another folder with --pictures");
    return message_place(error, file);
  }
  return EF_OK;
}

/* ---- Drawing ----------------------------------------------------------- */

static ef_swatch swatch_of(const picture_pair *pair) {
  return (ef_swatch){.name = pair->name,
                     .target = pair->target,
                     .match = pair->match,
                     .shown = pair->shown,
                     .difference = pair->difference};
}

static ef_status draw_each(pictures *p, const ef_swatch_settings *settings,
                           ef_error *error) {
  for (size_t i = 0; i < p->n; ++i) {
    const ef_swatch swatch = swatch_of(&p->pair[i]);
    ef_swatch_report report;
    const ef_status status =
        ef_swatch_write(p->pair[i].file, &swatch, settings, &report, error);
    if (status != EF_OK)
      return status;
    p->n_clipped += report.n_clipped;
  }
  return EF_OK;
}

static ef_status draw_sheet(pictures *p, ef_swatch_settings settings,
                            ef_error *error) {
  ef_swatch *swatches = malloc(p->n * sizeof *swatches);
  if (swatches == NULL) {
    return message_fail(error, EF_NO_MEMORY, "out of memory for the sheet");
  }
  for (size_t i = 0; i < p->n; ++i)
    swatches[i] = swatch_of(&p->pair[i]);
  settings.width = p->n <= 30 ? 384 : p->n <= 120 ? 256 : 160;
  ef_swatch_report report;
  const ef_status status = ef_swatch_write_sheet(p->sheet, p->n, swatches,
                                                 &settings, &report, error);
  p->labelled = report.labelled;
  free(swatches);
  return status;
}

ef_status pictures_write(pictures *p, ef_xyz white, const ef_metric *metric,
                         const command_options *options, ef_error *error) {
  ef_swatch_settings settings = ef_swatch_settings_default();
  settings.white = white;
  settings.bits = options->swatch_bits;
  settings.difference_symbol = ef_metric_symbol(metric);
  settings.overwrite = options->force;
  ef_status status = name_files(p, options->force, error);
  if (status == EF_OK)
    status = ef_directory_make(p->folder, error);
  if (status == EF_OK)
    status = draw_each(p, &settings, error);
  if (status == EF_OK)
    status = draw_sheet(p, settings, error);
  if (status != EF_OK)
    return status;
  if (p->n_clipped > 0) {
    message_note(p->notes,
                 "%zu of the %zu halves drawn lie outside the pictures' "
                 "own BT.2020 encoding and are clipped to it",
                 p->n_clipped, 2 * p->n);
  }
  if (!p->labelled) {
    message_note(p->notes,
                 "%s has no labels: text needs libcairo.so.2 and a "
                 "font, and one of them is missing",
                 p->sheet);
  }
  return EF_OK;
}
