/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "device.h"

#include <math.h>
#include <stdio.h>

#include "message.h"

/* ---- Choosing ---------------------------------------------------------- */

static const device_kind *const kinds[] = {&device_display, &device_inks,
                                           &device_colourants,
                                           &device_profile};
enum { N_KINDS = sizeof kinds / sizeof kinds[0] };

/* What --OPTION of a kind names; NULL when it is not given. */
static const char *named(const command_options *o, const device_kind *kind) {
  return kind == &device_inks         ? o->inks
         : kind == &device_colourants ? o->colourants
         : kind == &device_profile    ? o->profile
                                      : o->display;
}

const device_kind *device_kind_of(const command_options *options) {
  for (size_t i = 0; i < N_KINDS; ++i) {
    if (named(options, kinds[i]) != NULL)
      return kinds[i];
  }
  return &device_display;
}

bool device_is_named(const command_options *options) {
  return named(options, device_kind_of(options)) != NULL;
}

/* An option that only some kinds understand. */
typedef struct own_option {
  const char *name;
  bool given;
  const device_kind *kind[3]; /* which do */
  const char *why;            /* what it says, which others have not */
} own_option;

static exit_code check_own_options(const command_options *o,
                                   const device_kind *kind) {
  const own_option own[] = {
      {"tone", o->tone != NULL, {&device_display}, "a display's tone curve"},
      {"ambient",
       !isnan(o->ambient_lux),
       {&device_display},
       "light on a screen"},
      {"luminance",
       !isnan(o->luminance_cd_m2),
       {&device_display},
       "the luminance of a display's white"},
      {"step",
       !isnan(o->step_percent),
       {&device_inks, &device_profile},
       "the step of ink values"},
      {"yule-nielsen",
       !isnan(o->yule_nielsen),
       {&device_inks},
       "a factor of halftone prints"},
      {"black",
       !isnan(o->black_percent),
       {&device_inks, &device_profile},
       "a fourth ink that stays fixed"},
      {"weighed",
       o->weighed != NULL,
       {&device_colourants},
       "the composition of drawdowns"},
      {"base", o->base != NULL, {&device_colourants}, "one of the colourants"},
      {"use", o->use != NULL, {&device_colourants}, "a choice of colourants"},
      {"total-loading",
       !isnan(o->total_loading),
       {&device_colourants},
       "a limit of mixtures"},
      {"film",
       !isnan(o->film),
       {&device_colourants},
       "the thickness of a mixture"},
      {"substrate",
       o->substrate != NULL,
       {&device_colourants},
       "what a film lies on"},
      {"refractive-index",
       !isnan(o->refractive_index),
       {&device_colourants},
       "a property of the binder"},
      {"aim", o->aim != 0, {&device_colourants}, "a choice of recipes"},
      {"batch-g",
       !isnan(o->batch_g),
       {&device_colourants},
       "the weight of a batch"},
      {"step-g",
       !isnan(o->step_g),
       {&device_colourants},
       "the step of the scales"},
      {"intent", o->intent != NULL, {&device_profile}, "a choice of profiles"},
      {"scale-black", o->scale_black, {&device_profile}, "a choice of profiles"},
      {"bits",
       o->match_bits >= 0,
       {&device_display, &device_inks, &device_profile},
       "the depth of code values"},
  };
  for (size_t i = 0; i < sizeof own / sizeof own[0]; ++i) {
    const own_option *w = &own[i];
    if (!w->given || w->kind[0] == kind || w->kind[1] == kind ||
        w->kind[2] == kind)
      continue;
    return message_usage("--%s goes with --%s%s%s%s%s: it is %s", w->name,
                         w->kind[0]->option, w->kind[1] != NULL ? " or --" : "",
                         w->kind[1] != NULL ? w->kind[1]->option : "",
                         w->kind[2] != NULL ? " or --" : "",
                         w->kind[2] != NULL ? w->kind[2]->option : "", w->why);
  }
  if (isnan(o->film) != (o->substrate == NULL))
    return message_usage("--film and --substrate go together: how thick the "
                         "film is, and what it lies on");
  if (o->specular == 0 && isnan(o->refractive_index))
    return message_usage("--specular goes with --refractive-index");
  if (o->single_constant && o->weighed == NULL)
    return message_usage("--single-constant is for a fit to drawdowns: "
                         "--weighed says of what they were mixed");
  if (kind == &device_display && o->lights.n > 1)
    return message_usage("--illuminant is given more than once, which goes "
                         "with --inks and --colourants");
  if (!isnan(o->step_percent) && o->match_bits >= 0)
    return message_usage("--step and --bits exclude each other: drives are "
                         "multiples of one or the other");
  const double steps = 100.0 / o->step_percent;
  if (!isnan(steps) && fabs(steps - round(steps)) > 1e-9 * steps) {
    char step[EF_NUMBER_TEXT];
    ef_number_format(o->step_percent, step);
    return message_usage("--step is 100 over a whole number, such as 5, 1 or "
                         "0.5, so that full ink is a step, not %s",
                         step);
  }
  return EXIT_DONE;
}

exit_code device_check_usage(const command_options *options) {
  const device_kind *kind = NULL;
  for (size_t i = 0; i < N_KINDS; ++i) {
    if (named(options, kinds[i]) == NULL)
      continue;
    if (kind != NULL) {
      return message_usage("--%s and --%s exclude each other: one device is "
                           "matched at a time",
                           kind->option, kinds[i]->option);
    }
    kind = kinds[i];
  }
  return check_own_options(options, kind != NULL ? kind : &device_display);
}

ef_status device_load(const device_basis *basis, chosen_device *out,
                      ef_error *error) {
  const device_kind *kind = device_kind_of(basis->options);
  *out = (chosen_device){.kind = kind,
                         .source = named(basis->options, kind),
                         .is_demo = named(basis->options, kind) == NULL};
  ef_status status = kind->load(basis, out, error);
  /* A file that makes no device is bad input, also where the library says that
   * there is no answer (dependent primaries, a row that is missing). */
  if (status == EF_NO_ANSWER)
    error->status = status = EF_MALFORMED;
  if (status != EF_OK && error->status != EF_UNKNOWN_NAME)
    message_place(error, out->source);
  return status;
}

void device_free(chosen_device *d) {
  if (d->kind != NULL)
    d->kind->free(d);
  ef_device_free(d->device);
  *d = (chosen_device){0};
}

bool device_is_quantised(const chosen_device *d) {
  return d->bits > 0 || d->step[0] != '\0';
}
