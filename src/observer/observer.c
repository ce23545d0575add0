/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The object itself and what can be asked of it. */
#include "observer/observer_private.h"

#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

const char *const ef__tristimulus_names[3] = {"x_bar", "y_bar", "z_bar"};
const char *const ef__receptor_names[EF_N_RECEPTORS] = {
    "l_bar", "m_bar", "s_bar", "rhodopic", "melanopic"};

ef_observer *ef__observer_allocate(const char *name, const char *about,
                                   ef_error *error) {
  const size_t n = ef_grid_standard().count;
  ef_observer *observer = NULL;
  ef_observer part = {
      .dimensions = 3,
      .set = {[EF_TRISTIMULUS] = {.count = 3, .name = ef__tristimulus_names},
              [EF_CONES] = {.count = 3, .name = ef__receptor_names},
              [EF_RECEPTORS] = {.count = EF_N_RECEPTORS,
                                .name = ef__receptor_names}}};
  const ef__part parts[] = {
      {&observer, 1, sizeof *observer},
      {&part.set[EF_TRISTIMULUS].value, 3 * n, sizeof(double)},
      {&part.set[EF_RECEPTORS].value, EF_N_RECEPTORS * n, sizeof(double)},
      {&part.name, strlen(name) + 1, 1},
      {&part.about, strlen(about) + 1, 1}};
  if (ef__allocate_block(sizeof parts / sizeof *parts, parts) == NULL) {
    ef__error_memory(error, "observer");
    return NULL;
  }
  strcpy(part.name, name);
  strcpy(part.about, about);
  part.set[EF_CONES].value = part.set[EF_RECEPTORS].value;
  *observer = part;
  return observer;
}

void ef_observer_free(ef_observer *observer) {
  free(observer); /* one block */
}

const char *ef_observer_name(const ef_observer *observer) {
  return observer->name;
}

const char *ef_observer_about(const ef_observer *observer) {
  return observer->about;
}

double ef_observer_field_deg(const ef_observer *observer) {
  return observer->field_deg;
}

double ef_observer_k_m(const ef_observer *observer) {
  return observer->k_m;
}

bool ef_observer_cones_borrowed(const ef_observer *observer) {
  return observer->cones_borrowed;
}

size_t ef_observer_dimensions(const ef_observer *observer) {
  return observer->dimensions;
}

bool ef_observer_model(const ef_observer *observer, ef_cone_model *out) {
  if (observer->has_model) *out = observer->model;
  return observer->has_model;
}

ef_mb_scale ef_observer_mb_scale(const ef_observer *observer) {
  return observer->mb_scale;
}

ef_channels ef_observer_channels(const ef_observer *observer,
                                 ef_channel_role role) {
  const ef__channel_set *const set = &observer->set[role];
  return (ef_channels){set->count, set->name, ef_grid_standard(), set->value};
}
