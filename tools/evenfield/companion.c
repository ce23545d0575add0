/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "companion.h"

#include <stdlib.h>
#include <string.h>

#include "message.h"

enum { N_PRIMARIES = 3 };

static ef_status make_room(companion *c, size_t most_rows, ef_error *error) {
  c->xyz = malloc(3 * most_rows * sizeof *c->xyz);
  c->match = malloc(most_rows * sizeof *c->match);
  c->amount = malloc(N_PRIMARIES * most_rows * sizeof *c->amount);
  if (c->xyz != NULL && c->match != NULL && c->amount != NULL)
    return EF_OK;
  return message_fail(error, EF_NO_MEMORY, "out of memory for the matches");
}

ef_status companion_init(companion *c, const command_options *options,
                         const ef_setup *setup, const colour_basis *basis,
                         const ef_reader_head *head,
                         const ef_match_settings *settings, size_t most_rows,
                         ef_error *error) {
  *c = (companion){.settings = *settings};
  ef_cone_model model;
  const ef_observer *observer = ef_setup_observer(setup);
  if (ef_observer_dimensions(observer) == 3 ||
      !ef_observer_model(observer, &model)) {
    return EF_OK;
  }
  if (!ef_setup_affine(setup)) {
    return message_fail(error, EF_NO_ANSWER,
                        "the colours of observer %.100s have two dimensions; "
                        "matches for such are found where colours add, on "
                        "displays",
                        ef_observer_name(observer));
  }
  model.deficiency = EF_TRICHROMAT;
  c->settings.bits = 0;
  c->settings.hue_kept = false;
  c->observer = ef_observer_from_model(&model, error);
  if (c->observer == NULL)
    return error->status;
  c->setup =
      ef_setup_new(ef_setup_device(setup), c->observer, NULL, NULL, error);
  if (c->setup == NULL)
    return error->status;
  ef_status status =
      colour_basis_init(&c->basis, c->observer, basis->illuminant, error);
  if (status == EF_OK) {
    status = targets_init(&c->targets, options, c->setup, &c->basis, head, NULL,
                          error);
  }
  return status == EF_OK ? make_room(c, most_rows, error) : status;
}

void companion_free(companion *c) {
  targets_free(&c->targets);
  ef_setup_free(c->setup);
  ef_observer_free(c->observer);
  free(c->xyz);
  free(c->match);
  free(c->amount);
}

ef_status companion_match(companion *c, size_t n, const double *value, int jobs,
                          const double **amount, ef_error *error) {
  ef_status status = targets_xyz(&c->targets, n, value, jobs, c->xyz, error);
  if (status == EF_OK) {
    status = ef_match_batch(c->setup, n, c->xyz, &c->settings, jobs, c->match,
                            error);
  }
  for (size_t i = 0; i < n && status == EF_OK; ++i) {
    memcpy(c->amount + N_PRIMARIES * i, c->match[i].amount,
           N_PRIMARIES * sizeof *c->amount);
  }
  *amount = c->amount;
  return status;
}
