/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The object-colour solid, whose boundary are the optimal colours, and how much
 * of it a gamut holds. */
#include "match/gamut_private.h"

#include "base/base_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { FIRST_NM = 380 };

/* ---- Bands ------------------------------------------------------------- */

/* Whether the locus is as good as convex, see ef__solid_set. */
static bool is_convex(double band[EF__BANDS][3]) {
  double most = 0;
  for (size_t i = 0; i < EF__BANDS; ++i)
    most = fmax(most, band[i][0] + band[i][1] + band[i][2]);
  ef_xy locus[EF__BANDS];
  size_t n = 0;
  for (size_t i = 0; i < EF__BANDS; ++i) {
    const double sum = band[i][0] + band[i][1] + band[i][2];
    if (sum > 1e-3 * most)
      locus[n++] = (ef_xy){band[i][0] / sum, band[i][1] / sum};
  }
  const double area = fabs(ef__polygon_area(n, locus));
  const size_t n_hull = ef__polygon_hull(n, locus);
  return area >= 0.99 * ef__polygon_area(n_hull, locus);
}

/* Colour-matching functions at the bands. */
static ef_status get_functions(const ef_observer *observer,
                               double band[EF__BANDS][3], ef_error *error) {
  const ef_channels channels = ef_observer_channels(observer, EF_TRISTIMULUS);
  if (channels.count != 3)
    return ef__error_set(error, EF_INVALID,
                         "observer %s has %zu channels; object colours need 3",
                         ef_observer_name(observer), channels.count);
  const size_t first =
      (size_t)((FIRST_NM - channels.grid.start_nm) / channels.grid.step_nm);
  for (size_t i = 0; i < EF__BANDS; ++i) {
    for (size_t c = 0; c < 3; ++c)
      band[i][c] = channels.value[c * channels.grid.count + first + i];
  }
  return EF_OK;
}

/* Sums over two turns, from the bands of one; notes where Y turns. */
static void add_up(double band[EF__BANDS][3], ef__solid *out) {
  for (size_t c = 0; c < 3; ++c) {
    out->sum[0][c] = 0;
    for (size_t i = 0; i < 2 * EF__BANDS; ++i)
      out->sum[i + 1][c] = out->sum[i][c] + band[i % EF__BANDS][c];
  }
  const double *const w = out->sum[EF__BANDS];
  out->white = (ef_xyz){w[0], w[1], w[2]};
  out->n_runs = 0;
  out->turn[0] = 0;
  for (size_t i = 1; i < 2 * EF__BANDS; ++i) {
    if ((band[(i - 1) % EF__BANDS][1] < 0) != (band[i % EF__BANDS][1] < 0))
      out->turn[++out->n_runs] = i;
  }
  out->turn[++out->n_runs] = 2 * EF__BANDS;
}

ef_status ef__solid_set(const ef_observer *observer,
                        const ef_illuminant *illuminant, ef__solid *out,
                        ef_error *error) {
  const ef_grid grid = {EF__BANDS, FIRST_NM, 1, NULL};
  double band[EF__BANDS][3], power[EF__BANDS];
  ef_status status = get_functions(observer, band, error);
  if (status == EF_OK)
    status = ef_illuminant_sample(illuminant, &grid, power, error);
  if (status != EF_OK)
    return status;
  if (!is_convex(band))
    return ef__error_set(error, EF_NO_ANSWER,
                         "the spectrum locus of observer %s is not convex, so "
                         "that the boundary of the object colours is not known",
                         ef_observer_name(observer));
  double Y = 0;
  for (size_t i = 0; i < EF__BANDS; ++i)
    Y += band[i][1] * power[i];
  if (!(Y > 0))
    return ef__error_set(error, EF_INVALID,
                         "observer %s sees nothing of illuminant %s from 380 "
                         "to 780 nm",
                         ef_observer_name(observer),
                         ef_illuminant_name(illuminant));
  for (size_t i = 0; i < EF__BANDS; ++i) {
    for (size_t c = 0; c < 3; ++c)
      band[i][c] *= power[i] * (100 / Y);
  }
  add_up(band, out);
  return EF_OK;
}

void ef__solid_transform(ef__solid *solid, const double matrix[9]) {
  double band[EF__BANDS][3];
  for (size_t i = 0; i < EF__BANDS; ++i) {
    for (size_t c = 0; c < 3; ++c)
      band[i][c] = solid->sum[i + 1][c] - solid->sum[i][c];
    ef__mat3_apply(matrix, band[i], band[i]);
  }
  add_up(band, solid);
}

/* ---- Volume ------------------------------------------------------------ */

enum { CHUNK_ROWS = 16 };

typedef struct volume_work {
  const ef__solid *solid;
  ef_xyz white;
  double *part; /* of each row */
} volume_work;

/* CIELAB of the bands from `start` to start + 0, 1 ... EF__BANDS. */
static void mesh_row(const volume_work *w, size_t start, ef_lab *out) {
  const double *const s = w->solid->sum[start];
  for (size_t i = 0; i <= EF__BANDS; ++i) {
    const double *const e = w->solid->sum[start + i];
    out[i] = ef_xyz_to_lab((ef_xyz){e[0] - s[0], e[1] - s[1], e[2] - s[2]},
                           w->white);
  }
}

/* Six times the volume of the tetrahedron from the middle of the L* axis. */
static double tetrahedron(ef_lab p, ef_lab q, ef_lab r) {
  const double m[9] = {p.L_star - 50, p.a_star, p.b_star,
                       q.L_star - 50, q.a_star, q.b_star,
                       r.L_star - 50, r.a_star, r.b_star};
  return ef__mat3_determinant(m);
}

static void add_rows(void *context, size_t begin, size_t end) {
  const volume_work *const w = context;
  ef_lab row[2][EF__BANDS + 1];
  mesh_row(w, begin, row[begin % 2]);
  for (size_t r = begin; r < end; ++r) {
    /* From the same first band, and from the one after it: the run that ends
     * at the same band is one shorter there. */
    const ef_lab *const p = row[r % 2], *const q = row[(r + 1) % 2];
    mesh_row(w, r + 1, row[(r + 1) % 2]);
    double sum = 0;
    for (size_t i = 1; i < EF__BANDS; ++i) {
      sum += tetrahedron(p[i], p[i + 1], q[i]);
      sum += tetrahedron(p[i], q[i], q[i - 1]);
    }
    w->part[r] = sum / 6;
  }
}

ef_status ef__solid_volume(const ef__solid *solid, ef_xyz white, int jobs,
                           double *volume, ef_error *error) {
  double *const part = ef__allocate(EF__BANDS, sizeof *part);
  if (part == NULL)
    return ef__error_memory(error, "the volume of the object colours");
  volume_work work = {solid, white, part};
  ef__parallel_for(EF__BANDS, CHUNK_ROWS, jobs, add_rows, &work);
  double sum = 0;
  for (size_t i = 0; i < EF__BANDS; ++i)
    sum += part[i];
  free(part);
  *volume = fabs(sum);
  return EF_OK;
}

ef_status ef_object_solid_volume(const ef_observer *observer,
                                 const ef_illuminant *illuminant,
                                 double *volume, ef_error *error) {
  if (observer == NULL || illuminant == NULL || volume == NULL)
    return ef__error_set(error, EF_INVALID,
                         "the object colours need an observer, an illuminant, "
                         "and room for the answer");
  if (ef_observer_dimensions(observer) < 3) {
    *volume = 0;
    return EF_OK;
  }
  ef__solid solid;
  const ef_status status = ef__solid_set(observer, illuminant, &solid, error);
  if (status != EF_OK)
    return status;
  return ef__solid_volume(&solid, solid.white, 0, volume, error);
}

/* ---- Sections at constant Y -------------------------------------------- */

size_t ef__solid_corners(const ef__solid *solid) {
  return 2 * EF__BANDS * solid->n_runs;
}

/* The step i to i + 1 of the run from `low` to `high` (bounds of indices) on
 * which the sum of Y passes `Y`; false when it does not. */
static bool find_step(const ef__solid *solid, size_t low, size_t high, double Y,
                      size_t *step) {
  const bool below = solid->sum[low][1] < Y;
  if (low >= high || below == (solid->sum[high][1] < Y))
    return false;
  while (high - low > 1) {
    const size_t middle = (low + high) / 2;
    if ((solid->sum[middle][1] < Y) == below)
      low = middle;
    else
      high = middle;
  }
  *step = low;
  return true;
}

/* Adds the colours with one end of the run at the edge `fixed` and the other
 * where Y comes out right, between edges `first` and first + EF__BANDS. */
static void add_corners(const ef__solid *solid, size_t fixed, size_t first,
                        double Y, ef__section *section) {
  const double *const f = solid->sum[fixed];
  const double sign = fixed == first ? 1 : -1; /* the start is fixed: sum - f */
  const double aim = f[1] + sign * Y;
  for (size_t r = 0; r < solid->n_runs; ++r) {
    const size_t from = solid->turn[r], to = solid->turn[r + 1];
    const size_t low = from > first ? from : first;
    const size_t last = first + EF__BANDS;
    size_t i;
    if (low >= last || !find_step(solid, low, to < last ? to : last, aim, &i))
      continue;
    const double *const a = solid->sum[i], *const b = solid->sum[i + 1];
    const double t = (aim - a[1]) / (b[1] - a[1]);
    section->corner[section->n++] =
        (ef__corner){sign * (a[0] + t * (b[0] - a[0]) - f[0]),
                     sign * (a[2] + t * (b[2] - a[2]) - f[2]), 0};
  }
}

/* Grows with the angle like atan2, in [0, 4). */
static double direction(double x, double z) {
  const double size = fabs(x) + fabs(z);
  if (size == 0)
    return 0;
  if (x >= 0)
    return z >= 0 ? z / size : 4 + z / size;
  return 2 - z / size;
}

static int by_turn(const void *left, const void *right) {
  const ef__corner *const a = left, *const b = right;
  return (a->turn > b->turn) - (a->turn < b->turn);
}

/* Leaves one of corners within a billionth of the section's size. */
static void join_corners(ef__section *section, double size) {
  ef__corner *const c = section->corner;
  size_t n = 0;
  for (size_t i = 0; i < section->n; ++i) {
    const ef__corner *const before = n > 0 ? &c[n - 1] : NULL;
    if (before != NULL &&
        fabs(c[i].x - before->x) + fabs(c[i].z - before->z) <= 1e-9 * size)
      continue;
    c[n++] = c[i];
  }
  while (n > 1 &&
         fabs(c[n - 1].x - c[0].x) + fabs(c[n - 1].z - c[0].z) <= 1e-9 * size)
    --n;
  section->n = n < 3 ? 0 : n;
}

void ef__solid_cut(const ef__solid *solid, double Y, ef__section *section) {
  section->Y = Y;
  section->x = section->z = 0;
  section->n = 0;
  for (size_t i = 0; i < EF__BANDS; ++i) {
    add_corners(solid, i, i, Y, section);
    add_corners(solid, i + EF__BANDS, i, Y, section);
  }
  for (size_t i = 0; i < section->n; ++i) {
    section->x += section->corner[i].x / (double)section->n;
    section->z += section->corner[i].z / (double)section->n;
  }
  double size = 0;
  for (size_t i = 0; i < section->n; ++i) {
    ef__corner *const c = &section->corner[i];
    const double x = c->x - section->x, z = c->z - section->z;
    size = fmax(size, fabs(x) + fabs(z));
    c->turn = direction(x, z);
  }
  qsort(section->corner, section->n, sizeof *section->corner, by_turn);
  join_corners(section, size);
}

/* ---- What a body and a section share ----------------------------------- */

/* A path in the a*, b* plane of one section. */
typedef struct path {
  const ef__section *section;
  ef_xyz white;
  double x, z; /* where it is */
  ef_lab centre, last;
  double twice_area; /* swept from the centre so far */
} path;

static ef_lab path_lab(const path *p, double x, double z) {
  return ef_xyz_to_lab((ef_xyz){x, p->section->Y, z}, p->white);
}

static path path_start(const ef__section *section, ef_xyz white) {
  path p = {.section = section, .white = white};
  p.centre = path_lab(&p, section->x, section->z);
  return p;
}

static void path_jump(path *p, double x, double z) {
  p->x = x;
  p->z = z;
  p->last = path_lab(p, x, z);
}

/* Twice the area of a triangle. b* falls with Z: what turns counterclockwise
 * in X, Z turns clockwise here. */
static double swept(ef_lab o, ef_lab p, ef_lab q) {
  return (p.b_star - o.b_star) * (q.a_star - o.a_star) -
         (p.a_star - o.a_star) * (q.b_star - o.b_star);
}

/* In units of CIELAB squared; a section has some 1e4. */
#define MOST_BEND 0.5

/* A straight line in X, Z, which is bent here: between the line and a parabola
 * through its middle lie 4/3 of their triangle (Archimedes). Halved where it
 * bends more than a parabola is good for. */
static void path_draw(path *p, double x, double z) {
  const ef_lab middle = path_lab(p, (p->x + x) / 2, (p->z + z) / 2);
  const ef_lab next = path_lab(p, x, z);
  const double bend = swept(p->last, middle, next);
  if (fabs(bend) > MOST_BEND) {
    const double half_x = (p->x + x) / 2, half_z = (p->z + z) / 2;
    path_draw(p, half_x, half_z);
    path_draw(p, x, z);
    return;
  }
  p->twice_area += swept(p->centre, p->last, next);
  p->twice_area += 4.0 / 3 * bend;
  p->x = x;
  p->z = z;
  p->last = next;
}

static double section_area(const ef__section *section, ef_xyz white) {
  path p = path_start(section, white);
  const ef__corner *const c = section->corner;
  path_jump(&p, c[section->n - 1].x, c[section->n - 1].z);
  for (size_t i = 0; i < section->n; ++i)
    path_draw(&p, c[i].x, c[i].z);
  return p.twice_area / 2;
}

typedef struct point {
  double x, z;
} point;

static point between(point a, point b, double t) {
  return (point){a.x + t * (b.x - a.x), a.z + t * (b.z - a.z)};
}

static double cross(point a, point b) {
  return a.x * b.z - a.z * b.x;
}

/* Corner `i`, seen from the centre. */
static point spoke(const ef__section *section, size_t i) {
  const ef__corner *const c = &section->corner[i % section->n];
  return (point){c->x - section->x, c->z - section->z};
}

/* The sector between corners i and i + 1 that holds the direction of p. */
static size_t find_sector(const ef__section *section, point p) {
  const double turn = direction(p.x, p.z);
  size_t low = 0, high = section->n; /* first corner beyond `turn` */
  while (low < high) {
    const size_t middle = (low + high) / 2;
    if (section->corner[middle].turn <= turn)
      low = middle + 1;
    else
      high = middle;
  }
  return (low + section->n - 1) % section->n;
}

/* Draws from a to b, both seen from the centre and in the same sector, as far
 * as that lies inside the section, and along its side where it does not. */
static void draw_in_sector(path *p, size_t sector, point a, point b,
                           bool start) {
  const point v = spoke(p->section, sector);
  const point w = spoke(p->section, sector + 1);
  const point side = {w.x - v.x, w.z - v.z};
  /* Above zero inside. */
  const double of_centre = cross(v, w);
  const double of_a = of_centre + cross(side, a);
  const double of_b = of_centre + cross(side, b);
  const point centre = {0, 0};
  const point from =
      of_a >= 0 ? a : between(centre, a, of_centre / (of_centre - of_a));
  const point to =
      of_b >= 0 ? b : between(centre, b, of_centre / (of_centre - of_b));
  const double x = p->section->x, z = p->section->z;
  if (start)
    path_jump(p, x + from.x, z + from.z);
  if ((of_a >= 0) != (of_b >= 0)) {
    const point on = between(a, b, of_a / (of_a - of_b));
    path_draw(p, x + on.x, z + on.z);
  }
  path_draw(p, x + to.x, z + to.z);
}

/* Adds what the triangle from the centre to the side p, q of a body has in
 * common with the section, with the sign of its turn: over all sides of a body
 * these sum to the area of what the two share. */
static void add_side(path *area, point p, point q) {
  const ef__section *const section = area->section;
  const bool forward = cross(p, q) > 0;
  size_t sector = find_sector(section, p);
  bool start = true;
  for (size_t n = 0; n < section->n; ++n, start = false) {
    const point exit = spoke(section, forward ? sector + 1 : sector);
    const double of_p = cross(exit, p), of_q = cross(exit, q);
    if (forward ? of_q <= 0 : of_q >= 0)
      break;
    /* A start on the exit itself has nothing to draw before it. */
    const double t = fmin(fmax(of_p / (of_p - of_q), 0), 1);
    const point on = between(p, q, t);
    draw_in_sector(area, sector, p, on, start);
    p = on;
    sector = (sector + (forward ? 1 : section->n - 1)) % section->n;
  }
  draw_in_sector(area, sector, p, q, start);
}

/* The side on which a triangle passes the plane of the section; false when it
 * does not. Points are found from the lower to the higher end, so that
 * neighbours agree to the bit. */
static bool cut_triangle(const double triangle[9], const ef__section *section,
                         point *p, point *q) {
  bool found = false;
  for (size_t i = 0; i < 3; ++i) {
    const double *a = triangle + 3 * i, *b = triangle + 3 * ((i + 1) % 3);
    const bool rising = a[1] < section->Y;
    if (rising == (b[1] < section->Y))
      continue;
    if (!rising) {
      const double *const kept = a;
      a = b;
      b = kept;
    }
    const double t = (section->Y - a[1]) / (b[1] - a[1]);
    const point on = {a[0] + t * (b[0] - a[0]) - section->x,
                      a[2] + t * (b[2] - a[2]) - section->z};
    *(rising ? p : q) = on;
    found = true;
  }
  return found;
}

/* ---- Over all sections ------------------------------------------------- */

enum { PANELS_AT_ONCE = 4 };

typedef struct overlap_work {
  const ef__solid *solid;
  ef_xyz white;
  size_t n_triangles;
  const double *triangle;
  double low_L, panel_L; /* L* of the lowest point, and height of a panel */
  size_t n_corners;
  ef__corner *corner;   /* room for one section in each chunk */
  double *whole, *part; /* of each panel */
} overlap_work;

static void measure_section(const overlap_work *w, double L_star,
                            ef__section *section, double *whole, double *part) {
  const double Y = ef_lab_to_xyz((ef_lab){L_star, 0, 0}, w->white).Y;
  ef__solid_cut(w->solid, Y, section);
  if (section->n == 0)
    return;
  *whole += w->panel_L / 2 * section_area(section, w->white);
  path shared = path_start(section, w->white);
  for (size_t i = 0; i < w->n_triangles; ++i) {
    point p, q;
    if (cut_triangle(w->triangle + 9 * i, section, &p, &q))
      add_side(&shared, p, q);
  }
  *part += w->panel_L / 2 * shared.twice_area / 2;
}

/* Gauss's rule with two points in each panel. */
static void measure_panels(void *context, size_t begin, size_t end) {
  const overlap_work *const w = context;
  ef__section section = {.corner =
                             w->corner + begin / PANELS_AT_ONCE * w->n_corners};
  for (size_t i = begin; i < end; ++i) {
    const double middle = w->low_L + ((double)i + 0.5) * w->panel_L;
    const double off = 0.5 * w->panel_L / sqrt(3.0);
    measure_section(w, middle - off, &section, &w->whole[i], &w->part[i]);
    measure_section(w, middle + off, &section, &w->whole[i], &w->part[i]);
  }
}

/* Lowest and highest Y of the solid. */
static void range_Y(const ef__solid *solid, double *low, double *high) {
  *low = *high = 0;
  for (size_t i = 0; i < EF__BANDS; ++i) {
    for (size_t j = i; j <= i + EF__BANDS; ++j) {
      const double Y = solid->sum[j][1] - solid->sum[i][1];
      *low = fmin(*low, Y);
      *high = fmax(*high, Y);
    }
  }
}

ef_status ef__solid_overlap(const ef__solid *solid, ef_xyz white,
                            size_t n_triangles, const double *triangle,
                            size_t n_panels, int jobs, double *whole,
                            double *part, ef_error *error) {
  overlap_work work = {.solid = solid,
                       .white = white,
                       .n_triangles = n_triangles,
                       .triangle = triangle,
                       .n_corners = ef__solid_corners(solid)};
  const size_t n_chunks = (n_panels + PANELS_AT_ONCE - 1) / PANELS_AT_ONCE;
  const ef__part parts[] = {
      {&work.corner, n_chunks * work.n_corners, sizeof *work.corner},
      {&work.whole, n_panels, sizeof *work.whole},
      {&work.part, n_panels, sizeof *work.part}};
  void *const block = ef__allocate_block(3, parts);
  if (block == NULL)
    return ef__error_memory(error, "sections of the object colours");
  double low, high;
  range_Y(solid, &low, &high);
  work.low_L = ef_xyz_to_lab((ef_xyz){0, low, 0}, white).L_star;
  work.panel_L =
      (ef_xyz_to_lab((ef_xyz){0, high, 0}, white).L_star - work.low_L) /
      (double)n_panels;
  ef__parallel_for(n_panels, PANELS_AT_ONCE, jobs, measure_panels, &work);
  *whole = *part = 0;
  for (size_t i = 0; i < n_panels; ++i) {
    *whole += work.whole[i];
    *part += work.part[i];
  }
  free(block);
  return EF_OK;
}
