/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "option.h"

#include <limits.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <evenfield/base.h>
#include <evenfield/observer.h>

#include "help.h"
#include "message.h"
#include "option_rows.h"

static void set_defaults(command_options *o) {
  const double not_given = (double)NAN;
  *o = (command_options){.ambient_lux = not_given,
                         .reflectance = not_given,
                         .luminance_cd_m2 = not_given,
                         .jnd = not_given,
                         .tolerance = not_given,
                         .device_max = not_given,
                         .size = not_given,
                         .steps = not_given,
                         .magnification = not_given,
                         .lightness = not_given,
                         .white_cd_m2 = not_given,
                         .background_Y = not_given,
                         .exponent = not_given,
                         .spread = not_given,
                         .batch_sd = not_given,
                         .samples = not_given,
                         .population = not_given,
                         .seed = not_given,
                         .field_deg = not_given,
                         .contrast = not_given,
                         .exposure_s = not_given,
                         .size_deg = not_given,
                         .cycles_per_deg = not_given,
                         .hole_deg = not_given,
                         .edge_deg = not_given,
                         .sigma_deg = not_given,
                         .orientation_deg = not_given,
                         .phase_deg = not_given,
                         .drift_hz = not_given,
                         .distance_mm = not_given,
                         .pixels_per_mm = not_given,
                         .frame_rate_hz = not_given,
                         .frequency_hz = not_given,
                         .time_phase_deg = not_given,
                         .duty = not_given,
                         .duration_s = not_given,
                         .ramp_s = not_given,
                         .most_gb = not_given,
                         .pattern = -1,
                         .time_course = -1,
                         .lapse = not_given,
                         .expected_jnd = not_given,
                         .other_jnd = not_given,
                         .precision = not_given,
                         .false_alarms = not_given,
                         .most = not_given,
                         .white_level = not_given,
                         .model = -1,
                         .axis = -1,
                         .intervals = -1,
                         .kind = -1,
                         .seen_by = -1,
                         .plane = -1,
                         .format = -1,
                         .step_percent = not_given,
                         .total_loading = not_given,
                         .film = not_given,
                         .refractive_index = not_given,
                         .batch_g = not_given,
                         .step_g = not_given,
                         .specular = 1,
                         .yule_nielsen = not_given,
                         .black_percent = not_given,
                         .bits = 8,
                         .match_bits = -1,
                         .swatch_bits = 8,
                         .jobs = 0};
}

/* ---- Messages ---------------------------------------------------------- */

/* What every message about an option ends with. */
static exit_code see_help(const char *command, const char *what) {
  return message_usage("%s (evenfield %s --help lists the options)", what,
                       command);
}

/* `asked` is what was typed, up to an equals sign, with its dashes. */
static exit_code unknown_option(const char *command, command_bit bit,
                                const char *asked) {
  const option_row *rows;
  const size_t n_rows = option_rows(&rows);
  const char *known[MOST_OPTIONS];
  size_t n = 0;
  for (size_t i = 0; i < n_rows; ++i) {
    if (rows[i].commands & bit)
      known[n++] = rows[i].name;
  }
  size_t near[3];
  size_t n_near =
      ef_nearest_names(asked + strspn(asked, "-"), known, n, 3, near);
  if (n_near > 3)
    n_near = 3;
  char text[400];
  size_t length = (size_t)snprintf(text, sizeof text, "%s has no option %.100s",
                                   command, asked);
  for (size_t i = 0; i < n_near; ++i) {
    length += (size_t)snprintf(text + length, sizeof text - length, "%s--%s",
                               i == 0 ? "; nearest: " : ", ", known[near[i]]);
  }
  return see_help(command, text);
}

static exit_code bad_choice(const option_row *o, const char *value) {
  char known[120] = "";
  for (size_t i = 0; o->choices[i] != NULL; ++i) {
    const size_t length = strlen(known);
    snprintf(known + length, sizeof known - length, "%s%s", i == 0 ? "" : ", ",
             o->choices[i]);
  }
  return message_usage("--%s is one of %s, not \"%.100s\"", o->name, known,
                       value);
}

static exit_code bad_range(const option_row *o, const char *value) {
  const bool is_whole = o->type != TYPE_NUMBER;
  char low[EF_NUMBER_TEXT], high[EF_NUMBER_TEXT];
  if (is_whole) {
    ef_number_format_fixed(o->low, 0, low);
    ef_number_format_fixed(o->high, 0, high);
  } else {
    ef_number_format(o->low, low);
    ef_number_format(o->high, high);
  }
  return message_usage("--%s is %s from %s to %s, not \"%.100s\"", o->name,
                       is_whole ? "a whole number" : "a number", low, high,
                       value);
}

/* ---- Parsing ----------------------------------------------------------- */

static exit_code store(command_options *options, const option_row *o,
                       const char *value) {
  void *field = (char *)options + o->offset;
  double number;
  switch (o->type) {
  case TYPE_FLAG:
    *(bool *)field = true;
    return EXIT_DONE;
  case TYPE_TEXT:
  case TYPE_TEXTS:
    if (value[0] == '\0')
      return message_usage("--%s is empty", o->name);
    if (o->type == TYPE_TEXT) {
      *(const char **)field = value;
    } else {
      text_list *list = field;
      list->text[list->n++] = value;
    }
    return EXIT_DONE;
  case TYPE_CHOICE:
    for (int i = 0; o->choices[i] != NULL; ++i) {
      if (strcmp(o->choices[i], value) == 0) {
        *(int *)field = i;
        return EXIT_DONE;
      }
    }
    return bad_choice(o, value);
  case TYPE_INTEGER:
  case TYPE_WHOLE:
  case TYPE_NUMBER:
    if (!ef_number_parse(value, strlen(value), '.', &number) ||
        !(number >= o->low && number <= o->high)) {
      return bad_range(o, value);
    }
    if (o->type != TYPE_NUMBER && number != floor(number))
      return bad_range(o, value);
    if (o->type == TYPE_INTEGER)
      *(int *)field = (int)number;
    else
      *(double *)field = number;
    return EXIT_DONE;
  }
  return EXIT_USAGE;
}

static const option_row *find(command_bit bit, const char *name,
                              size_t length) {
  const option_row *rows;
  const size_t n_rows = option_rows(&rows);
  for (size_t i = 0; i < n_rows; ++i) {
    if ((rows[i].commands & bit) && strlen(rows[i].name) == length &&
        strncmp(rows[i].name, name, length) == 0) {
      return &rows[i];
    }
  }
  return NULL;
}

/* Arguments while they are read. */
typedef struct parser {
  command_options *options;
  const char *command;
  command_bit bit;
  const option_row *rows;
  bool given[MOST_OPTIONS];
} parser;

static void remember(given_options *given, const option_row *o,
                     const char *value) {
  given->name[given->n] = o->name;
  given->value[given->n++] = value;
}

/* The option's value is `value`, or the next argument when that is NULL. */
static exit_code parse_value(parser *p, const option_row *o, const char *value,
                             int n_left, char *const *argv, int *used) {
  char what[200];
  if (o->value == NULL) {
    if (value == NULL) {
      remember(&p->options->given, o, NULL);
      return store(p->options, o, NULL);
    }
    snprintf(what, sizeof what, "--%s takes no value", o->name);
    return see_help(p->command, what);
  }
  if (value == NULL && n_left > 1 && strncmp(argv[1], "--", 2) != 0) {
    value = argv[1];
    *used = 2;
  }
  if (value != NULL) {
    remember(&p->options->given, o, value);
    return store(p->options, o, value);
  }
  snprintf(what, sizeof what, "--%s needs a value: --%s %s", o->name, o->name,
           o->value);
  return see_help(p->command, what);
}

/* One argument that starts with a dash; *used is how many it took. */
static exit_code parse_option(parser *p, int n_left, char *const *argv,
                              int *used) {
  const size_t length = strcspn(argv[0], "=");
  const option_row *o =
      argv[0][1] == '-' ? find(p->bit, argv[0] + 2, length - 2) : NULL;
  char what[128];
  if (o == NULL) {
    snprintf(what, sizeof what, "%.*s", (int)(length < 100 ? length : 100),
             argv[0]);
    return unknown_option(p->command, p->bit, what);
  }
  if (p->given[o - p->rows] && o->type != TYPE_TEXTS) {
    snprintf(what, sizeof what, "--%s is given twice", o->name);
    return see_help(p->command, what);
  }
  p->given[o - p->rows] = true;
  *used = 1;
  const char *value = argv[0][length] == '=' ? argv[0] + length + 1 : NULL;
  return parse_value(p, o, value, n_left, argv, used);
}

exit_code options_parse(command_options *options, const char *command,
                        command_bit bit, int argc, char *const *argv) {
  set_defaults(options);
  /* No list is longer than the arguments. */
  const size_t room = (size_t)argc + 1;
  options->files = calloc(room, sizeof *options->files);
  options->at.text = calloc(room, sizeof *options->at.text);
  options->lights.text = calloc(room, sizeof *options->lights.text);
  options->observers.text = calloc(room, sizeof *options->observers.text);
  options->given.name = calloc(room, sizeof *options->given.name);
  options->given.value = calloc(room, sizeof *options->given.value);
  if (options->given.name == NULL || options->given.value == NULL ||
      options->files == NULL || options->at.text == NULL ||
      options->lights.text == NULL || options->observers.text == NULL) {
    message_usage("out of memory");
    return EXIT_NO_ANSWER;
  }
  options->command = command;
  options->bit = bit;
  options->n_arguments = (size_t)argc;
  options->arguments = argv;
  parser p = {.options = options, .command = command, .bit = bit};
  (void)option_rows(&p.rows);
  bool only_files = false;
  for (int i = 0; i < argc;) {
    const bool is_option =
        !only_files && argv[i][0] == '-' && argv[i][1] != '\0';
    if (is_option && strcmp(argv[i], "--") == 0) {
      only_files = true;
      ++i;
    } else if (is_option) {
      int used = 1;
      const exit_code code = parse_option(&p, argc - i, argv + i, &used);
      if (code != EXIT_DONE)
        return code;
      i += used;
    } else {
      options->files[options->n_files++] = argv[i++];
    }
  }
  if (options->format < 0 && bit != COMMAND_OBSERVER)
    options->format = FORMAT_TEXT;
  return EXIT_DONE;
}

void options_free(command_options *options) {
  free(options->files);
  free(options->at.text);
  free(options->lights.text);
  free(options->observers.text);
  free(options->given.name);
  free(options->given.value);
  options->given = (given_options){0};
  options->files = options->at.text = NULL;
  options->lights.text = options->observers.text = NULL;
}

/* ---- Inputs ------------------------------------------------------------ */

static bool is_output(const option_row *o) {
  static const char *const outputs[] = {"output", "report", "chart",
                                        "pictures", "frames"};
  for (size_t i = 0; i < sizeof outputs / sizeof *outputs; ++i) {
    if (strcmp(o->name, outputs[i]) == 0)
      return true;
  }
  return false;
}

void options_each_input(const command_options *options,
                        void (*take)(void *cookie, const char *value),
                        void *cookie) {
  const option_row *rows;
  const size_t n_rows = option_rows(&rows);
  for (size_t i = 0; i < options->n_files; ++i)
    take(cookie, options->files[i]);
  for (size_t i = 0; i < n_rows; ++i) {
    const option_row *o = &rows[i];
    if (!(o->commands & options->bit) || is_output(o))
      continue;
    const void *field = (const char *)options + o->offset;
    if (o->type == TYPE_TEXT) {
      const char *const *value = field;
      if (*value != NULL)
        take(cookie, *value);
    } else if (o->type == TYPE_TEXTS) {
      const text_list *list = field;
      for (size_t k = 0; k < list->n; ++k)
        take(cookie, list->text[k]);
    }
  }
}

/* ---- Help -------------------------------------------------------------- */

void options_help(FILE *out, command_bit bit) {
  const option_row *rows;
  const size_t n_rows = option_rows(&rows);
  enum { INDENT = 28 };
  for (size_t i = 0; i < n_rows; ++i) {
    const option_row *o = &rows[i];
    if (!(o->commands & bit))
      continue;
    const int written =
        fprintf(out, "  --%s%s%s", o->name, o->value != NULL ? " " : "",
                o->value != NULL ? o->value : "");
    if (written >= INDENT - 1) {
      fprintf(out, "\n%*s", INDENT, "");
    } else {
      fprintf(out, "%*s", INDENT - written, "");
    }
    help_wrap(out, o->help, INDENT);
  }
}
