/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Long CSV files: how fast they are turned into numbers beside mere reading and
 * beside `wc -l`, rows a second of the commands that stream them, by one thread
 * and by two, and the memory that they take at 10^5 and 10^6 rows. Argument:
 * the command. */
#define _DEFAULT_SOURCE /* wait4 */
#include <fcntl.h>
#include <spawn.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include <evenfield/exchange.h>

#include "bench.h"
#include "gen.h"

enum { CHUNK = 256 << 10, SAMPLES = 31, RUNS = 5 };
enum { FEW = 100000, MANY = 1000000, SPECTRA = 200000 };

extern char **environ;

/* ---- Files ------------------------------------------------------------- */

typedef struct file {
  char path[64];
  double bytes;
} file;

static FILE *begin(file *f, const char *folder, const char *name) {
  snprintf(f->path, sizeof f->path, "%.40s/%.16s", folder, name);
  FILE *const out = fopen(f->path, "w");
  if (out == NULL) {
    fprintf(stderr, "%s cannot be written\n", f->path);
    exit(1);
  }
  return out;
}

static void end(file *f, FILE *out) {
  struct stat about;
  if (fclose(out) != 0 || stat(f->path, &about) != 0) exit(1);
  f->bytes = (double)about.st_size;
}

/* Colours of random paint; of a second file of one seed nearly the same. */
static file make_colours(const char *folder, const char *name, size_t n,
                         double noise) {
  file f;
  gen g = gen_new(1), own = gen_new(2);
  FILE *const out = begin(&f, folder, name);
  fputs("name,L,a,b\n", out);
  for (size_t i = 0; i < n; ++i) {
    const double L = gen_between(&g, 5, 95) + noise * gen_unit(&own);
    const double a = gen_between(&g, -60, 60);
    const double b = gen_between(&g, -60, 60);
    fprintf(out, "s%zu,%.4f,%.4f,%.4f\n", i, L, a, b);
  }
  end(&f, out);
  return f;
}

static file make_spectra(const char *folder) {
  file f;
  gen g = gen_new(3);
  FILE *const out = begin(&f, folder, "spectra.csv");
  fputs("# quantity: reflectance\nname", out);
  for (int k = 0; k < SAMPLES; ++k) fprintf(out, ",%d", 400 + 10 * k);
  fputc('\n', out);
  for (size_t i = 0; i < SPECTRA; ++i) {
    double value[SAMPLES];
    gen_smooth(&g, SAMPLES, value);
    fprintf(out, "s%zu", i);
    for (int k = 0; k < SAMPLES; ++k) fprintf(out, ",%.5f", value[k]);
    fputc('\n', out);
  }
  end(&f, out);
  return f;
}

/* ---- Reading ----------------------------------------------------------- */

static volatile size_t seen;

static int open_or_end(const char *path) {
  const int descriptor = open(path, O_RDONLY);
  if (descriptor < 0) exit(1);
  return descriptor;
}

static void read_bytes(void *context) {
  static char bytes[CHUNK];
  const file *const f = context;
  const int descriptor = open_or_end(f->path);
  ssize_t got;
  while ((got = read(descriptor, bytes, CHUNK)) > 0) seen = (size_t)got;
  close(descriptor);
}

static void count_lines(void *context) {
  static char bytes[CHUNK];
  const file *const f = context;
  const int descriptor = open_or_end(f->path);
  size_t n = 0;
  ssize_t got;
  while ((got = read(descriptor, bytes, CHUNK)) > 0) {
    const char *at = bytes;
    const char *const behind = bytes + got;
    while ((at = memchr(at, '\n', (size_t)(behind - at))) != NULL) {
      ++n;
      if (++at == behind) break;
    }
  }
  close(descriptor);
  seen = n;
}

static void parse(void *context) {
  const file *const f = context;
  ef_error error;
  ef_reader *const reader = ef_reader_open(f->path, NULL, &error);
  ef_block block;
  size_t n = 0;
  do {
    if (reader == NULL ||
        ef_reader_next(reader, 8192, &block, &error) != EF_OK) {
      fprintf(stderr, "%s: %s\n", f->path, error.message);
      exit(1);
    }
    n += block.n;
  } while (block.n > 0);
  ef_reader_free(reader);
  seen = n;
}

/* ---- Programs ---------------------------------------------------------- */

typedef struct use {
  double wall_s, busy_s, mb;
} use;

static use run_once(char *const *argument) {
  posix_spawn_file_actions_t silent;
  posix_spawn_file_actions_init(&silent);
  posix_spawn_file_actions_addopen(&silent, 1, "/dev/null", O_WRONLY, 0);
  const double start_s = bench_wall_s();
  pid_t child;
  int status = 1;
  struct rusage r;
  if (posix_spawnp(&child, argument[0], &silent, NULL, argument, environ) !=
          0 ||
      wait4(child, &status, 0, &r) != child || status != 0) {
    fprintf(stderr, "%s does not run\n", argument[0]);
    exit(1);
  }
  posix_spawn_file_actions_destroy(&silent);
  return (use){bench_wall_s() - start_s,
               (double)(r.ru_utime.tv_sec + r.ru_stime.tv_sec) +
                   1e-6 * (double)(r.ru_utime.tv_usec + r.ru_stime.tv_usec),
               (double)r.ru_maxrss / 1024};
}

static int by_size(const void *a, const void *b) {
  const double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* The median of each, on its own. */
static use run(char *const *argument, size_t n_runs) {
  double wall_s[RUNS], busy_s[RUNS];
  use last = {0, 0, 0};
  for (size_t i = 0; i < n_runs; ++i) {
    last = run_once(argument);
    wall_s[i] = last.wall_s;
    busy_s[i] = last.busy_s;
  }
  qsort(wall_s, n_runs, sizeof *wall_s, by_size);
  qsort(busy_s, n_runs, sizeof *busy_s, by_size);
  return (use){wall_s[n_runs / 2], busy_s[n_runs / 2], last.mb};
}

/* ---- The commands ------------------------------------------------------ */

typedef struct job {
  char *program;
  const char *name, *format;
  file *first, *second; /* NULL: one file */
} job;

static use run_job(const job *j, int jobs, size_t n_runs) {
  char jobs_text[8], name[16], format[8];
  static char format_option[] = "--format", jobs_option[] = "--jobs";
  static char quiet[] = "--quiet";
  snprintf(jobs_text, sizeof jobs_text, "%d", jobs);
  snprintf(name, sizeof name, "%s", j->name);
  snprintf(format, sizeof format, "%s", j->format);
  char *argument[] = {j->program,
                      name,
                      quiet,
                      format_option,
                      format,
                      jobs_option,
                      jobs_text,
                      j->first->path,
                      j->second != NULL ? j->second->path : NULL,
                      NULL};
  return run(argument, n_runs);
}

static void value(const job *j, const char *what, double number,
                  const char *unit) {
  char name[64];
  snprintf(name, sizeof name, "%s_%s_%s", j->name, j->format, what);
  bench_value(name, number, unit);
}

static void tell_rates(const job *j) {
  const use one = run_job(j, 1, RUNS);
  const use two = run_job(j, 2, RUNS);
  value(j, "busy", 1e6 * one.busy_s / FEW, "us/row");
  value(j, "1_job", FEW / one.wall_s, "rows/s");
  value(j, "2_jobs", FEW / two.wall_s, "rows/s");
  value(j, "2_jobs_over_1", one.wall_s / two.wall_s, "times");
}

static void tell_memory(const job *few, const job *many) {
  const use at_few = run_job(few, 2, 1);
  const use at_many = run_job(many, 2, 1);
  value(few, "memory_1e5", at_few.mb, "MB");
  value(few, "memory_1e6", at_many.mb, "MB");
}

static void tell_commands(char *program, const char *folder) {
  file few = make_colours(folder, "few.csv", FEW, 0);
  file few_other = make_colours(folder, "other_few.csv", FEW, 1);
  file many = make_colours(folder, "many.csv", MANY, 0);
  file many_other = make_colours(folder, "other_many.csv", MANY, 1);
  static const char *const names[] = {"describe", "match", "compare",
                                      "compare"};
  static const char *const formats[] = {"csv", "csv", "csv", "text"};
  for (size_t i = 0; i < sizeof names / sizeof names[0]; ++i) {
    const bool has_two = names[i][0] == 'c';
    const job at_few = {program, names[i], formats[i], &few,
                        has_two ? &few_other : NULL};
    const job at_many = {program, names[i], formats[i], &many,
                         has_two ? &many_other : NULL};
    tell_rates(&at_few);
    tell_memory(&at_few, &at_many);
  }
  const file *const all[] = {&few, &few_other, &many, &many_other};
  for (size_t i = 0; i < sizeof all / sizeof all[0]; ++i) unlink(all[i]->path);
}

/* ---- Parsing ----------------------------------------------------------- */

static void tell_parsing(const char *what, const char *title, file *f) {
  char name[4][48];
  snprintf(name[0], sizeof name[0], "%s_parse", what);
  snprintf(name[1], sizeof name[1], "%s_wc", what);
  snprintf(name[2], sizeof name[2], "%s_read", what);
  snprintf(name[3], sizeof name[3], "%s_count", what);
  bench_entry entry[4] = {{.name = name[0], .run = parse, .context = f},
                          {.name = name[2], .run = read_bytes, .context = f},
                          {.name = name[3], .run = count_lines, .context = f},
                          {.name = name[1]}};
  static char wc[] = "wc", lines[] = "-l";
  char *const argument[] = {wc, lines, f->path, NULL};
  bench_run(3, entry);
  entry[3].seconds = run(argument, RUNS).busy_s;
  for (size_t i = 0; i < 4; ++i) {
    char rate[64];
    snprintf(rate, sizeof rate, "%s_rate", entry[i].name);
    bench_value(rate, 1e-6 * f->bytes / entry[i].seconds, "MB/s");
  }
  bench_row(title, "`wc -l`", &entry[0], &entry[3], 0);
}

int main(int argc, char **argv) {
  char folder[] = "/tmp/bench_streams_XXXXXX";
  if (argc < 2 || mkdtemp(folder) == NULL) {
    fprintf(stderr, "usage: bench_streams COMMAND\n");
    return 2;
  }
  file spectra = make_spectra(folder);
  tell_parsing("spectra_csv", "CSV of 31 samples a row to numbers", &spectra);
  unlink(spectra.path);
  file colours = make_colours(folder, "colours.csv", MANY, 0);
  tell_parsing("colours_csv", "CSV of 3 numbers a row to numbers", &colours);
  unlink(colours.path);
  tell_commands(argv[1], folder);
  rmdir(folder);
  return 0;
}
