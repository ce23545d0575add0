/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <signal.h>
#include <stdio.h>
#include <string.h>

#include <evenfield/base.h>

#include "command.h"
#include "help.h"
#include "message.h"

static exit_code unknown_command(const char *name) {
  const command_entry *commands;
  const size_t n = command_all(&commands);
  const char *known[16] = {NULL};
  for (size_t i = 0; i < n && i < 16; ++i)
    known[i] = commands[i].name;
  size_t nearest;
  if (ef_nearest_names(name, known, n, 1, &nearest) > 0) {
    return message_usage("there is no command \"%.100s\"; nearest: %s "
                         "(evenfield alone lists them)",
                         name, known[nearest]);
  }
  return message_usage("there is no command \"%.100s\" (evenfield alone lists "
                       "them)",
                       name);
}

static exit_code run(const command_entry *command, int argc,
                     char *const *argv) {
  command_options options;
  exit_code code =
      options_parse(&options, command->name, command->bit, argc, argv);
  if (code == EXIT_DONE) {
    if (options.help) {
      help_command(stdout, command);
    } else if (options.version) {
      help_version(stdout);
    } else {
      code = command->run(&options);
    }
  }
  options_free(&options);
  return code;
}

int main(int argc, char **argv) {
  exit_code code = EXIT_DONE;
#ifdef SIGXFSZ
  /* A limit on the size of files is told like a full disk, not by ending in the
   * middle of one. */
  signal(SIGXFSZ, SIG_IGN);
#endif
  if (argc < 2 || strcmp(argv[1], "--help") == 0) {
    help_first_screen(stdout);
  } else if (strcmp(argv[1], "--version") == 0) {
    help_version(stdout);
  } else {
    const command_entry *command = command_find(argv[1]);
    code = command != NULL ? run(command, argc - 2, argv + 2)
                           : unknown_command(argv[1]);
  }
  if (code == EXIT_DONE && (fflush(stdout) != 0 || ferror(stdout))) {
    message_usage("standard output could not be written");
    code = EXIT_OUTPUT;
  }
  return (int)code;
}
