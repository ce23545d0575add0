/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Status codes, error records, notes, and numbers as text.
 *
 * Conventions of the whole library: wavelengths in nm, angles in degrees,
 * arrays row-major and flat with their length beside them, `const` on what is
 * only read, arguments in the order object, inputs, settings, outputs, error.
 * An `ef_error *` may be NULL everywhere. The first call into the library
 * switches off the process-wide error handler of GSL, whose default would end
 * the process. */
#ifndef EVENFIELD_BASE_H
#define EVENFIELD_BASE_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#if defined(__GNUC__)
#define EF_API __attribute__((visibility("default")))
#define EF_PRINTF(text, first) __attribute__((format(printf, text, first)))
#else
#define EF_API
#define EF_PRINTF(text, first)
#endif

#ifdef __cplusplus
extern "C" {
#endif

/** What a call came to. An answer that is not what the user hoped for (out of
 * gamut, range not covered) is EF_OK with fields that say so. */
typedef enum ef_status {
  EF_OK = 0,
  EF_INVALID,      /**< an argument breaks the documented contract */
  EF_NO_MEMORY,    /**< an allocation failed */
  EF_UNREADABLE,   /**< a file could not be opened or read */
  EF_MALFORMED,    /**< input was read and is not what it should be */
  EF_UNKNOWN_NAME, /**< no table, observer, metric ... of that name */
  EF_NO_ANSWER,    /**< the question has no answer (dependent primaries, ...) */
  EF_UNWRITABLE,   /**< an output could not be written whole */
  EF_EXISTS        /**< an output exists and overwriting was not asked for */
} ef_status;

/** The status in a few English words. Static text. */
EF_API const char *ef_status_text(ef_status status);

/** What went wrong, owned by the caller, filled by the call that failed and
 * left alone by a call that did not. `message` is one line: what was found,
 * what was expected, what to do. */
typedef struct ef_error {
  ef_status status;
  char file[256];     /**< input or output concerned, "" if none */
  size_t line;        /**< 1-based, 0 if none */
  size_t column;      /**< 1-based field number in the line, 0 if none */
  char field[64];     /**< name of the field, "" if none */
  char message[512];
} ef_error;

/** Writes "file:line: field NAME: message" (the parts that are known) to
 * `text`, at most `size` bytes with the terminator. */
EF_API void ef_error_describe(const ef_error *error, char *text, size_t size);

/** Receives assumptions and warnings, one line each, no newline at the end.
 * Never called from two threads at once by one call into the library. */
typedef struct ef_notes {
  void (*write)(void *cookie, const char *line);
  void *cookie;
} ef_notes;

/** "MAJOR.MINOR.PATCH" of the library in use. Static text. */
EF_API const char *ef_version(void);

/** Room for any number that ef_number_format writes, with the terminator. */
#define EF_NUMBER_TEXT 32

/** Shortest decimal text that reads back to the same double (at most 17
 * significant digits), independent of the locale; "nan", "inf", "-inf" for
 * what is not finite. Returns the length. */
EF_API size_t ef_number_format(double value, char text[EF_NUMBER_TEXT]);

/** Like ef_number_format with a fixed number of decimals (0 to 12), never in
 * exponent form; falls back to the shortest form where that would not fit.
 * A value that rounds to zero has no minus sign. */
EF_API size_t ef_number_format_fixed(double value, int decimals,
                                     char text[EF_NUMBER_TEXT]);

/** Reads all of `text[0 .. length)` as a decimal number, independent of the
 * locale, correctly rounded. `decimal_mark` is '.' or ','. No blanks, no
 * hexadecimal, no "nan" or "inf", and a value too large for a double is
 * refused: all of these return false. */
EF_API bool ef_number_parse(const char *text, size_t length, char decimal_mark,
                            double *value);

/** Finds the names of `known[0 .. n)` close to `name` (edit distance at most a
 * third of its length, case ignored), the nearest first, and writes their
 * indices to `index[0 .. max)`. Names that `name` is a prefix of count as
 * close. Returns how many were written. */
EF_API size_t ef_nearest_names(const char *name, const char *const *known,
                               size_t n, size_t max, size_t *index);

/** Quantile p (0 to 1) of n >= 1 finite values, linear between neighbouring
 * ones: place p (n - 1) of the sorted values, counted from 0. Changes the order
 * of `value`. */
EF_API double ef_quantile(size_t n, double *value, double p);

/** Calls `body` for the pieces [begin, end) of 0 .. n, each `chunk` long but
 * the last, on up to `jobs` threads (0: as many as the process may use cores),
 * the caller's among them, and returns when all are done. Pieces depend on n and
 * `chunk` alone, so a body that writes only to its own range gives the same
 * result with any number of threads. `chunk` 0 counts as 1. A body may call this
 * again, and several threads may at once. The threads stay, parked, until the
 * process ends; one made by fork starts its own. */
EF_API void ef_parallel_for(size_t n, size_t chunk, int jobs,
                            void (*body)(void *ctx, size_t begin, size_t end),
                            void *ctx);

#ifdef __cplusplus
}
#endif

#endif
