/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Files in and out. Readers check and name what is wrong by file, line and
 * field; they never compute colour. Outputs appear whole or not at all. */
#ifndef EVENFIELD_EXCHANGE_H
#define EVENFIELD_EXCHANGE_H

#include <evenfield/base.h>
#include <evenfield/colour.h>
#include <evenfield/spectrum.h>

#ifdef __cplusplus
extern "C" {
#endif

/* ---- Reading tables ---------------------------------------------------- */

/** What the rows of a table are. */
typedef enum ef_content {
  EF_CONTENT_SPECTRA, /**< one spectrum a row (long files are turned) */
  EF_CONTENT_LAB,     /**< L, a, b */
  EF_CONTENT_XYZ,     /**< X, Y, Z */
  EF_CONTENT_XYY,     /**< x, y, Y */
  EF_CONTENT_DEVICE   /**< device values only */
} ef_content;

/** "spectra", "L,a,b" ... Static. */
EF_API const char *ef_content_text(ef_content content);

/** Answers to what a file may leave open; AUTO takes the file's word, else a
 * documented rule with a note. */
typedef enum ef_kind_choice {
  EF_KIND_AUTO,
  EF_KIND_SURFACE,
  EF_KIND_LIGHT,
  EF_KIND_FUNCTION /**< functions of wavelength of any sign and size, such as
                        colour-matching functions; the kind of the head is
                        EF_LIGHT */
} ef_kind_choice;

typedef struct ef_reader_settings {
  ef_kind_choice kind;
  bool skip_bad;      /**< leave out rows at fault: the first ten are noted, all
                           are counted; of long spectra a row is a wavelength.
                           Faults of the header row, quotes that do not close
                           and lines that are too long stay errors */
  double device_max;  /**< device value of full drive; 0: the file's
                           `# device_max:` line, else 255 when a value exceeds
                           1 (100 for C, M, Y), else 1, with a note */
  size_t max_bytes;   /**< of a file held in memory whole (long spectra,
                           ef_spectra_read) */
  /** Only rows that begin in this range of the file's bytes, or rows 0 to n of
   * a table held whole as if they were of one length; both 0: all. What the
   * first rows of the file decide they decide for every range, and names of
   * rows, lines and the decimal mark are those of the whole: ranges that meet
   * give the rows of the file, each once. What stands before the range is
   * passed over without being read. */
  size_t first_byte, end_byte;
  bool reads_others;  /**< rows outside the range come as well, and only what is
                           said of rows at fault keeps to it */
  bool reads_ahead;   /**< a thread of its own reads the next rows of a file (or
                           text) while the caller works on the last ones; what
                           comes, and the order of notes, stay the same */
  const ef_notes *notes;
} ef_reader_settings;
/** AUTO, no skipping, 1 GiB, all rows, no notes. */
EF_API ef_reader_settings ef_reader_settings_default(void);

/** An open table. Streams: memory does not grow with the number of rows,
 * except for long-form spectra, which are held whole. */
typedef struct ef_reader ef_reader;

/** `path`: a file, "-" for standard input, or "demo:NAME" for a file of the
 * built-in scenario. Reads the comment lines, the header row and the first 100
 * rows, and decides the content. `settings` NULL: the defaults. Free with
 * ef_reader_free.
 *
 * CSV per RFC 4180 with `#` comment lines before the header and between rows;
 * comma, semicolon or tab (between semicolons or tabs a decimal comma is
 * understood; the first number that has a mark decides for the file);
 * byte-order mark; CRLF. A line of separators alone is as good as a blank one.
 * Header: `wavelength_nm` first: long spectra; columns named by wavelength
 * (400, 400nm, nm400): wide spectra; L,a,b / X,Y,Z / x,y,Y; R,G,B / C,M,Y
 * (or red,green,blue / cyan,magenta,yellow) device values beside any of these
 * or alone (of words case does not count), with inks a fourth K (black); where C,M,Y stand side by side and
 * another column is Y, theirs is yellow; `name` anywhere, and `angle_deg` (or
 * `angle`) for one of several angles at which a sample was measured (not in
 * long spectra). Case counts: x is not X. Where several sets are there, spectra
 * come first, then X,Y,Z, x,y,Y, L,a,b; columns that are not used are noted.
 * Comment lines above the header `# title:`, `# quantity:`, `# unit:`,
 * `# device_max:`, `# illuminant:`, `# observer:` are understood.
 *
 * Also the text form of CGATS.17 and ISO 28178, known by its first word or by a
 * BEGIN_DATA_FORMAT among the first bytes, and held whole (at most 256 MiB): the
 * first table of the file. Fields CMYK_C, CMY_C, RGB_R, XYZ_X, XYY_X, LAB_L and
 * their like, SAMPLE_NAME (else SAMPLE_ID), spectra as SPECTRAL_NM400 or NM_400
 * or 400 and their like, or as pairs SPECTRAL_NM with SPECTRAL_PCT or
 * SPECTRAL_DEC. Inks are percent; spectra are reflectances (of R,G,B files what
 * their values tell), and percent where a value is above 2, with a note; full
 * drive of R,G,B is that of a keyword DEVICE_MAX (ours), else 1, 100 or 255,
 * whichever the largest value reaches, with a note. ILLUMINANT and OBSERVER, also as WEIGHTING_FUNCTION, are told as they
 * are. NUMBER_OF_FIELDS and NUMBER_OF_SETS must be right where they are there.
 *
 * Kind rule: the settings; else a quantity line that says reflectance,
 * radiance factor, transmittance (surface) or radiance, power, light
 * (light); else surface when every value of the first rows lies in -0.02 to 2,
 * light otherwise, with a note. Values of lights may fall below zero by 0.1 %
 * of the largest value of their row (of their file for long spectra): that is
 * the noise of an instrument, and it is kept. Refused: lower values of lights,
 * values of surfaces below -0.02 or above 2 (percent is read where a line
 * `# unit: percent` says so, and becomes ratios), Y or L below zero,
 * chromaticities without y, device values below zero or above full drive, text
 * in a number, nan, inf, wavelengths that are duplicate, unsorted
 * or outside 100 to 10000 nm, repeated column names, ragged rows, lines above
 * 4 MiB, quoted fields above 64 KiB, more than 16384 columns. */
EF_API ef_reader *ef_reader_open(const char *path,
                                 const ef_reader_settings *settings,
                                 ef_error *error);
/** The same from `length` bytes of text that must outlive the reader. */
EF_API ef_reader *ef_reader_from_text(const char *name, const char *text,
                                      size_t length,
                                      const ef_reader_settings *settings,
                                      ef_error *error);
EF_API void ef_reader_free(ef_reader *reader);

/** What is known once the header (and the first rows) are read. Borrowed. */
typedef struct ef_reader_head {
  const char *file;
  const char *title;       /**< of the `# title:` line, "" if none */
  /** The light and the observer that the file says its colours are of, in its
   * own words, "" if none; readers make nothing of them. */
  const char *illuminant, *observer;
  ef_content content;
  size_t width;            /**< values per row: samples, or 3; 0 where there
                                are device values only */
  ef_grid grid;            /**< of spectra; count 0 else */
  ef_kind kind;            /**< of spectra; of X,Y,Z and x,y,Y a light where
                                the settings or the quantity line say so */
  bool absolute;           /**< unit line says W sr-1 m-2 nm-1, or X,Y,Z in
                                cd/m2 (x,y,Y too) */
  bool has_names;          /**< rows have names of their own */
  bool has_angles;         /**< rows have a measuring angle */
  size_t n_device;         /**< device values per row, 0 if none */
  const char *const *device_name; /**< "red", "green", "blue", or "cyan" ...
                                      "black" */
} ef_reader_head;
EF_API const ef_reader_head *ef_reader_get_head(const ef_reader *reader);

/** Some rows. All pointers are borrowed until the next call. */
typedef struct ef_block {
  size_t n;
  const char *const *name;  /**< "row 7" style names where the file has none */
  const size_t *line;       /**< line in the file (column number for long) */
  const size_t *offset;     /**< the byte at which it begins, as of first_byte */
  const double *value;      /**< n x width */
  const double *device;     /**< n x n_device in [0, 1], NULL if none */
  const double *angle_deg;  /**< n measuring angles, NULL if none */
} ef_block;

/** Next rows, at most `max_rows` (1 or more); n = 0 at the end. After an error
 * nothing more comes. */
EF_API ef_status ef_reader_next(ef_reader *reader, size_t max_rows,
                                ef_block *block, ef_error *error);
/** Rows of the range left out so far because they were at fault (skip_bad). */
EF_API size_t ef_reader_skipped(const ef_reader *reader);

/** Bytes of a file that can be read again, or of "demo:NAME": what ranges are
 * shares of. EF_UNREADABLE for what has no size of its own (standard input, a
 * pipe). */
EF_API ef_status ef_file_bytes(const char *path, size_t *n_bytes,
                               ef_error *error);

/** All spectra of a file. EF_MALFORMED when it holds something else. */
EF_API ef_spectra *ef_spectra_read(const char *path,
                                   const ef_reader_settings *settings,
                                   ef_error *error);

/** A small table of numbers whose columns are known by name (ages and their
 * shares ...), held whole; owns its memory. */
typedef struct ef_columns ef_columns;

enum { EF_COLUMNS_MOST = 16, EF_COLUMNS_MOST_ROWS = 1000000 };

/** Reads the columns `names[0 .. n_columns)`, in any order in the file and
 * whatever their case; others are noted and not used. Path and CSV as for
 * ef_reader_open; every cell read must hold a finite number. EF_MALFORMED names
 * the line and the field, or the column that is missing. Free with
 * ef_columns_free. */
EF_API ef_columns *ef_columns_read(const char *path, size_t n_columns,
                                   const char *const *names,
                                   const ef_notes *notes, ef_error *error);
/** The same from `length` bytes of text. */
EF_API ef_columns *ef_columns_from_text(const char *name, const char *text,
                                        size_t length, size_t n_columns,
                                        const char *const *names,
                                        const ef_notes *notes,
                                        ef_error *error);
EF_API void ef_columns_free(ef_columns *columns);
/** At least 1. */
EF_API size_t ef_columns_rows(const ef_columns *columns);
/** `column` by its place in the names asked for. */
EF_API double ef_columns_at(const ef_columns *columns, size_t row,
                            size_t column);
/** Line of a row in its file. */
EF_API size_t ef_columns_line(const ef_columns *columns, size_t row);

/** A table whose fields are taken as texts, by the names of their columns: lists
 * of pairs, records. Streams; owns its memory. */
typedef struct ef_fields ef_fields;

enum { EF_FIELDS_MOST = 16 };

/** `names[0 .. n)` in any order in the file and whatever their case; the first
 * `n_needed` must be there (EF_MALFORMED else), and columns of other names are
 * noted and not used. Path and CSV as for ef_reader_open. Free with
 * ef_fields_free. */
EF_API ef_fields *ef_fields_open(const char *path, size_t n, size_t n_needed,
                                 const char *const *names,
                                 const ef_notes *notes, ef_error *error);
EF_API void ef_fields_free(ef_fields *fields);
/** The next row's n texts without blanks around them, borrowed until the next
 * call, "" where the file has no such column; NULL at the end. */
EF_API ef_status ef_fields_next(ef_fields *fields, const char *const **text,
                                size_t *line, ef_error *error);
/** Field `i` of the current row as a number; EF_MALFORMED names line and
 * field. */
EF_API ef_status ef_fields_number(ef_fields *fields, size_t i, double *value,
                                  ef_error *error);
/** The byte at which the current row begins. */
EF_API size_t ef_fields_offset(const ef_fields *fields);
/** True when the file has column `i` of the names asked for. */
EF_API bool ef_fields_has(const ef_fields *fields, size_t i);
/** Text of the `# unit:` line, "" if none; borrowed. */
EF_API const char *ef_fields_unit(const ef_fields *fields);
/** A fault that the caller found in field `i` of the current row: EF_MALFORMED
 * with file, line and field. */
EF_API ef_status ef_fields_fault(const ef_fields *fields, size_t i,
                                 ef_error *error, const char *format, ...)
    EF_PRINTF(4, 5);

/** All bytes of a text, with a terminator behind them, without a byte-order
 * mark. Path as for ef_reader_open. EF_MALFORMED for more than `most_bytes`,
 * for NUL bytes and for what is plainly no text. To be freed with free(). */
EF_API char *ef_text_read(const char *path, size_t most_bytes, size_t *length,
                          ef_error *error);

/** A JSON document (RFC 8259) held whole; owns its memory. Its values are found
 * by JSON Pointer (RFC 6901): "" is all of it, "/files/0/name" a member. */
typedef struct ef_document ef_document;
/** EF_MALFORMED names the line; objects with a key twice are refused. Free with
 * ef_document_free. */
EF_API ef_document *ef_document_read(const char *path, size_t most_bytes,
                                     ef_error *error);
EF_API ef_document *ef_document_from_text(const char *name, const char *text,
                                          size_t length, ef_error *error);
EF_API void ef_document_free(ef_document *document);
/** The text there, borrowed, and its length unless NULL; NULL when there is
 * nothing or no text. Keys of at most 255 bytes are found. */
EF_API const char *ef_document_text(const ef_document *document,
                                    const char *pointer, size_t *length);
/** How many elements the array there, or members the object, has; else 0. */
EF_API size_t ef_document_count(const ef_document *document,
                                const char *pointer);

/** Names and texts of the built-in scenario's files ("livery" ...). */
EF_API size_t ef_demo_count(void);
EF_API const char *ef_demo_name(size_t i);
EF_API const char *ef_demo_text(size_t i, size_t *length);

/** The bytes of a whole file that is no text, such as an ICC profile; "-" is
 * standard input. EF_MALFORMED when there are more than `max_bytes` or none.
 * Free with free(). */
EF_API ef_status ef_bytes_read(const char *path, size_t max_bytes,
                               unsigned char **bytes, size_t *length,
                               ef_error *error);

/** Room for a digest as hexadecimal text. */
#define EF_DIGEST_TEXT 65
/** SHA-256 (FIPS 180-4) of a file or of "demo:NAME", as 64 lower-case
 * hexadecimal digits. */
EF_API ef_status ef_digest_file(const char *path, char text[EF_DIGEST_TEXT],
                                ef_error *error);

/* ---- Writing ----------------------------------------------------------- */

/** An output that appears whole or not at all: written beside its place,
 * synced, renamed by ef_output_commit. */
typedef struct ef_output ef_output;

/** NULL or "-": standard output. It, devices and pipes are written through:
 * there is nothing to undo. A symbolic link stays one; the file it leads to is
 * replaced. EF_EXISTS when the file is there and `overwrite` is false, also
 * when it has come to be there by the time of ef_output_commit. */
EF_API ef_output *ef_output_open(const char *path, bool overwrite,
                                 ef_error *error);
EF_API ef_status ef_output_write(ef_output *output, const void *bytes,
                                 size_t length, ef_error *error);
EF_API ef_status ef_output_text(ef_output *output, const char *text,
                                ef_error *error);
/** Finishes and frees; on failure nothing is left behind. */
EF_API ef_status ef_output_commit(ef_output *output, ef_error *error);
/** Drops what was written and frees; NULL is fine. */
EF_API void ef_output_discard(ef_output *output);
/** An output in memory, such as a part of another that a thread of its own
 * writes. ef_output_bytes gives what was written to it, borrowed until the next
 * write (NULL and 0 for nothing); ef_output_clear forgets it and keeps the room.
 * Free with ef_output_discard. */
EF_API ef_output *ef_output_memory(ef_error *error);
EF_API const char *ef_output_bytes(const ef_output *output, size_t *length);
EF_API void ef_output_clear(ef_output *output);
/** Creates a directory unless it is there. */
EF_API ef_status ef_directory_make(const char *path, ef_error *error);

/** Rows of CSV, written as they come; quotes what needs it; numbers with all
 * digits; NaN as an empty field, infinities as inf and -inf; lines end with
 * LF. Errors are kept and reported by
 * ef_csv_finish. Free with ef_csv_finish; the output stays the caller's. */
typedef struct ef_csv ef_csv;
EF_API ef_csv *ef_csv_new(ef_output *output, ef_error *error);
EF_API void ef_csv_comment(ef_csv *csv, const char *text);
EF_API void ef_csv_text(ef_csv *csv, const char *text);
EF_API void ef_csv_number(ef_csv *csv, double value);
EF_API void ef_csv_end_row(ef_csv *csv);
/** Whole rows that another writer made, as they are. */
EF_API void ef_csv_rows(ef_csv *csv, const char *bytes, size_t length);
EF_API ef_status ef_csv_finish(ef_csv *csv, ef_error *error);

/** One table in the text form of CGATS.17 and ISO 28178, whose rows are held
 * until ef_cgats_finish, as their number stands before them. First keywords
 * (ORIGINATOR, FILE_DESCRIPTOR, CREATED are wanted by the standard) and fields,
 * in their order, then the items of every row. Names of fields with a wavelength
 * (SPECTRAL_NM380) are announced by a KEYWORD line. Texts stand in quotes; a
 * quote in them becomes an apostrophe, a control character a blank. Errors are
 * kept and reported by ef_cgats_finish: numbers that are not finite and rows
 * with more or fewer items than fields are EF_INVALID. The output stays the
 * caller's. */
typedef struct ef_cgats ef_cgats;
EF_API ef_cgats *ef_cgats_new(ef_output *output, ef_error *error);
EF_API void ef_cgats_keyword(ef_cgats *cgats, const char *keyword,
                             const char *value);
EF_API void ef_cgats_field(ef_cgats *cgats, const char *name);
EF_API void ef_cgats_text(ef_cgats *cgats, const char *text);
EF_API void ef_cgats_number(ef_cgats *cgats, double value);
EF_API void ef_cgats_end_row(ef_cgats *cgats);
EF_API ef_status ef_cgats_finish(ef_cgats *cgats, ef_error *error);
/** Frees without writing; NULL is fine. */
EF_API void ef_cgats_discard(ef_cgats *cgats);

/** One JSON document, written as it comes (RFC 8259, UTF-8): NaN and
 * infinities and a NULL text as null, invalid UTF-8 as U+FFFD, nesting up to
 * 64 levels. `key` is NULL inside arrays and
 * for the top value. Errors are kept and reported by ef_json_finish; nesting
 * that does not close is EF_INVALID there. */
typedef struct ef_json ef_json;
EF_API ef_json *ef_json_new(ef_output *output, ef_error *error);
EF_API void ef_json_begin_object(ef_json *json, const char *key);
EF_API void ef_json_end_object(ef_json *json);
EF_API void ef_json_begin_array(ef_json *json, const char *key);
EF_API void ef_json_end_array(ef_json *json);
EF_API void ef_json_text(ef_json *json, const char *key, const char *text);
EF_API void ef_json_number(ef_json *json, const char *key, double value);
EF_API void ef_json_integer(ef_json *json, const char *key, int64_t value);
EF_API void ef_json_boolean(ef_json *json, const char *key, bool value);
EF_API void ef_json_null(ef_json *json, const char *key);
EF_API ef_status ef_json_finish(ef_json *json, ef_error *error);

/** Part of a document: elements of an array that lies `depth` deep (1: the top
 * value, 2: a member of the top object ...), written elsewhere and put in their
 * place by ef_json_elements. EF_INVALID for a depth of 0 or above 63. Free with
 * ef_json_finish. */
EF_API ef_json *ef_json_new_elements(ef_output *output, size_t depth,
                                     ef_error *error);
/** Elements for the array that is open, from a writer for its depth. */
EF_API void ef_json_elements(ef_json *json, const char *bytes, size_t length);

/* ---- PNG --------------------------------------------------------------- */

/** Colour tags of a picture (PNG third edition): code points of ITU-T H.273 in
 * cICP and an ICC profile in iCCP that says the same for readers without cICP;
 * where there is no profile and the code points are those of sRGB, sRGB, gAMA
 * and cHRM say it to them. */
typedef struct ef_png_tags {
  int primaries, transfer;      /**< cICP; 0: no cICP chunk */
  const char *profile_name;     /**< 1 to 79 Latin-1 characters */
  const unsigned char *profile; /**< iCCP; NULL: no chunk */
  size_t profile_length;
} ef_png_tags;

/** RGB picture, `bits` 8 or 16, at most 1 000 000 pixels a side; `sample` is
 * height x width x 3 in 16-bit range, for 8-bit pictures rounded to the nearest
 * of sample * 255 / 65535. `tags` may be NULL: untagged. A profile that libpng
 * refuses is EF_UNWRITABLE. */
EF_API ef_status ef_png_write(const char *path, bool overwrite, size_t width,
                              size_t height, int bits, const uint16_t *sample,
                              const ef_png_tags *tags, ef_error *error);

/** Gives the rows of a picture, from the top, each once. */
typedef struct ef_png_rows {
  /** Fills row `y`, width x 3 samples in 16-bit range. */
  void (*fill)(void *cookie, size_t y, uint16_t *sample);
  void *cookie;
  /** The same where that can fail, used unless NULL: then nothing is written,
   * and the error is that of the call. */
  ef_status (*give)(void *cookie, size_t y, uint16_t *sample, ef_error *error);
} ef_png_rows;

/** Like ef_png_write, holding one row at a time. */
EF_API ef_status ef_png_write_rows(const char *path, bool overwrite,
                                   size_t width, size_t height, int bits,
                                   const ef_png_rows *rows,
                                   const ef_png_tags *tags, ef_error *error);

/** What is read of pictures. */
typedef struct ef_png_settings {
  size_t max_pixels; /**< width x height: what a small file may claim */
  size_t max_bytes;  /**< of an interlaced picture, which is held whole */
  const ef_notes *notes;
} ef_png_settings;
/** 400 million pixels, 1 GiB, no notes. */
EF_API ef_png_settings ef_png_settings_default(void);

/** What a picture says of itself: its size, and every colour tag that is there,
 * whichever counts. */
typedef struct ef_png_head {
  const char *file;
  size_t width, height;
  int bits;           /**< of a sample in the file: 1, 2, 4, 8 or 16 */
  const char *layout; /**< "RGB", "grey", "palette", "RGB with alpha", "grey
                           with alpha" */
  bool is_grey;       /**< a row has each sample three times */
  bool has_alpha;
  bool has_cicp;      /**< code points of ITU-T H.273 */
  int primaries, transfer, matrix;
  bool is_full_range;
  bool has_iccp;
  const char *profile_name;
  const unsigned char *profile;
  size_t profile_length;
  const char *damage; /**< of a profile that is left out; "" none */
  bool has_srgb;
  int srgb_intent;
  bool has_gamma;
  double gamma;       /**< as the chunk has it: 0.45455 for a power of 2.2 */
  bool has_chromaticities;
  ef_xy white, red, green, blue;
} ef_png_head;

/** The tag that counts, in the order of PNG third edition, 4.3. */
typedef enum ef_png_source {
  EF_PNG_UNTAGGED,
  EF_PNG_CICP,
  EF_PNG_ICCP,
  EF_PNG_SRGB,
  EF_PNG_GAMA /**< gAMA and cHRM, or one of them */
} ef_png_source;
EF_API ef_png_source ef_png_get_source(const ef_png_head *head);

/** An open picture, read row by row; memory does not grow with its height
 * unless it is interlaced. */
typedef struct ef_png ef_png;

/** Any colour type and depth; "-" is standard input. EF_MALFORMED for what is no
 * PNG, is cut off or damaged, says it is larger than the settings allow, or
 * unpacks to more than 64 MiB in one chunk beside the pixels. A chunk that
 * libpng leaves out as damaged is noted. Free with ef_png_free. */
EF_API ef_png *ef_png_open(const char *path, const ef_png_settings *settings,
                           ef_error *error);
/** The same from bytes that must outlive it. */
EF_API ef_png *ef_png_from_bytes(const char *name, const void *bytes,
                                 size_t length, const ef_png_settings *settings,
                                 ef_error *error);
EF_API void ef_png_free(ef_png *png);
/** Borrowed until freed. */
EF_API const ef_png_head *ef_png_get_head(const ef_png *png);
/** The next row, width x 3 samples in 16-bit range (8-bit ones times 257);
 * has_row false behind the last one. A pixel that is not opaque is EF_MALFORMED:
 * its colour depends on what lies behind. After an error nothing more comes. */
EF_API ef_status ef_png_next_row(ef_png *png, uint16_t *sample, bool *has_row,
                                 ef_error *error);

/* ---- Spectral images ---------------------------------------------------- */

/** How the values of a spectral image follow each other. */
typedef enum ef_interleave {
  EF_BSQ, /**< band after band, each line after line */
  EF_BIL, /**< line after line, each band after band */
  EF_BIP  /**< pixel after pixel, each with all bands */
} ef_interleave;
/** "bsq", "bil", "bip". Static. */
EF_API const char *ef_interleave_text(ef_interleave interleave);

/** What the values are, with the codes that headers have for it. */
typedef enum ef_sample_type {
  EF_UINT8 = 1,
  EF_INT16 = 2,
  EF_INT32 = 3,
  EF_FLOAT32 = 4,
  EF_FLOAT64 = 5,
  EF_UINT16 = 12,
  EF_UINT32 = 13
} ef_sample_type;
/** "8-bit unsigned integers" ... Static. */
EF_API const char *ef_sample_type_text(ef_sample_type type);
/** Bytes of a value. */
EF_API size_t ef_sample_type_bytes(ef_sample_type type);

typedef struct ef_cube_settings {
  const char *data; /**< the file with the values; NULL: the one that stands
                         beside the header */
  const ef_notes *notes;
} ef_cube_settings;
/** The one beside the header, no notes. */
EF_API ef_cube_settings ef_cube_settings_default(void);

/** What the header of a spectral image says. */
typedef struct ef_cube_head {
  const char *file;      /**< the header */
  const char *data_file; /**< the values */
  const char *description; /**< "" if none */
  size_t width, height, n_bands; /**< samples, lines, bands */
  size_t offset_bytes;
  ef_sample_type type;
  ef_interleave interleave;
  bool is_big_endian;
  /** Bands that can be used, by wavelength: `band[i]` counts from 0 in the file
   * and stands for grid's wavelength i; value = gain[i] * stored + offset[i]. */
  size_t n_used;
  const size_t *band;
  const double *gain, *offset;
  ef_grid grid;
  bool has_ignored; /**< the stored value `ignored` means no data */
  double ignored;
  /** What the header says of the values: EF_KIND_SURFACE for a reflectance scale
   * factor or a description with a word such as reflectance, EF_KIND_LIGHT for
   * one such as radiance, else EF_KIND_AUTO. */
  ef_kind_choice kind;
  size_t n_marked_bad; /**< bands left out, as the header's bbl says */
  size_t n_repeated;   /**< bands left out, of a wavelength that came before */
  bool is_sorted;      /**< wavelengths rise in the file */
} ef_cube_head;

/** A spectral image whose header has been read; nothing of its values is held.
 * May be read by several threads at once, each with a window of its own. */
typedef struct ef_cube ef_cube;

/** `path`: an ENVI-style header, a text that starts with the line ENVI and goes
 * on with lines `key = value`; values in braces may go on over lines, lines that
 * start with a semicolon are passed over. Needed are samples, lines, bands, data
 * type (ef_sample_type), interleave and wavelength; understood are header
 * offset, byte order, wavelength units (nm or micrometres; without them
 * wavelengths that are all below 100 are taken as micrometres, else as nm, with
 * a note), reflectance scale factor (values are divided by it), data gain values
 * and data offset values (of each band), data ignore value, bbl (0: a bad band)
 * and description. File types other than ENVI Standard, compressed files and
 * frames with gaps are refused; other keys are passed over. Of bands of one
 * wavelength the first is used, and they are sorted; both are noted.
 *
 * The values are read from `settings->data`, else from the file called as the
 * header without .hdr, or that name with .img, .dat, .raw, .bsq, .bil or .bip;
 * EF_MALFORMED where more than one of them is there. A data file shorter than
 * the header says is EF_MALFORMED, a longer one is noted. Free with
 * ef_cube_free, after its windows. */
EF_API ef_cube *ef_cube_open(const char *path, const ef_cube_settings *settings,
                             ef_error *error);
EF_API void ef_cube_free(ef_cube *cube);
/** Borrowed until freed. */
EF_API const ef_cube_head *ef_cube_get_head(const ef_cube *cube);

/** Some pixels of a cube, in some of its bands. */
typedef struct ef_cube_window ef_cube_window;

/** For the bands of the file band[0 .. n_bands), which come out in this order.
 * It holds what is read at a time: up to 1 MiB of the file, 8 MiB of bsq, or one
 * pixel where that is more. Free with ef_cube_window_free. */
EF_API ef_cube_window *ef_cube_window_new(const ef_cube *cube, size_t n_bands,
                                          const size_t *band, ef_error *error);
EF_API void ef_cube_window_free(ef_cube_window *window);
/** Pixels that are read at a time, at most. */
EF_API size_t ef_cube_window_pixels(const ef_cube_window *window);
/** Bytes that it holds. */
EF_API size_t ef_cube_window_bytes(const ef_cube_window *window);
/** Reads pixels first .. first + n - 1, counted along the lines. */
EF_API ef_status ef_cube_window_read(ef_cube_window *window, size_t first,
                                     size_t n, ef_error *error);
/** Stored values of n pixels from pixel i of what was read on, n x n_bands;
 * `room` or values of the window, borrowed until the next read. Types of 8 and
 * 16 bits and EF_FLOAT32 are floats exactly; others are rounded. */
EF_API const float *ef_cube_window_floats(const ef_cube_window *window,
                                          size_t i, size_t n, float *room);
/** Pixels that lie band by band: value k of pixel i of them is the stored value
 * at i + k * band_step. Borrowed until the next read. */
typedef struct ef_cube_plane {
  const void *value; /**< of the type of the cube, in the order of this
                          machine's bytes */
  size_t n;          /**< pixels that lie so, at least 1 */
  size_t band_step;
} ef_cube_plane;
/** Of what was read, from pixel i on; false where they do not lie so (bip, and
 * bil with bands chosen out of their order). */
EF_API bool ef_cube_window_plane(const ef_cube_window *window, size_t i,
                                 ef_cube_plane *plane);
/** The same as doubles, which hold every type exactly. */
EF_API const double *ef_cube_window_doubles(const ef_cube_window *window,
                                            size_t i, size_t n, double *room);

/** Where a spectral image of floats is written: the header at `path`, which ends
 * in .hdr, the values beside it, interleaved by pixel, in the file of the same
 * name that ends in .bip. */
typedef struct ef_cube_out ef_cube_out;

/** EF_INVALID when `path` does not end in .hdr or a size is 0. Bands are named
 * and have no wavelength. Finish with ef_cube_out_commit. */
EF_API ef_cube_out *ef_cube_out_open(const char *path, bool overwrite,
                                     size_t width, size_t height,
                                     size_t n_bands,
                                     const char *const *band_name,
                                     const char *description, ef_error *error);
/** The next n pixels, n x n_bands, rounded to floats. */
EF_API ef_status ef_cube_out_write(ef_cube_out *out, size_t n,
                                   const double *value, ef_error *error);
/** Gives both files their names and frees; on failure neither is there. */
EF_API ef_status ef_cube_out_commit(ef_cube_out *out, ef_error *error);
/** Drops what was written and frees; NULL is fine. */
EF_API void ef_cube_out_discard(ef_cube_out *out);

#ifdef __cplusplus
}
#endif

#endif
