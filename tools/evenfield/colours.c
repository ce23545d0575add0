/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "colours.h"

#include <string.h>
#include <strings.h>

#include "message.h"

ef_status colour_basis_init(colour_basis *basis, const ef_observer *observer,
                            const ef_illuminant *illuminant, ef_error *error) {
  const ef_grid working = ef_grid_standard();
  double white[3];
  const ef_status status = ef_observer_white(
      observer, EF_TRISTIMULUS, illuminant, &working, white, error);
  if (status != EF_OK)
    return status;
  *basis = (colour_basis){observer, illuminant,
                          (ef_xyz){white[0], white[1], white[2]}};
  return EF_OK;
}

/* Our name for an observer in a file's words: "2 degree", "CIE 1964" ...; NULL
 * when it could be another. */
static const char *observer_named(const char *words) {
  if (strstr(words, "2015") != NULL || strstr(words, "2006") != NULL)
    return NULL;
  if (strstr(words, "1931") != NULL || strncmp(words, "2", 1) == 0)
    return "cie-1931";
  if (strstr(words, "1964") != NULL || strncmp(words, "10", 2) == 0)
    return "cie-1964";
  return NULL;
}

void colours_note_basis(const ef_reader_head *head, const ef_observer *observer,
                        const ef_illuminant *illuminant,
                        const ef_notes *notes) {
  const char *light = ef_illuminant_name(illuminant);
  const char *eyes = ef_observer_name(observer);
  const char *what = ef_content_text(head->content);
  if (head->content == EF_CONTENT_SPECTRA || head->kind == EF_LIGHT)
    return;
  if (head->illuminant[0] != '\0' && strcasecmp(head->illuminant, light) != 0) {
    message_note(notes,
                 "%s: says that its light is %.60s, and its %s are read as of "
                 "%s; --illuminant names another",
                 head->file, head->illuminant, what, light);
  }
  const char *named = observer_named(head->observer);
  if (head->observer[0] != '\0' &&
      (named == NULL || strcmp(named, eyes) != 0)) {
    message_note(notes,
                 "%s: says that its observer is %.60s, and its %s are read as "
                 "of %s; --observer names another",
                 head->file, head->observer, what, eyes);
  }
}

ef_status colours_init(colours *c, const colour_basis *basis,
                       const ef_reader_head *head, const ef_notes *notes,
                       ef_error *error) {
  *c = (colours){.content = head->content,
                 .kind = head->kind,
                 .grid = head->grid,
                 .white = basis->white};
  if (head->content == EF_CONTENT_DEVICE) {
    message_fail(error, EF_MALFORMED,
                 "device values alone are no colours; "
                 "L,a,b or X,Y,Z or x,y,Y or spectra are needed");
    return message_place(error, head->file);
  }
  if (head->content != EF_CONTENT_SPECTRA &&
      ef_observer_dimensions(basis->observer) < 3) {
    message_fail(error, EF_NO_ANSWER,
                 "%s are colours for eyes with three kinds of cones; what "
                 "observer %.100s sees follows from spectra only",
                 ef_content_text(head->content),
                 ef_observer_name(basis->observer));
    return message_place(error, head->file);
  }
  if (head->n_device > 0) {
    message_note(notes, "%s: the device values are not used, only %s",
                 head->file, ef_content_text(head->content));
  }
  if (head->content != EF_CONTENT_SPECTRA) {
    colours_note_basis(head, basis->observer, basis->illuminant, notes);
    return EF_OK;
  }
  ef_viewing viewing =
      ef_viewing_default(head->kind == EF_SURFACE ? basis->illuminant : NULL);
  viewing.absolute = head->kind == EF_LIGHT && head->absolute;
  c->weights = ef_observer_weights(basis->observer, EF_TRISTIMULUS, &head->grid,
                                   &viewing, notes, error);
  return c->weights != NULL ? EF_OK : message_place(error, head->file);
}

void colours_free(colours *c) {
  ef_weights_free(c->weights);
  c->weights = NULL;
}

ef_status colours_xyz(const colours *c, size_t n, const double *value, int jobs,
                      double *xyz, ef_error *error) {
  if (c->content == EF_CONTENT_SPECTRA) {
    return ef_weights_apply(c->weights, n, value, jobs, xyz, error);
  }
  memcpy(xyz, value, 3 * n * sizeof *xyz);
  for (double *v = xyz; v < xyz + 3 * n; v += 3) {
    ef_xyz colour = {v[0], v[1], v[2]};
    if (c->content == EF_CONTENT_LAB) {
      colour = ef_lab_to_xyz((ef_lab){v[0], v[1], v[2]}, c->white);
    } else if (c->content == EF_CONTENT_XYY) {
      colour = ef_xyy_to_xyz((ef_xyy){v[0], v[1], v[2]});
    }
    v[0] = colour.X;
    v[1] = colour.Y;
    v[2] = colour.Z;
  }
  return EF_OK;
}
