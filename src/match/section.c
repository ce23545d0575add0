/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The gamut cut at one lightness. The faces of the cube of amounts are meshed by
 * triangles; their images are the surface of the gamut (where colours do not
 * add, what its faces look like). Each edge that crosses the lightness belongs
 * to two triangles, and each triangle has none or two such edges: from one to
 * the next they make closed loops. */
#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"
#include "match/match_private.h"

/* Steps of the mesh along an amount, and of the search along an edge. */
enum { STEPS = 48, SIDE = STEPS + 1, MOST_ROUNDS = 60 };

typedef struct vertex {
  unsigned char at[3]; /* steps */
} vertex;

/* Where an edge crosses: its ends as numbers of vertices, the lower first. */
typedef uint64_t edge_key;

typedef struct end {
  edge_key key;
  size_t segment;
} end;

typedef struct cut {
  const ef_setup *setup;
  ef_xyz white;
  double L_star;
  double *lightness; /* SIDE^3, of the surface only */
  size_t n, room;    /* segments */
  edge_key *key;     /* two a segment */
} cut;

static size_t number_of(vertex v) {
  return ((size_t)v.at[0] * SIDE + v.at[1]) * SIDE + v.at[2];
}

static vertex vertex_of(size_t number) {
  return (vertex){{(unsigned char)(number / (SIDE * SIDE)),
                   (unsigned char)(number / SIDE % SIDE),
                   (unsigned char)(number % SIDE)}};
}

/* The point a share t of the way along an edge. The mesh is finer towards dark
 * colours, as lightness is. */
static ef_lab lab_at(const cut *c, vertex from, vertex to, double t) {
  double amount[EF_MAX_DRIVES] = {0.0};
  for (size_t i = 0; i < 3; ++i) {
    const double step = from.at[i] + t * ((double)to.at[i] - from.at[i]);
    amount[i] = step / STEPS * (step / STEPS);
  }
  return ef_xyz_to_lab(ef_setup_xyz(c->setup, amount, NULL), c->white);
}

static bool is_light(const cut *c, size_t number) {
  return c->lightness[number] >= c->L_star;
}

/* Regula falsi with Illinois' step (Dowell & Jarratt, BIT 11 (1971) 168-174). */
static ef_lab crossing(const cut *c, edge_key key) {
  const size_t n_vertices = (size_t)SIDE * SIDE * SIDE;
  const size_t ends[2] = {key / n_vertices, key % n_vertices};
  const vertex from = vertex_of(ends[0]), to = vertex_of(ends[1]);
  double t[2] = {0.0, 1.0};
  double gap[2] = {c->lightness[ends[0]] - c->L_star,
                   c->lightness[ends[1]] - c->L_star};
  ef_lab at = lab_at(c, from, to, 0.0);
  int last = -1;
  for (int i = 0; i < MOST_ROUNDS; ++i) {
    const double next = t[0] - gap[0] * (t[1] - t[0]) / (gap[1] - gap[0]);
    at = lab_at(c, from, to, next);
    const double found = at.L_star - c->L_star;
    const int side = (found >= 0.0) == (gap[0] >= 0.0) ? 0 : 1;
    if (fabs(found) < 1e-9)
      break;
    t[side] = next;
    gap[side] = found;
    if (side == last)
      gap[1 - side] *= 0.5;
    last = side;
  }
  return at;
}

/* ---- Segments ---------------------------------------------------------- */

static bool add_segment(cut *c, const edge_key key[2]) {
  if (c->n == c->room) {
    const size_t room = 2 * c->room + 512;
    edge_key *grown = ef__reallocate(c->key, room, 2 * sizeof *grown);
    if (grown == NULL)
      return false;
    c->key = grown;
    c->room = room;
  }
  c->key[2 * c->n] = key[0];
  c->key[2 * c->n + 1] = key[1];
  ++c->n;
  return true;
}

static bool cut_triangle(cut *c, const size_t corner[3]) {
  edge_key key[3];
  size_t n = 0;
  for (size_t i = 0; i < 3; ++i) {
    const size_t a = corner[i], b = corner[(i + 1) % 3];
    if (is_light(c, a) != is_light(c, b)) {
      const edge_key low = a < b ? a : b, high = a < b ? b : a;
      key[n++] = low * ((edge_key)SIDE * SIDE * SIDE) + high;
    }
  }
  return n == 0 || add_segment(c, key);
}

static size_t on_face(size_t fixed, size_t value, size_t p, size_t q) {
  vertex v;
  v.at[fixed] = (unsigned char)value;
  v.at[(fixed + 1) % 3] = (unsigned char)p;
  v.at[(fixed + 2) % 3] = (unsigned char)q;
  return number_of(v);
}

static void measure_face(cut *c, size_t fixed, size_t value) {
  for (size_t p = 0; p <= STEPS; ++p) {
    for (size_t q = 0; q <= STEPS; ++q) {
      const size_t number = on_face(fixed, value, p, q);
      const vertex v = vertex_of(number);
      c->lightness[number] = lab_at(c, v, v, 0.0).L_star;
    }
  }
}

static bool cut_face(cut *c, size_t fixed, size_t value) {
  bool complete = true;
  for (size_t p = 0; p < STEPS && complete; ++p) {
    for (size_t q = 0; q < STEPS && complete; ++q) {
      const size_t corner[4] = {
          on_face(fixed, value, p, q), on_face(fixed, value, p + 1, q),
          on_face(fixed, value, p + 1, q + 1), on_face(fixed, value, p, q + 1)};
      complete = cut_triangle(c, (size_t[3]){corner[0], corner[1], corner[2]}) &&
                 cut_triangle(c, (size_t[3]){corner[0], corner[2], corner[3]});
    }
  }
  return complete;
}

/* ---- Loops ------------------------------------------------------------- */

static int by_key(const void *a, const void *b) {
  const end *left = a, *right = b;
  if (left->key != right->key)
    return left->key < right->key ? -1 : 1;
  return left->segment < right->segment ? -1 : left->segment > right->segment;
}

/* The other segment that ends there. */
static size_t next_of(size_t n, const end *sorted, edge_key key,
                      size_t segment) {
  size_t low = 0, high = n;
  while (low < high) {
    const size_t middle = low + (high - low) / 2;
    if (sorted[middle].key < key)
      low = middle + 1;
    else
      high = middle;
  }
  return sorted[low].segment != segment ? sorted[low].segment
                                        : sorted[low + 1].segment;
}

static void walk(const cut *c, const end *sorted, bool *is_done, size_t first,
                 ef_gamut_section *out, size_t *n_points) {
  const size_t start = *n_points;
  size_t segment = first;
  edge_key key = c->key[2 * first];
  while (!is_done[segment]) {
    is_done[segment] = true;
    out->point[(*n_points)++] = crossing(c, key);
    const edge_key *ends = c->key + 2 * segment;
    key = ends[0] == key ? ends[1] : ends[0];
    segment = next_of(2 * c->n, sorted, key, segment);
  }
  out->n[out->n_loops++] = *n_points - start;
}

static bool join(const cut *c, ef_gamut_section *out) {
  end *sorted = ef__allocate(2 * c->n + 1, sizeof *sorted);
  bool *is_done = ef__allocate_zeroed(c->n + 1, sizeof *is_done);
  /* A loop has three points at least. */
  out->n = ef__allocate(c->n / 3 + 1, sizeof *out->n);
  out->point = ef__allocate(c->n + 1, sizeof *out->point);
  const bool complete = sorted != NULL && is_done != NULL && out->n != NULL &&
                        out->point != NULL;
  size_t n_points = 0;
  for (size_t i = 0; i < 2 * c->n && complete; ++i)
    sorted[i] = (end){c->key[i], i / 2};
  if (complete)
    qsort(sorted, 2 * c->n, sizeof *sorted, by_key);
  for (size_t i = 0; i < c->n && complete; ++i) {
    if (!is_done[i])
      walk(c, sorted, is_done, i, out, &n_points);
  }
  free(sorted);
  free(is_done);
  return complete;
}

/* ---- The call ---------------------------------------------------------- */

ef_status ef_gamut_section_new(const ef_setup *setup, double L_star,
                               ef_gamut_section *out, ef_error *error) {
  *out = (ef_gamut_section){0};
  const size_t n_drives = ef_device_n_drives(ef_setup_device(setup));
  if (n_drives != 3) {
    return ef__error_set(error, EF_INVALID,
                         "a gamut is cut of three drives, not of %zu",
                         n_drives);
  }
  if (!isfinite(L_star)) {
    return ef__error_set(error, EF_INVALID,
                         "a gamut is cut at a lightness that is a number");
  }
  cut c = {.setup = setup, .white = ef_setup_white(setup), .L_star = L_star};
  c.lightness = ef__allocate((size_t)SIDE * SIDE * SIDE, sizeof *c.lightness);
  bool complete = c.lightness != NULL;
  for (size_t i = 0; i < 6 && complete; ++i)
    measure_face(&c, i / 2, i % 2 * STEPS);
  for (size_t i = 0; i < 6 && complete; ++i)
    complete = cut_face(&c, i / 2, i % 2 * STEPS);
  complete = complete && join(&c, out);
  free(c.lightness);
  free(c.key);
  if (complete)
    return EF_OK;
  ef_gamut_section_free(out);
  return ef__error_memory(error, "a section of the gamut");
}

void ef_gamut_section_free(ef_gamut_section *section) {
  if (section == NULL)
    return;
  free(section->n);
  free(section->point);
  *section = (ef_gamut_section){0};
}
