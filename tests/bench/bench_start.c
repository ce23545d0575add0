/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Processor time of `evenfield --version`, from its start to its end, beside a
 * program that does nothing. Arguments: the command and that program. */
#include <fcntl.h>
#include <spawn.h>
#include <stdio.h>
#include <stdlib.h>
#include <sys/resource.h>
#include <sys/wait.h>

#include "bench.h"

enum { STARTS = 201 };

extern char **environ;

static double busy_of_children_s(void) {
  struct rusage use;
  getrusage(RUSAGE_CHILDREN, &use);
  return (double)(use.ru_utime.tv_sec + use.ru_stime.tv_sec) +
         1e-6 * (double)(use.ru_utime.tv_usec + use.ru_stime.tv_usec);
}

static double start(char *program) {
  static char option[] = "--version";
  char *argument[] = {program, option, NULL};
  posix_spawn_file_actions_t silent;
  posix_spawn_file_actions_init(&silent);
  posix_spawn_file_actions_addopen(&silent, 1, "/dev/null", O_WRONLY, 0);
  const double before = busy_of_children_s();
  pid_t child;
  int status = 1;
  if (posix_spawn(&child, program, &silent, NULL, argument, environ) != 0 ||
      waitpid(child, &status, 0) != child || status != 0) {
    fprintf(stderr, "%s does not run\n", program);
    exit(1);
  }
  posix_spawn_file_actions_destroy(&silent);
  return busy_of_children_s() - before;
}

static int by_size(const void *a, const void *b) {
  const double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

int main(int argc, char **argv) {
  static double taken[2][STARTS];
  if (argc != 3) {
    fprintf(stderr, "usage: bench_start COMMAND TRIVIAL\n");
    return 2;
  }
  bench_entry entry[2] = {{.name = "start"}, {.name = "start_trivial"}};
  for (size_t i = 0; i < STARTS; ++i) {
    for (int k = 0; k < 2; ++k) taken[k][i] = start(argv[k + 1]);
  }
  for (int k = 0; k < 2; ++k) {
    qsort(taken[k], STARTS, sizeof taken[k][0], by_size);
    entry[k].seconds = taken[k][STARTS / 2];
  }
  bench_per_item(2, entry, 1);
  /* Not a race: how many times as long, at most 2.5. */
  const double times = entry[0].seconds / entry[1].seconds;
  bench_value("start_times_trivial", times, "times as long");
  printf("| `evenfield --version`, start to end | a program that does nothing "
         "| %.1f times as long | 2.5 at most |\n",
         times);
  return 0;
}
