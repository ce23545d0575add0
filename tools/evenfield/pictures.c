/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "pictures.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "dichromat.h"
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
  p->pair[p->n++] = (picture_pair){.name = copy,
                                   .target = target,
                                   .match = match,
                                   .shown = shown,
                                   .difference = difference};
  return EF_OK;
}

static ef_status begin(void *self, const match_scene *s, ef_error *error) {
  (void)self;
  return pictures_check(s->observer, error);
}

static ef_status collect(void *self, const match_scene *s,
                         const match_rows *rows, ef_error *error) {
  ef_status status = EF_OK;
  for (size_t i = 0; i < rows->n && status == EF_OK; ++i) {
    const ef_match *m = &rows->match[i];
    const ef_shown *shown = match_achieved(s, m);
    status = pictures_add(self, rows->name[i], m->target, shown->xyz,
                          m->in_gamut, shown->difference, error);
  }
  return status;
}

static ef_status end(void *self, const match_scene *s, const match_summary *sum,
                     ef_error *error) {
  (void)sum;
  const picture_eyes eyes = {s->observer, ef_setup_white(s->setup), s->metric,
                             s->jnd.value};
  return pictures_write(self, &eyes, s->options, error);
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

ef_status pictures_check(const ef_observer *observer, ef_error *error) {
  if (ef_observer_dimensions(observer) == 3)
    return EF_OK;
  return message_fail(error, EF_NO_ANSWER,
                      "pictures are for eyes with three kinds of cones, and "
                      "the colours of observer %.100s have two dimensions: "
                      "draw another observer's with --seen-by",
                      ef_observer_name(observer));
}

static void draw_as_they_are(pictures *p) {
  for (size_t i = 0; i < p->n; ++i) {
    picture_pair *pair = &p->pair[i];
    pair->drawn = (ef_swatch){.name = pair->name,
                              .target = pair->target,
                              .match = pair->match,
                              .shown = pair->shown,
                              .difference = pair->difference};
  }
}

/* Whether the halves are alike is then told by what is drawn. */
static ef_status draw_as_seen(pictures *p, const picture_eyes *eyes,
                              int seen_by, ef_error *error) {
  const ef_conditions conditions = ef_conditions_default(eyes->white);
  dichromat d;
  const ef_status status =
      dichromat_init(&d, seen_by, eyes->observer, eyes->white, error);
  for (size_t i = 0; i < p->n && status == EF_OK; ++i) {
    ef_swatch *drawn = &p->pair[i].drawn;
    double at[2][3];
    drawn->target = dichromat_see(&d, drawn->target);
    drawn->match = dichromat_see(&d, drawn->match);
    ef_metric_coordinates(eyes->metric, drawn->target, &conditions, at[0]);
    ef_metric_coordinates(eyes->metric, drawn->match, &conditions, at[1]);
    drawn->difference = ef_metric_difference(eyes->metric, at[0], at[1]);
    drawn->shown = !(drawn->difference > eyes->jnd);
  }
  return status;
}

static ef_status draw_each(pictures *p, const ef_swatch_settings *settings,
                           ef_error *error) {
  for (size_t i = 0; i < p->n; ++i) {
    ef_swatch_report report;
    const ef_status status = ef_swatch_write(p->pair[i].file, &p->pair[i].drawn,
                                             settings, &report, error);
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
    swatches[i] = p->pair[i].drawn;
  settings.width = p->n <= 30 ? 384 : p->n <= 120 ? 256 : 160;
  ef_swatch_report report;
  const ef_status status = ef_swatch_write_sheet(p->sheet, p->n, swatches,
                                                 &settings, &report, error);
  p->labelled = report.labelled;
  free(swatches);
  return status;
}

ef_status pictures_write(pictures *p, const picture_eyes *eyes,
                         const command_options *options, ef_error *error) {
  ef_swatch_settings settings = ef_swatch_settings_default();
  settings.white = eyes->white;
  settings.bits = options->swatch_bits;
  settings.difference_symbol = ef_metric_symbol(eyes->metric);
  settings.overwrite = options->force;
  draw_as_they_are(p);
  ef_status status = EF_OK;
  if (options->seen_by >= 0)
    status = draw_as_seen(p, eyes, options->seen_by, error);
  if (status == EF_OK)
    status = name_files(p, options->force, error);
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
