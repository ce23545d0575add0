/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "targets.h"

#include <math.h>
#include <stdio.h>

#include <evenfield/match.h>

#include "message.h"

/* ---- What the numbers are ---------------------------------------------- */

static bool is_spectral_light(const targets *t) {
  return t->colours.content == EF_CONTENT_SPECTRA &&
         t->colours.kind == EF_LIGHT;
}

/* Shown as they are: no white makes them colours of surfaces. */
static bool is_light(const targets *t) {
  return t->in_cd_m2 || t->colours.kind == EF_LIGHT;
}

static bool is_tristimulus(const targets *t) {
  return t->colours.content == EF_CONTENT_XYZ ||
         t->colours.content == EF_CONTENT_XYY;
}

/* Targets in cd/m2 are brought to Y = 100 for the display's white. */
static ef_status set_scale(targets *t, const command_options *options,
                           bool file_says, ef_error *error) {
  const bool asked = !isnan(options->luminance_cd_m2);
  t->scale = 1.0;
  t->in_cd_m2 = is_tristimulus(t) && (asked || file_says);
  if (!t->in_cd_m2)
    return EF_OK;
  const double white_cd_m2 =
      asked ? options->luminance_cd_m2 : ef_setup_luminance_cd_m2(t->setup);
  if (isnan(white_cd_m2)) {
    return message_fail(error, EF_NO_ANSWER,
                        ef_device_reflects(ef_setup_device(t->setup))
                            ? "the targets are in cd/m2, and what reflects "
                              "has no luminance of its own: give them with "
                              "Y = 100 for the perfect diffuser"
                            : "the targets are in cd/m2, and "
                              "the luminance of this display's white is not "
                              "known: give it with --luminance");
  }
  t->scale = 100.0 / white_cd_m2;
  return EF_OK;
}

/* Lights are shown as they are; surfaces and colours belong to a white, to
 * which the eye would be adapted. */
static ef_status set_adaptation(targets *t, const command_options *options,
                                ef_xyz white, ef_error *error) {
  /* What reflects lies in the same light as the targets. */
  const bool reflects = ef_device_reflects(ef_setup_device(t->setup));
  t->adaptation = is_light(t) || reflects ? EF_ADAPT_NONE : EF_ADAPT_CAT16;
  if (options->adaptation != NULL) {
    const ef_status status =
        ef_adaptation_find(options->adaptation, &t->adaptation, error);
    if (status != EF_OK)
      return message_option(error, "adaptation", "");
  }
  return ef_match_adaptation(ef_setup_observer(t->setup), t->adaptation, white,
                             ef_setup_white(t->setup), t->adapt, error);
}

static void describe(targets *t, const char *light) {
  const char *columns = ef_content_text(t->colours.content);
  if (is_spectral_light(t)) {
    snprintf(t->about, sizeof t->about,
             "lights in the unit of the display's spectra");
  } else if (t->colours.content == EF_CONTENT_SPECTRA) {
    snprintf(t->about, sizeof t->about, "surfaces under %.100s", light);
  } else if (t->in_cd_m2) {
    snprintf(t->about, sizeof t->about, "%s in cd/m2", columns);
  } else if (is_light(t)) {
    snprintf(t->about, sizeof t->about,
             "%s of lights, the display's white at Y = 100", columns);
  } else {
    snprintf(t->about, sizeof t->about, "%s, white %.100s at Y = 100", columns,
             light);
  }
}

ef_status targets_init(targets *t, const command_options *options,
                       const ef_setup *setup, const colour_basis *basis,
                       const ef_reader_head *head, const ef_notes *notes,
                       ef_error *error) {
  *t = (targets){.setup = setup};
  ef_status status = colours_init(&t->colours, basis, head, notes, error);
  if (status != EF_OK)
    return status;
  const bool reflects = ef_device_reflects(ef_setup_device(setup));
  if (is_light(t) && reflects) {
    message_fail(error, EF_NO_ANSWER,
                 "the targets are lights, and this device reflects: it matches "
                 "surfaces, or colours under --illuminant");
    return message_place(error, head->file);
  }
  if (is_spectral_light(t) && !ef_device_has_spectra(ef_setup_device(setup))) {
    message_fail(error, EF_NO_ANSWER,
                 "the targets are spectra of lights, and "
                 "this display is known without spectra: there is no common "
                 "unit");
    return message_place(error, head->file);
  }
  status = set_scale(t, options, head->absolute, error);
  if (status == EF_OK) {
    status = set_adaptation(t, options, basis->white, error);
  }
  describe(t, ef_illuminant_name(basis->illuminant));
  return status;
}

void targets_free(targets *t) {
  colours_free(&t->colours);
}

/* ---- Converting -------------------------------------------------------- */

ef_status targets_xyz(const targets *t, size_t n, const double *value, int jobs,
                      double *xyz, ef_error *error) {
  const ef_status status =
      is_spectral_light(t)
          ? ef_setup_light_xyz(t->setup, &t->colours.grid, n, value, NULL, xyz,
                               error)
          : colours_xyz(&t->colours, n, value, jobs, xyz, error);
  if (status != EF_OK)
    return status;
  for (double *v = xyz; v < xyz + 3 * n; v += 3) {
    ef_xyz c = {v[0] * t->scale, v[1] * t->scale, v[2] * t->scale};
    if (t->adaptation != EF_ADAPT_NONE)
      c = ef_xyz_transform(t->adapt, c);
    v[0] = c.X;
    v[1] = c.Y;
    v[2] = c.Z;
  }
  return EF_OK;
}
