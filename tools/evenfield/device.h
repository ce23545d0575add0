/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The device that is to match: chosen by one of the options --display, --inks
 * ... Each kind is one file, device_KIND.c, which loads it and says what it
 * rests on; everything else asks here. */
#ifndef COMMAND_DEVICE_H
#define COMMAND_DEVICE_H

#include <evenfield/device.h>
#include <evenfield/difference.h>
#include <evenfield/exchange.h>

#include "option.h"
#include "text.h"

typedef struct chosen_device chosen_device;
typedef struct match_scene match_scene;

/** What a device is chosen and judged by; all borrowed. */
typedef struct device_basis {
  const command_options *options;
  const ef_metric *metric;
  const ef_observer *observer;
  const ef_illuminant *illuminant; /**< on what reflects */
  bool needs_spectra;              /**< the answers asked for need them */
  const ef_notes *notes;
} device_basis;

/** The words for one kind. */
typedef struct device_words {
  const char *noun;               /**< "display": "this display" */
  const char *title;              /**< "Display": label of what it rests on */
  const char *shows;              /**< what it does with a colour: "show" */
  const char *shown;              /**< the same as a participle */
  const char *amounts;            /**< head of the table's columns of amounts */
  const char *channel, *channels; /**< what codes are for: "primary", "ink" */
  const char *spectra;            /**< "the spectra of its primaries" */
  const char *none, *all; /**< the colour of all drives at zero, at full */
} device_words;

typedef struct device_kind {
  const char *key; /**< of its object in JSON, and value of device_kind */
  const char *option;
  const char *illuminant;  /**< where none is asked for */
  const char *demo_story;  /**< "on a ticket kiosk's display": what the demo's
                                targets are shown on */
  const char *demo_device; /**< "the demo's ticket kiosk" */
  device_words words;
  /** Fills `device` and `own` of a zeroed struct; failures of files count as
   * bad input. Freed in every case. */
  ef_status (*load)(const device_basis *basis, chosen_device *out,
                    ef_error *error);
  /** Frees `own`. */
  void (*free)(chosen_device *d);
  /** Lines of "What this rests on", the first with the title. */
  void (*describe)(text *out, const match_scene *s);
  /** Members of the device's JSON object behind name and source. */
  void (*write)(ef_json *json, const match_scene *s);
} device_kind;

struct chosen_device {
  const device_kind *kind;
  ef_device *device;
  const char *source; /**< as named on the command line, or a demo */
  bool is_demo;       /**< no option named it */
  /** Drives at zero are its lightest colour (paper), at full its darkest; else
   * the other way round. */
  bool is_subtractive;
  /** Drives are code values of `bits`, or where there are none multiples of
   * 1/n_steps; 0 and 0: any. What a step is called: "1 %", "0.5 g". */
  int bits, n_steps;
  char step[24];
  bool has_black;       /**< a fourth ink, which stays as it is */
  double black_percent; /**< of it */
  void *own; /**< what the kind knows beside */
};

extern const device_kind device_display, device_inks, device_colourants,
    device_profile;

/** Which kind the options name; the display when they name none. */
const device_kind *device_kind_of(const command_options *options);
/** True when an option names a device. */
bool device_is_named(const command_options *options);
/** Usage: one device, and no options that belong to another kind. */
exit_code device_check_usage(const command_options *options);
/** Free with device_free in every case. */
ef_status device_load(const device_basis *basis, chosen_device *out,
                      ef_error *error);
void device_free(chosen_device *d);
/** True when answers come as codes or steps. */
bool device_is_quantised(const chosen_device *d);

#endif
