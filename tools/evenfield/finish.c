/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "finish.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "source.h"

enum {
  LATER_ROWS = 8192,     /* of the parts after the first */
  MOST_VALUES = 1 << 23, /* numbers of a part, whatever its rows */
  MOST_KNOWN = 4 << 20   /* names of earlier parts that are remembered */
};

/* Rows of a part as they come. */
typedef struct row_buffer {
  size_t n, room, width;
  double *value;
  double *angle_deg;
  size_t *line, *offset;
  size_t *name_at; /* into `names` */
  char *names;
  size_t names_used, names_room;
} row_buffer;

/* Hashes of the names of earlier parts, with the lines of the first ones. */
typedef struct known_name {
  uint64_t hash; /* 0: free */
  size_t line;
} known_name;

typedef struct known_names {
  size_t n, n_slots;
  known_name *at;
} known_names;

struct finish_file {
  const command_options *options;
  const char *path;
  ef_reader *reader;
  size_t most_rows;
  const looks *looks;
  looks_colours colours;
  row_buffer rows;
  known_names known;
  bool at_end, is_later;
  size_t n_parts;
};

/* ---- Names ------------------------------------------------------------- */

/* FNV-1a; never 0. */
static uint64_t hash_of(const char *name) {
  uint64_t hash = 14695981039346656037u;
  for (const char *c = name; *c != '\0'; ++c)
    hash = (hash ^ (unsigned char)*c) * 1099511628211u;
  return hash != 0 ? hash : 1;
}

static size_t slots_for(size_t n) {
  size_t n_slots = 16;
  while (n_slots < 2 * n)
    n_slots *= 2;
  return n_slots;
}

/* Where the name is, or the free slot where it would be. */
static size_t *slot_of(const finish_list *list, const char *name) {
  size_t i = (size_t)hash_of(name) & (list->n_slots - 1);
  while (list->slot[i] != SIZE_MAX &&
         strcmp(list->item[list->slot[i]].name, name) != 0) {
    i = (i + 1) & (list->n_slots - 1);
  }
  return &list->slot[i];
}

finish *finish_list_find(const finish_list *list, const char *name) {
  if (list->n == 0)
    return NULL;
  const size_t i = *slot_of(list, name);
  return i == SIZE_MAX ? NULL : &list->item[i];
}

static size_t known_slot(const known_names *k, uint64_t hash) {
  size_t i = (size_t)hash & (k->n_slots - 1);
  while (k->at[i].hash != 0 && k->at[i].hash != hash)
    i = (i + 1) & (k->n_slots - 1);
  return i;
}

static bool known_grow(known_names *k, size_t n) {
  known_names grown = {.n = k->n, .n_slots = slots_for(n)};
  if (k->n_slots >= grown.n_slots)
    return true;
  grown.at = calloc(grown.n_slots, sizeof *grown.at);
  if (grown.at == NULL)
    return false;
  for (size_t i = 0; i < k->n_slots; ++i) {
    if (k->at[i].hash != 0)
      grown.at[known_slot(&grown, k->at[i].hash)] = k->at[i];
  }
  free(k->at);
  *k = grown;
  return true;
}

/* Marks samples whose names an earlier part had, and remembers the others. */
static ef_status check_known(finish_file *f, finish_list *list,
                             ef_error *error) {
  known_names *k = &f->known;
  const bool goes_on = !f->at_end || f->n_parts > 0;
  if (!goes_on || !ef_reader_get_head(f->reader)->has_names)
    return EF_OK;
  if (k->n + list->n <= MOST_KNOWN && !known_grow(k, k->n + list->n))
    return message_fail(error, EF_NO_MEMORY, "out of memory for names");
  for (size_t i = 0; i < list->n && k->n_slots > 0; ++i) {
    const uint64_t hash = hash_of(list->item[i].name);
    known_name *known = &k->at[known_slot(k, hash)];
    if (known->hash == hash) {
      list->item[i].also_in_part = known->line;
    } else if (2 * k->n < k->n_slots) {
      *known = (known_name){hash, list->item[i].line};
      ++k->n;
    }
  }
  return EF_OK;
}

/* ---- Opening ----------------------------------------------------------- */

finish_file *finish_file_open(const command_options *options, const char *path,
                              const part_range *range, size_t most_rows,
                              const ef_notes *notes, ef_error *error) {
  finish_file *f = calloc(1, sizeof *f);
  if (f == NULL) {
    message_fail(error, EF_NO_MEMORY, "out of memory for samples");
    return NULL;
  }
  f->options = options;
  f->path = path;
  f->most_rows = most_rows;
  part_range told_of = *range;
  told_of.reads_others = true;
  f->reader = source_rows(options, path, &told_of, notes, error);
  if (f->reader == NULL) {
    free(f);
    return NULL;
  }
  f->rows.width = ef_reader_get_head(f->reader)->width;
  return f;
}

static void buffer_free(row_buffer *b) {
  free(b->value);
  free(b->angle_deg);
  free(b->line);
  free(b->offset);
  free(b->name_at);
  free(b->names);
}

void finish_file_free(finish_file *file) {
  if (file == NULL)
    return;
  looks_colours_free(&file->colours);
  ef_reader_free(file->reader);
  buffer_free(&file->rows);
  free(file->known.at);
  free(file);
}

const ef_reader_head *finish_file_head(const finish_file *file) {
  return ef_reader_get_head(file->reader);
}

size_t finish_file_skipped(const finish_file *file) {
  return ef_reader_skipped(file->reader);
}

ef_status finish_file_look(finish_file *file, const looks *l,
                           const ef_notes *notes, ef_error *error) {
  file->looks = l;
  return looks_colours_init(&file->colours, l, file->options,
                            finish_file_head(file), notes, error);
}

bool finish_file_is_whole(const finish_file *file) {
  return file->at_end && file->n_parts == 1;
}

/* ---- Reading a part ---------------------------------------------------- */

static bool grow(void *array, size_t count, size_t size) {
  void *block;
  memcpy(&block, array, sizeof block);
  if (count > SIZE_MAX / size)
    return false;
  void *grown = realloc(block, (count > 0 ? count : 1) * size);
  if (grown == NULL)
    return false;
  memcpy(array, &grown, sizeof grown);
  return true;
}

static bool reserve(row_buffer *b, size_t n, size_t n_bytes) {
  if (n > b->room) {
    const size_t room = n > 2 * b->room ? n : 2 * b->room;
    if (!grow(&b->value, room * b->width, sizeof *b->value) ||
        !grow(&b->angle_deg, room, sizeof *b->angle_deg) ||
        !grow(&b->line, room, sizeof *b->line) ||
        !grow(&b->offset, room, sizeof *b->offset) ||
        !grow(&b->name_at, room, sizeof *b->name_at)) {
      return false;
    }
    b->room = room;
  }
  if (n_bytes > b->names_room) {
    const size_t room = 2 * n_bytes;
    if (!grow(&b->names, room, 1))
      return false;
    b->names_room = room;
  }
  return true;
}

static bool append(row_buffer *b, const ef_block *block) {
  size_t n_bytes = b->names_used;
  if (block->n == 0)
    return true;
  for (size_t i = 0; i < block->n; ++i)
    n_bytes += strlen(block->name[i]) + 1;
  if (!reserve(b, b->n + block->n, n_bytes))
    return false;
  memcpy(b->value + b->n * b->width, block->value,
         block->n * b->width * sizeof *b->value);
  for (size_t i = 0; i < block->n; ++i) {
    const size_t length = strlen(block->name[i]) + 1;
    memcpy(b->names + b->names_used, block->name[i], length);
    b->name_at[b->n] = b->names_used;
    b->names_used += length;
    b->line[b->n] = block->line[i];
    b->offset[b->n] = block->offset[i];
    b->angle_deg[b->n] =
        block->angle_deg != NULL ? block->angle_deg[i] : (double)NAN;
    ++b->n;
  }
  return true;
}

static const char *name_at(const row_buffer *b, size_t row) {
  return b->names + b->name_at[row];
}

/* The first row of the last name: its readings may go on in the next part. */
static size_t last_run(const row_buffer *b) {
  size_t first = b->n;
  while (first > 0 && strcmp(name_at(b, first - 1), name_at(b, b->n - 1)) == 0)
    --first;
  return first;
}

static size_t wanted_rows(const finish_file *f) {
  const size_t most = MOST_VALUES / (f->rows.width + 1);
  const size_t asked = f->n_parts == 0 ? f->most_rows : LATER_ROWS;
  return asked < most ? asked : most;
}

/* Rows until the part is full and its last name is complete; *n_taken of them
 * are this part's. */
static ef_status fill(finish_file *f, size_t *n_taken, ef_error *error) {
  row_buffer *b = &f->rows;
  const size_t wanted = wanted_rows(f);
  *n_taken = 0;
  while (!f->at_end && (b->n < wanted || *n_taken == 0)) {
    ef_block block;
    const ef_status status =
        ef_reader_next(f->reader, LATER_ROWS, &block, error);
    if (status != EF_OK)
      return status;
    f->at_end = block.n == 0;
    if (!append(b, &block))
      return message_fail(error, EF_NO_MEMORY, "out of memory for samples");
    *n_taken = b->n > 0 ? last_run(b) : 0;
  }
  if (f->at_end)
    *n_taken = b->n;
  return EF_OK;
}

/* Drops the rows of the part that is done. */
static void keep_rest(row_buffer *b, size_t n_taken) {
  const size_t n = b->n - n_taken;
  if (n == 0) {
    b->n = b->names_used = 0;
    return;
  }
  const size_t bytes = b->name_at[n_taken];
  memmove(b->value, b->value + n_taken * b->width,
          n * b->width * sizeof *b->value);
  memmove(b->angle_deg, b->angle_deg + n_taken, n * sizeof *b->angle_deg);
  memmove(b->line, b->line + n_taken, n * sizeof *b->line);
  memmove(b->offset, b->offset + n_taken, n * sizeof *b->offset);
  for (size_t i = 0; i < n; ++i)
    b->name_at[i] = b->name_at[n_taken + i] - bytes;
  memmove(b->names, b->names + bytes, b->names_used - bytes);
  b->names_used -= bytes;
  b->n = n;
}

/* ---- Grouping ---------------------------------------------------------- */

/* Rows of one specimen are a chain: first, then next[row] to SIZE_MAX. */
typedef struct grouping {
  const finish_file *file;
  size_t n_rows, n_looks, width;
  finish_list *list;
  size_t *first; /* row of each specimen, in order of appearance */
  size_t *last;
  size_t *next;  /* of each row */
  size_t *owner; /* finish of each specimen */
  size_t *place; /* final place of each specimen */
  size_t n_specimens;
  double *xyz; /* n_looks x n_rows x 3 */
} grouping;

static void grouping_free(grouping *g) {
  free(g->first);
  free(g->last);
  free(g->next);
  free(g->owner);
  free(g->place);
  free(g->xyz);
}

void finish_list_free(finish_list *list) {
  free(list->item);
  free(list->specimens);
  free(list->value);
  free(list->xyz);
  free(list->covariance);
  free(list->names);
  free(list->slot);
  *list = (finish_list){0};
}

static bool allocate(grouping *g, size_t n_bytes) {
  finish_list *list = g->list;
  const size_t n = g->n_rows;
  list->item = calloc(n, sizeof *list->item);
  list->n_slots = slots_for(n);
  list->slot = malloc(list->n_slots * sizeof *list->slot);
  list->names = malloc(n_bytes);
  g->first = malloc(n * sizeof *g->first);
  g->last = malloc(n * sizeof *g->last);
  g->next = malloc(n * sizeof *g->next);
  g->owner = malloc(n * sizeof *g->owner);
  g->place = malloc(n * sizeof *g->place);
  g->xyz = malloc(3 * g->n_looks * n * sizeof *g->xyz);
  if (list->item == NULL || list->slot == NULL || list->names == NULL ||
      g->first == NULL || g->last == NULL || g->next == NULL ||
      g->owner == NULL || g->place == NULL || g->xyz == NULL) {
    return false;
  }
  for (size_t i = 0; i < list->n_slots; ++i)
    list->slot[i] = SIZE_MAX;
  return true;
}

static bool same_angle(double a, double b) {
  return a == b || (isnan(a) && isnan(b));
}

/* The specimen of this finish and angle, or SIZE_MAX. Those of one finish are
 * chained by `place` while grouping goes on. */
static size_t find_specimen(const grouping *g, size_t head, double angle_deg) {
  const double *angles = g->file->rows.angle_deg;
  size_t s = head;
  while (s != SIZE_MAX && !same_angle(angles[g->first[s]], angle_deg))
    s = g->place[s];
  return s;
}

/* Puts each row into the chain of its name and angle. `head` is the latest
 * specimen of each finish. */
static void chain_rows(grouping *g, size_t *head) {
  const row_buffer *b = &g->file->rows;
  finish_list *list = g->list;
  for (size_t row = 0; row < g->n_rows; ++row) {
    const char *name = list->names + b->name_at[row];
    size_t *slot = slot_of(list, name);
    if (*slot == SIZE_MAX) {
      *slot = list->n++;
      list->item[*slot] = (finish){
          .name = name, .line = b->line[row], .offset = b->offset[row]};
      head[*slot] = SIZE_MAX;
    }
    size_t s = find_specimen(g, head[*slot], b->angle_deg[row]);
    g->next[row] = SIZE_MAX;
    if (s != SIZE_MAX) {
      g->next[g->last[s]] = row;
      g->last[s] = row;
      continue;
    }
    s = g->n_specimens++;
    g->first[s] = g->last[s] = row;
    g->owner[s] = *slot;
    g->place[s] = head[*slot];
    head[*slot] = s;
    ++list->item[*slot].n;
  }
}

/* Specimens of one finish side by side, in the order in which they came. */
static void order_specimens(grouping *g, size_t *begin) {
  finish_list *list = g->list;
  size_t n = 0;
  for (size_t i = 0; i < list->n; ++i) {
    list->item[i].at = list->specimens + n;
    begin[i] = n;
    n += list->item[i].n;
  }
  for (size_t s = 0; s < g->n_specimens; ++s)
    g->place[s] = begin[g->owner[s]]++;
}

/* ---- Means ------------------------------------------------------------- */

static void mean_values(const grouping *g, size_t s, double *mean) {
  const double *value = g->file->rows.value;
  size_t n = 0;
  for (size_t k = 0; k < g->width; ++k)
    mean[k] = 0.0;
  for (size_t row = g->first[s]; row != SIZE_MAX; row = g->next[row], ++n) {
    for (size_t k = 0; k < g->width; ++k)
      mean[k] += value[row * g->width + k];
  }
  for (size_t k = 0; k < g->width; ++k)
    mean[k] /= (double)n;
}

static const double *xyz_at(const grouping *g, size_t at_look, size_t row) {
  return g->xyz + 3 * (at_look * g->n_rows + row);
}

/* Means and covariances of X, Y, Z over the readings, by sums about the first
 * reading: no cancellation. */
static void mean_colours(const grouping *g, size_t s, double *xyz,
                         double *covariance) {
  for (size_t at_look = 0; at_look < g->n_looks; ++at_look) {
    const double *origin = xyz_at(g, at_look, g->first[s]);
    double sum[3] = {0.0, 0.0, 0.0}, products[9] = {0.0};
    size_t n = 0;
    for (size_t row = g->first[s]; row != SIZE_MAX; row = g->next[row], ++n) {
      const double *v = xyz_at(g, at_look, row);
      for (int i = 0; i < 3; ++i) {
        sum[i] += v[i] - origin[i];
        for (int k = 0; k < 3; ++k)
          products[3 * i + k] += (v[i] - origin[i]) * (v[k] - origin[k]);
      }
    }
    const double count = (double)n;
    for (int i = 0; i < 3; ++i)
      xyz[3 * at_look + (size_t)i] = origin[i] + sum[i] / count;
    for (int i = 0; i < 9 && covariance != NULL && n > 1; ++i) {
      covariance[9 * at_look + (size_t)i] =
          (products[i] - sum[i / 3] * sum[i % 3] / count) / (count - 1.0);
    }
  }
}

static size_t count_readings(const grouping *g, size_t s) {
  size_t n = 0;
  for (size_t row = g->first[s]; row != SIZE_MAX; row = g->next[row])
    ++n;
  return n;
}

static bool allocate_specimens(grouping *g) {
  finish_list *list = g->list;
  const size_t n = g->n_specimens;
  const bool has_repeats = n < g->n_rows;
  list->specimens = calloc(n, sizeof *list->specimens);
  list->value = malloc(n * (g->width + 1) * sizeof *list->value);
  list->xyz = malloc(3 * g->n_looks * n * sizeof *list->xyz);
  if (has_repeats)
    list->covariance = calloc(9 * g->n_looks * n, sizeof *list->covariance);
  return list->specimens != NULL && list->value != NULL && list->xyz != NULL &&
         (list->covariance != NULL || !has_repeats);
}

static void set_specimens(grouping *g) {
  finish_list *list = g->list;
  for (size_t s = 0; s < g->n_specimens; ++s) {
    const size_t at = g->place[s];
    double *value = list->value + at * g->width;
    double *xyz = list->xyz + 3 * g->n_looks * at;
    double *covariance = list->covariance != NULL
                             ? list->covariance + 9 * g->n_looks * at
                             : NULL;
    const size_t n = count_readings(g, s);
    mean_values(g, s, value);
    mean_colours(g, s, xyz, covariance);
    list->specimens[at] =
        (specimen){.angle_deg = g->file->rows.angle_deg[g->first[s]],
                   .n_readings = n,
                   .value = value,
                   .xyz = xyz,
                   .covariance = n > 1 ? covariance : NULL};
  }
}

/* ---- The next part ----------------------------------------------------- */

static ef_status make_list(finish_file *f, size_t n_taken, finish_list *list,
                           ef_error *error) {
  const row_buffer *b = &f->rows;
  grouping g = {.file = f,
                .n_rows = n_taken,
                .n_looks = f->colours.n,
                .width = b->width,
                .list = list};
  size_t *head = malloc(n_taken * sizeof *head);
  ef_status status = EF_OK;
  bool has_memory = head != NULL && allocate(&g, b->names_used);
  if (has_memory) {
    memcpy(list->names, b->names, b->names_used);
    for (size_t i = 0; i < g.n_looks && status == EF_OK; ++i) {
      status =
          looks_colours_xyz(&f->colours, i, n_taken, b->value, f->options->jobs,
                            g.xyz + 3 * i * g.n_rows, error);
    }
    chain_rows(&g, head);
    has_memory = allocate_specimens(&g);
  }
  if (has_memory) {
    order_specimens(&g, head);
    set_specimens(&g);
  }
  grouping_free(&g);
  free(head);
  if (!has_memory)
    return message_fail(error, EF_NO_MEMORY, "out of memory for samples");
  return status;
}

ef_status finish_file_next(finish_file *file, finish_list *list,
                           ef_error *error) {
  finish_list_free(list);
  size_t n_taken;
  ef_status status = fill(file, &n_taken, error);
  if (status != EF_OK || n_taken == 0)
    return status;
  status = make_list(file, n_taken, list, error);
  if (status == EF_OK)
    status = check_known(file, list, error);
  keep_rest(&file->rows, n_taken);
  ++file->n_parts;
  return status;
}
