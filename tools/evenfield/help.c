/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "help.h"

#include <string.h>

#include <evenfield/base.h>

void help_first_screen(FILE *out) {
  fputs("Evenfield decides, from spectra, whether two lights or two surfaces "
        "will look\nthe same, to whom, and what to do about it.\n\n"
        "Commands:\n",
        out);
  const command_entry *commands;
  const size_t n = command_all(&commands);
  for (size_t i = 0; i < n; ++i) {
    fprintf(out, "  %-10s %s\n", commands[i].name, commands[i].summary);
  }
  fputs("\nFour to try; they need no files:\n"
        "  evenfield match\n"
        "      can the ticket kiosk's display show the ferry's colours?\n"
        "  evenfield compare\n"
        "      will passengers tell the delivered seats from the standard?\n"
        "  evenfield describe demo:livery\n"
        "      the same colours in numbers\n"
        "  evenfield swatch --pictures fields\n"
        "      see target and match side by side\n\n"
        "`evenfield COMMAND --help` says what a command takes.\n",
        out);
}

void help_wrap(FILE *out, const char *text, size_t indent) {
  size_t column = indent;
  while (*text != '\0') {
    const size_t word = strcspn(text, " ");
    if (column > indent && column + 1 + word > 79) {
      fprintf(out, "\n%*s", (int)indent, "");
      column = indent;
    } else if (column > indent) {
      fputc(' ', out);
      ++column;
    }
    fwrite(text, 1, word, out);
    column += word;
    text += word;
    text += strspn(text, " ");
  }
  fputc('\n', out);
}

void help_command(FILE *out, const command_entry *command) {
  fprintf(out, "evenfield %s [OPTIONS]%s%s\n", command->name,
          command->operands[0] != '\0' ? " " : "", command->operands);
  for (size_t i = 0; i < 2 && command->about[i] != NULL; ++i) {
    fputc('\n', out);
    help_wrap(out, command->about[i], 0);
  }
  fputs("\nOptions:\n", out);
  options_help(out, command->bit);
  fputs("\nTo try, without files of your own:\n", out);
  for (size_t i = 0; command->examples[i] != NULL; ++i) {
    fprintf(out, "  %s\n", command->examples[i]);
  }
}

void help_version(FILE *out) {
  fprintf(out, "evenfield %s\n", ef_version());
}
