/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the folders above base share and the public does not see. */
#ifndef EVENFIELD_BASE_PRIVATE_H
#define EVENFIELD_BASE_PRIVATE_H

#include <evenfield/base.h>

/* ---- Errors and notes (error.c) ---------------------------------------- */

/** Fills `error` (may be NULL) with the status and a message, without a place,
 * and returns `status`, so that `return ef__error_set(...)` is one line.
 * Control characters of quoted input become '?'; a message that is too long is
 * cut at a whole UTF-8 character. */
ef_status ef__error_set(ef_error *error, ef_status status, const char *format,
                        ...) EF_PRINTF(3, 4);

/** Adds the place to an error already set: file or field NULL, line or column
 * 0 leave what is there. Returns the status of the error, EF_OK for NULL. */
ef_status ef__error_place(ef_error *error, const char *file, size_t line,
                          size_t column, const char *field);

/** "out of memory" for what `purpose` names. Returns EF_NO_MEMORY. */
ef_status ef__error_memory(ef_error *error, const char *purpose);

/** One line to the notes sink; nothing when `notes` or its function is NULL. */
void ef__note(const ef_notes *notes, const char *format, ...) EF_PRINTF(2, 3);

/* ---- Memory (memory.c) ------------------------------------------------- */

/** *product = a * b; false on overflow. */
bool ef__size_multiply(size_t a, size_t b, size_t *product);
/** *sum = a + b; false on overflow. */
bool ef__size_add(size_t a, size_t b, size_t *sum);

/** count * size bytes, uninitialised; NULL on overflow or without memory. Not
 * NULL for zero bytes. Released with free(). */
void *ef__allocate(size_t count, size_t size);
/** The same, zeroed. */
void *ef__allocate_zeroed(size_t count, size_t size);
/** Resizes; the old block stays valid when NULL comes back. */
void *ef__reallocate(void *block, size_t count, size_t size);
/** A copy of `length` bytes with a terminator after them. */
char *ef__copy_text(const char *text, size_t length);

/** One array of a block: the pointer to set, and its size. */
typedef struct ef__part {
  void *pointer; /**< address of the array's pointer, any pointer type */
  size_t count;
  size_t size;
} ef__part;

/** Allocates all arrays in one zeroed block, each aligned for any type, and
 * sets their pointers. The block is the return value and is released with
 * free(); NULL (pointers untouched) on overflow or without memory. */
void *ef__allocate_block(size_t n, const ef__part *part);

/* ---- Small linear algebra (matrix.c) ----------------------------------- */
/* 3x3 matrices are nine doubles, row-major. Outputs may alias inputs. */

void ef__mat3_multiply(const double a[9], const double b[9], double out[9]);
void ef__mat3_apply(const double m[9], const double v[3], double out[3]);
void ef__mat3_transpose(const double m[9], double out[9]);
double ef__mat3_determinant(const double m[9]);
/** False, and `out` untouched, when the matrix is singular to rounding: its
 * determinant is below 9 DBL_EPSILON times the product of its row norms. */
bool ef__mat3_inverse(const double m[9], double out[9]);

/** Solves A X = B by elimination with row scaling and partial pivoting; `a`
 * (n x n) is destroyed, `b` (n x n_right) becomes X. False when A is singular
 * to rounding; both arrays are then undefined. */
bool ef__solve(size_t n, double *a, size_t n_right, double *b);

/** Doubles of scratch that ef__condition needs. */
size_t ef__condition_scratch(size_t n_rows, size_t n_columns);
/** Ratio of the largest to the smallest singular value (2-norm condition
 * number) of a full matrix of any shape; INFINITY when columns (or rows, if
 * there are fewer) are dependent to rounding. Optional `singular` receives
 * the min(n_rows, n_columns) singular values, largest first. */
ef_status ef__condition(size_t n_rows, size_t n_columns, const double *a,
                        double *scratch, double *singular, double *condition,
                        ef_error *error);

/* ---- Least squares with inequalities (nnls.c) -------------------------- */

/** Most columns of ef__nnls. */
#define EF__NNLS_COLUMNS 32

/** Doubles of scratch that ef__nnls needs. */
size_t ef__nnls_scratch(size_t n_rows, size_t n_columns);
/** The x[n_columns] >= 0 that makes |A x - b| least; A is n_rows x n_columns,
 * at most EF__NNLS_COLUMNS columns. Columns that depend on others to rounding
 * stay at zero. `residual_norm` (|A x - b|) may be NULL. False when 3 n_columns
 * steps did not end it (never seen); x is then what was reached. */
bool ef__nnls(size_t n_rows, size_t n_columns, const double *a,
              const double *b, double *scratch, double *x,
              double *residual_norm);

/** Most unknowns of ef__least_quadratic. */
#define EF__QUADRATIC_UNKNOWNS 8

/** The x[n] that makes x' matrix x / 2 + linear' x least with limit x >= bound
 * (n_limits rows, at most EF__NNLS_COLUMNS). False when the matrix is not
 * positive definite to rounding or no x keeps the limits. */
bool ef__least_quadratic(size_t n, const double *matrix, const double *linear,
                         size_t n_limits, const double *limit,
                         const double *bound, double *x);

/* ---- Linear programmes (simplex.c) -------------------------------------- */

/** Most rows of a programme. */
#define EF__PROGRAMME_ROWS 16

/** All x with sum over columns of column_j x_j = right and low <= x <= high:
 * few rows, any number of columns. Borrowed; limits are finite. */
typedef struct ef__programme {
  size_t n_rows, n_columns;
  const double *column; /**< n_columns x n_rows: column after column */
  const double *right;  /**< n_rows */
  const double *low, *high; /**< n_columns each, low <= high */
} ef__programme;

typedef enum ef__simplex_end {
  EF__SIMPLEX_BEST,
  EF__SIMPLEX_INFEASIBLE, /**< no x keeps to rows and limits */
  EF__SIMPLEX_STALLED     /**< stopped after far too many steps (never seen) */
} ef__simplex_end;

/** Where the last search ended and the next begins: programmes of one size that
 * differ little follow each other cheaply. Owns its memory. */
typedef struct ef__simplex ef__simplex;

/** NULL without memory or for more than EF__PROGRAMME_ROWS rows. */
ef__simplex *ef__simplex_new(size_t n_rows, size_t n_columns);
void ef__simplex_free(ef__simplex *simplex);
/** How far outside its limits, as a share of their distance, a variable may be
 * before it is put back on them; 1e-10 unless set, at least 1e-15. Less keeps
 * closer to the rows and takes more care of degenerate corners. */
void ef__simplex_set_slack(ef__simplex *simplex, double share);
/** Forgets where the last search ended. */
void ef__simplex_restart(ef__simplex *simplex);

/** The x that makes cost . x greatest. `x` (n_columns) lies within its limits
 * to the bit and keeps to the rows to rounding (relative to `right` and the
 * sizes of the terms some 1e-12); `dual` (n_rows, may be NULL) receives the
 * prices of the rows: for any x within its limits
 *   cost . x <= dual . right' + sum of max over the limits of
 *               (cost_j - dual . column_j) x_j
 * where right' is what its rows sum to. Nothing is written unless the end is
 * EF__SIMPLEX_BEST. */
ef__simplex_end ef__simplex_maximise(ef__simplex *simplex,
                                     const ef__programme *programme,
                                     const double *cost, double *x,
                                     double *dual);

/* ---- Shortest digits (shortest.c) -------------------------------------- */

/** Room for 17 digits, the terminator, and a digit while rounding. */
#define EF__SHORTEST_DIGITS 20

/** The fewest decimal digits that read back to `value` (finite, above zero),
 * and of those the nearest to it, without trailing zeros. Returns the decimal
 * exponent of the first digit. */
int ef__shortest_digits(double value, char digit[EF__SHORTEST_DIGITS],
                        int *n_digits);

/** value x 10^decimals (value above zero, 0 to 12 decimals) to the nearest
 * whole number, of two equally near the even one; false when that is not known
 * exactly here. */
bool ef__round_exactly(double value, int decimals, uint64_t *number);
/** Digits of a whole number and a terminator; how many. */
int ef__put_whole(uint64_t number, char *digit);

/* ---- Loops (parallel.c) ------------------------------------------------ */

/** ef_parallel_for under the name that the library calls it by. A single chunk
 * runs on the calling thread; threads that cannot be started are done without.
 * Threads stay, parked, for the next loop. To wake one and be done with it takes
 * some tens of microseconds: chunks should be worth a hundred or more. */
void ef__parallel_for(size_t n, size_t chunk, int jobs,
                      void (*body)(void *ctx, size_t begin, size_t end),
                      void *ctx);

/* ---- Random streams (random.c) ----------------------------------------- */

/** State of one stream (xoshiro256**: Blackman & Vigna, ACM Trans. Math. Softw.
 * 47 (2021) 36). Streams of one seed differ by their index, so that what is
 * drawn for item i depends on (seed, i) alone: not on how many items there
 * are, nor on the thread that draws. The generators of GSL take 32 bits of
 * seed, of which two of a million streams would all but surely share one. */
typedef struct ef__random {
  uint64_t state[4];
} ef__random;

/** Stream `index` of `seed`. */
ef__random ef__random_stream(uint64_t seed, uint64_t index);
uint64_t ef__random_bits(ef__random *random);
/** Uniform in the open interval (0, 1): 2^52 values, each half a step above a
 * multiple of 2^-52. */
double ef__random_unit(ef__random *random);
/** Standard normal, one uniform value each, by the inverse distribution
 * function of GSL. */
double ef__random_normal(ef__random *random);

/* ---- Normal distribution (normal.c) ------------------------------------ */

double ef__phi(double x);            /**< density */
double ef__normal(double x);         /**< distribution function */
double ef__normal_inverse(double p); /**< infinite at 0 and 1 */

/* ---- GSL (gsl.c) ------------------------------------------------------- */

/** Switches GSL's process-ending error handler off, once. To be called before
 * any gsl_ function; from any thread. */
void ef__gsl_ready(void);

/** Translates a GSL return code: EF_OK for success, else the error with
 * `purpose` ("fitting the tone curve") and GSL's text. */
ef_status ef__gsl_status(int code, const char *purpose, ef_error *error);

/* ---- Names (names.c) --------------------------------------------------- */

/** Equal but for the case of ASCII letters. */
bool ef__name_equal(const char *a, const char *b);

/** EF_UNKNOWN_NAME: "no WHAT is called 'NAME'; near names: a, b, c" or
 * "...; known: a, b, ..." (the first few) when none is near. */
ef_status ef__error_unknown(ef_error *error, const char *what, const char *name,
                            const char *const *known, size_t n);

#endif
