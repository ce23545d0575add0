/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The gamut of a setup: its polygon in the chromaticity diagrams, and the
 * volume of the box of amounts in CIELAB. */
#include "match/gamut_private.h"

#include "base/base_private.h"

#include <math.h>
#include <stdlib.h>

/* ---- Polygons ---------------------------------------------------------- */

/* Twice the area of the triangle, above zero counterclockwise. */
static double turn(ef_xy a, ef_xy b, ef_xy c) {
  return (b.x - a.x) * (c.y - a.y) - (b.y - a.y) * (c.x - a.x);
}

double ef__polygon_area(size_t n, const ef_xy *point) {
  double twice = 0;
  for (size_t i = 2; i < n; ++i)
    twice += turn(point[0], point[i - 1], point[i]);
  return twice / 2;
}

static int by_place(const void *left, const void *right) {
  const ef_xy *const a = left, *const b = right;
  if (a->x != b->x)
    return a->x < b->x ? -1 : 1;
  return (a->y > b->y) - (a->y < b->y);
}

/* Andrew (1979): the lower chain from the left, then the upper one back. */
size_t ef__polygon_hull(size_t n, ef_xy *point) {
  if (n < 3)
    return n;
  qsort(point, n, sizeof *point, by_place);
  ef_xy chain[2 * EF__MAX_CORNERS];
  size_t m = 0;
  for (size_t pass = 0; pass < 2; ++pass) {
    const size_t start = m;
    for (size_t i = 0; i < n; ++i) {
      const ef_xy next = point[pass == 0 ? i : n - 1 - i];
      while (m >= start + 2 && turn(chain[m - 2], chain[m - 1], next) <= 0)
        --m;
      chain[m++] = next;
    }
    --m; /* the last one starts the other chain */
  }
  for (size_t i = 0; i < m && i < n; ++i)
    point[i] = chain[i];
  return m < n ? m : n;
}

/* What lies left of the line from a to b (Sutherland & Hodgman 1974). */
static size_t clip(size_t n, const ef_xy *in, ef_xy a, ef_xy b, ef_xy *out) {
  size_t m = 0;
  for (size_t i = 0; i < n; ++i) {
    const ef_xy p = in[i], q = in[(i + 1) % n];
    const double of_p = turn(a, b, p), of_q = turn(a, b, q);
    if (of_p >= 0)
      out[m++] = p;
    if ((of_p >= 0) == (of_q >= 0))
      continue;
    const double t = of_p / (of_p - of_q);
    out[m++] = (ef_xy){p.x + t * (q.x - p.x), p.y + t * (q.y - p.y)};
  }
  return m;
}

/* A polygon is the signed sum of the triangles from one point to its sides,
 * and so is what is left of it in a convex one. */
double ef__polygon_overlap(size_t n, const ef_xy *point, size_t n_convex,
                           const ef_xy *convex) {
  if (n < 3 || n_convex < 3)
    return 0;
  double sum = 0;
  /* A convex polygon gets at most one corner more from each cut. */
  ef_xy piece[2][EF__MAX_CORNERS + 3];
  for (size_t i = 2; i < n; ++i) {
    piece[0][0] = point[0];
    piece[0][1] = point[i - 1];
    piece[0][2] = point[i];
    size_t m = 3;
    for (size_t c = 0; c < n_convex && m > 0; ++c) {
      m = clip(m, piece[c % 2], convex[c], convex[(c + 1) % n_convex],
               piece[(c + 1) % 2]);
    }
    sum += m > 0 ? ef__polygon_area(m, piece[n_convex % 2]) : 0;
  }
  return fabs(sum);
}

/* ---- The surface of a box of amounts ----------------------------------- */

/* A billionth of its length along a curve of which no three points lie in a
 * plane with the origin: parallel and coplanar vectors then have one order,
 * the same wherever it is asked for. */
static void set_apart(size_t n, double *vector) {
  for (size_t k = 0; k < n; ++k) {
    const double tiny =
        1e-9 * hypot(hypot(vector[k], vector[n + k]), vector[2 * n + k]);
    const double s = (double)(k + 1);
    vector[k] += tiny;
    vector[n + k] += tiny * s;
    vector[2 * n + k] += tiny * s * s;
  }
}

bool ef__box_from_setup(const ef_setup *setup, ef__box *out) {
  *out = (ef__box){.setup = setup};
  out->n_drives = ef_device_n_drives(ef_setup_device(setup));
  for (size_t k = 0; k < out->n_drives; ++k)
    out->high[k] = 1;
  if (ef_setup_affine(setup)) {
    ef_setup_xyz(setup, out->low, out->vector);
    set_apart(out->n_drives, out->vector);
    return true;
  }
  if (out->n_drives != 3)
    return false;
  for (size_t k = 0; k < 3; ++k)
    out->vector[4 * k] = 1; /* the box itself */
  return true;
}

/* Which side of the plane of vectors i and j vector k is on. The product is
 * formed in the order of the indices, so that its rounding is the same for
 * each of the three questions about them. */
static bool is_above(const ef__box *box, size_t i, size_t j, size_t k) {
  size_t a = i, b = j, c = k; /* i < j */
  bool odd = false;
  if (k < i) {
    a = k, b = i, c = j;
  } else if (k < j) {
    b = k, c = j;
    odd = true;
  }
  const size_t n = box->n_drives;
  const double *const v = box->vector;
  const double m[9] = {v[a],         v[b],         v[c],
                       v[n + a],     v[n + b],     v[n + c],
                       v[2 * n + a], v[2 * n + b], v[2 * n + c]};
  return (ef__mat3_determinant(m) > 0) != odd;
}

size_t ef__box_faces(const ef__box *box, ef__face face[EF__MAX_FACES]) {
  size_t n_faces = 0;
  for (size_t i = 0; i < box->n_drives; ++i) {
    for (size_t j = i + 1; j < box->n_drives; ++j) {
      ef__face *const over = &face[n_faces++], *const under = &face[n_faces++];
      *over = (ef__face){.i = i, .j = j};
      *under = (ef__face){.i = j, .j = i};
      for (size_t k = 0; k < box->n_drives; ++k) {
        if (k == i || k == j)
          continue;
        const bool above = is_above(box, i, j, k);
        over->amount[k] = above ? box->high[k] : box->low[k];
        under->amount[k] = above ? box->low[k] : box->high[k];
      }
    }
  }
  return n_faces;
}

static ef_xyz face_xyz(const ef__box *box, const ef__face *face, double s,
                       double t) {
  double amount[EF_MAX_DRIVES];
  for (size_t k = 0; k < box->n_drives; ++k)
    amount[k] = face->amount[k];
  const size_t i = face->i, j = face->j;
  amount[i] = box->low[i] + s * (box->high[i] - box->low[i]);
  amount[j] = box->low[j] + t * (box->high[j] - box->low[j]);
  return ef_setup_xyz(box->setup, amount, NULL);
}

enum { MAX_STEPS = 256, CHUNK_ROWS = 8, CUT_STEPS = 32 };

/* Six times the volume of the tetrahedron from the middle of the L* axis. */
static double tetrahedron(ef_lab p, ef_lab q, ef_lab r) {
  const double m[9] = {p.L_star - 50, p.a_star, p.b_star,
                       q.L_star - 50, q.a_star, q.b_star,
                       r.L_star - 50, r.a_star, r.b_star};
  return ef__mat3_determinant(m);
}

typedef struct volume_work {
  const ef__box *box;
  ef_xyz white;
  size_t n_steps;
  const ef__face *face;
  double *part; /* of each row of each face */
} volume_work;

/* Colours at equal steps of the cube root of light: about equal ones of L*.
 * Where light is not added, of the amounts themselves. */
static double place(const volume_work *w, size_t step) {
  const double t = (double)step / (double)w->n_steps;
  return ef_setup_affine(w->box->setup) ? t * t * t : t;
}

static void mesh_row(const volume_work *w, const ef__face *face, size_t row,
                     ef_lab *out) {
  const double s = place(w, row);
  for (size_t c = 0; c <= w->n_steps; ++c)
    out[c] = ef_xyz_to_lab(face_xyz(w->box, face, s, place(w, c)), w->white);
}

static void add_rows(void *context, size_t begin, size_t end) {
  const volume_work *const w = context;
  ef_lab row[2][MAX_STEPS + 1];
  for (size_t item = begin; item < end; ++item) {
    const ef__face *const face = &w->face[item / w->n_steps];
    const size_t r = item % w->n_steps;
    const ef_lab *const p = row[r % 2], *const q = row[(r + 1) % 2];
    if (item == begin || r == 0)
      mesh_row(w, face, r, row[r % 2]);
    mesh_row(w, face, r + 1, row[(r + 1) % 2]);
    double sum = 0;
    for (size_t c = 0; c < w->n_steps; ++c) {
      sum += tetrahedron(p[c], q[c], q[c + 1]);
      sum += tetrahedron(p[c], q[c + 1], p[c + 1]);
    }
    w->part[item] = sum / 6;
  }
}

ef_status ef__box_volume(const ef__box *box, ef_xyz white, size_t n_steps,
                         int jobs, double *volume, ef_error *error) {
  ef__face face[EF__MAX_FACES];
  const size_t n = ef__box_faces(box, face) * n_steps;
  double *const part = ef__allocate(n, sizeof *part);
  if (part == NULL)
    return ef__error_memory(error, "the volume of a gamut");
  volume_work work = {box, white, n_steps, face, part};
  ef__parallel_for(n, CHUNK_ROWS, jobs, add_rows, &work);
  *volume = 0;
  for (size_t i = 0; i < n; ++i)
    *volume += part[i];
  free(part);
  return EF_OK;
}

/* Doubles the steps until the volume settles. Its error falls with the square
 * of the step, so that the last change is three times what is left. */
static ef_status settled_volume(const ef__box *box, ef_xyz white, int jobs,
                                double *volume, ef_error *error) {
  double before = 0;
  for (size_t n_steps = 32; n_steps <= MAX_STEPS; n_steps *= 2) {
    const ef_status status =
        ef__box_volume(box, white, n_steps, jobs, volume, error);
    if (status != EF_OK)
      return status;
    if (n_steps > 32 && fabs(*volume - before) <= 1e-3 * fabs(*volume))
      break;
    before = *volume;
  }
  return EF_OK;
}

double *ef__box_triangles(const ef__box *box, size_t *n_triangles,
                          ef_error *error) {
  ef__face face[EF__MAX_FACES];
  const size_t n_faces = ef__box_faces(box, face);
  /* The faces of additive setups are flat. */
  const size_t n = ef_setup_affine(box->setup) ? 1 : CUT_STEPS;
  *n_triangles = 2 * n_faces * n * n;
  double *const triangle = ef__allocate(9 * *n_triangles, sizeof *triangle);
  if (triangle == NULL) {
    ef__error_memory(error, "the surface of a gamut");
    return NULL;
  }
  static const size_t at[6][2] = {{0, 0}, {1, 0}, {1, 1},
                                  {0, 0}, {1, 1}, {0, 1}};
  double *to = triangle;
  for (size_t cell = 0; cell < n_faces * n * n; ++cell) {
    const size_t row = cell / n % n, column = cell % n;
    for (size_t k = 0; k < 6; ++k) {
      const ef_xyz p = face_xyz(box, &face[cell / (n * n)],
                                (double)(row + at[k][0]) / (double)n,
                                (double)(column + at[k][1]) / (double)n);
      *to++ = p.X, *to++ = p.Y, *to++ = p.Z;
    }
  }
  return triangle;
}

/* ---- Chromaticities ---------------------------------------------------- */

static ef_xy chromaticity(ef_xyz xyz) {
  const ef_xyy xyy = ef_xyz_to_xyy(xyz);
  return (ef_xy){xyy.x, xyy.y};
}

static ef_xy to_uv(ef_xy xy) {
  const ef_uv uv = ef_xy_to_uv(xy);
  return (ef_xy){uv.u_prime, uv.v_prime};
}

/* Corners of the polygon: the primaries, or where colours do not add all
 * mixtures of full and no amounts. Also the range of Y over all these. */
static size_t get_corners(const ef_setup *setup, ef_xy *corner, double *low_Y,
                          double *high_Y) {
  const size_t n = ef_device_n_drives(ef_setup_device(setup));
  size_t n_corners = 0;
  *low_Y = HUGE_VAL;
  *high_Y = -HUGE_VAL;
  for (size_t mix = 0; mix < (size_t)1 << n; ++mix) {
    const bool single = mix != 0 && (mix & (mix - 1)) == 0;
    if (ef_setup_affine(setup) && !single)
      continue;
    double amount[EF_MAX_DRIVES];
    for (size_t k = 0; k < n; ++k)
      amount[k] = (double)(mix >> k & 1);
    const ef_xyz xyz = ef_setup_xyz(setup, amount, NULL);
    *low_Y = fmin(*low_Y, xyz.Y);
    *high_Y = fmax(*high_Y, xyz.Y);
    const ef_xy xy = chromaticity(xyz);
    if (isfinite(xy.x) && isfinite(xy.y))
      corner[n_corners++] = xy;
  }
  return n_corners;
}

/* Points of the locus that the observer sees. */
static ef_status get_locus(const ef_observer *observer, ef_xy out[EF__BANDS],
                           size_t *n, ef_error *error) {
  double wavelength_nm[EF__BANDS];
  for (size_t i = 0; i < EF__BANDS; ++i)
    wavelength_nm[i] = 380 + (double)i;
  const ef_status status =
      ef_locus_xy(observer, EF__BANDS, wavelength_nm, out, error);
  *n = 0;
  for (size_t i = 0; status == EF_OK && i < EF__BANDS; ++i) {
    if (isfinite(out[i].x) && isfinite(out[i].y))
      out[(*n)++] = out[i];
  }
  return status;
}

/* Area of the corners' hull, and its share of the locus'. */
static void measure_area(size_t n, ef_xy *corner, size_t n_locus,
                         const ef_xy *locus, double *area, double *share) {
  const size_t n_hull = ef__polygon_hull(n, corner);
  *area = ef__polygon_area(n_hull, corner);
  const double whole = fabs(ef__polygon_area(n_locus, locus));
  *share = ef__polygon_overlap(n_locus, locus, n_hull, corner) / whole;
}

static ef_status measure_chromaticities(const ef_setup *setup, ef_gamut *out,
                                        ef_error *error) {
  ef_xy locus[EF__BANDS], corner[EF__MAX_CORNERS];
  size_t n_locus;
  const ef_status status =
      get_locus(ef_setup_observer(setup), locus, &n_locus, error);
  if (status != EF_OK)
    return status;
  double low_Y, high_Y;
  const size_t n = get_corners(setup, corner, &low_Y, &high_Y);
  measure_area(n, corner, n_locus, locus, &out->area_xy, &out->locus_share_xy);
  for (size_t i = 0; i < n; ++i)
    corner[i] = to_uv(corner[i]);
  for (size_t i = 0; i < n_locus; ++i)
    locus[i] = to_uv(locus[i]);
  measure_area(n, corner, n_locus, locus, &out->area_uv, &out->locus_share_uv);
  const bool adds = ef_setup_affine(setup);
  const double light = adds ? ef_setup_white(setup).Y : high_Y;
  const double dark = adds ? ef_setup_black(setup).Y : low_Y;
  out->contrast = dark > 0 ? light / dark : HUGE_VAL;
  return EF_OK;
}

/* ---- Volumes ----------------------------------------------------------- */

enum { N_PANELS = 48 };

/* The solid of the light with its white taken to the setup's; *known is false
 * when there is none. */
static ef_status adapted_solid(const ef_setup *setup,
                               const ef_illuminant *illuminant,
                               ef_adaptation adaptation, ef__solid *solid,
                               bool *known, ef_error *error) {
  double matrix[9];
  ef_error own;
  ef_status status =
      ef__solid_set(ef_setup_observer(setup), illuminant, solid, &own);
  *known = status == EF_OK;
  if (status == EF_NO_ANSWER)
    return EF_OK;
  if (status != EF_OK) {
    if (error != NULL)
      *error = own;
    return status;
  }
  status = ef_adaptation_matrix(adaptation, solid->white, ef_setup_white(setup),
                                matrix, error);
  if (status == EF_OK)
    ef__solid_transform(solid, matrix);
  return status;
}

static ef_status measure_share(const ef_setup *setup, const ef__box *box,
                               const ef__solid *solid, int jobs, ef_gamut *out,
                               ef_error *error) {
  size_t n;
  double *const triangle = ef__box_triangles(box, &n, error);
  if (triangle == NULL)
    return EF_NO_MEMORY;
  double whole, part;
  const ef_status status =
      ef__solid_overlap(solid, ef_setup_white(setup), n, triangle, N_PANELS,
                        jobs, &whole, &part, error);
  free(triangle);
  /* Rounding may leave a share of 1 + epsilon, or -epsilon. */
  if (status == EF_OK)
    out->solid_share = fmin(fmax(fabs(part) / whole, 0), 1);
  return status;
}

static ef_status measure_volumes(const ef_setup *setup,
                                 const ef_illuminant *illuminant,
                                 ef_adaptation adaptation, int jobs,
                                 ef_gamut *out, ef_error *error) {
  ef__box box;
  if (!ef__box_from_setup(setup, &box))
    return EF_OK;
  ef_status status = settled_volume(&box, ef_setup_white(setup), jobs,
                                    &out->volume_lab, error);
  out->volume_lab = fabs(out->volume_lab);
  ef__solid solid;
  bool known = false;
  if (status == EF_OK)
    status =
        adapted_solid(setup, illuminant, adaptation, &solid, &known, error);
  if (status != EF_OK || !known)
    return status;
  return measure_share(setup, &box, &solid, jobs, out, error);
}

/* Two dimensions have neither areas nor volumes, only rounding in their place.
 */
static void flatten(ef_gamut *out) {
  out->area_xy = out->area_uv = out->volume_lab = 0;
  out->locus_share_xy = out->locus_share_uv = out->solid_share = (double)NAN;
}

ef_status ef_gamut_measure(const ef_setup *setup,
                           const ef_illuminant *illuminant,
                           ef_adaptation adaptation, int jobs, ef_gamut *out,
                           ef_error *error) {
  if (setup == NULL || illuminant == NULL || out == NULL)
    return ef__error_set(error, EF_INVALID,
                         "a gamut needs a setup, an illuminant for the "
                         "object colours, and room for the answer");
  ef_gamut gamut = {.volume_lab = (double)NAN, .solid_share = (double)NAN};
  const size_t n = ef_device_n_drives(ef_setup_device(setup));
  for (size_t k = 0; k < EF_MAX_DRIVES; ++k) {
    double amount[EF_MAX_DRIVES] = {0};
    amount[k] = 1;
    const ef_xy none = {(double)NAN, (double)NAN};
    gamut.primary[k] =
        k < n ? chromaticity(ef_setup_xyz(setup, amount, NULL)) : none;
  }
  gamut.white = chromaticity(ef_setup_white(setup));
  ef_status status = measure_chromaticities(setup, &gamut, error);
  const bool flat = ef_observer_dimensions(ef_setup_observer(setup)) < 3;
  if (status == EF_OK && !flat)
    status =
        measure_volumes(setup, illuminant, adaptation, jobs, &gamut, error);
  if (status != EF_OK)
    return status;
  if (flat)
    flatten(&gamut);
  *out = gamut;
  return EF_OK;
}
