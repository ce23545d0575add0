/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Layers of the table reader, lowest first: bytes (input.c), records and their
 * fields (csv.c), columns with names (table.c), what the columns mean
 * (header.c), numbers of one row (row.c), and the two readers on top: a stream
 * of rows (reader.c) and spectra in columns, held whole (long.c). */
#ifndef EVENFIELD_EXCHANGE_PRIVATE_H
#define EVENFIELD_EXCHANGE_PRIVATE_H

#include <evenfield/exchange.h>

/** Bytes of one record, its line end not counted. */
#define EF__LONGEST_RECORD ((size_t)4 << 20)
/** Bytes of one quoted field: what a quote that is not closed may swallow. */
#define EF__LONGEST_QUOTED ((size_t)64 << 10)
/** Columns of a table. */
#define EF__MOST_COLUMNS ((size_t)16384)
/** Wavelengths that are believed, nm: below is another unit or no wavelength,
 * above as well (10 micrometres). */
#define EF__SHORTEST_NM 100.0
#define EF__LONGEST_NM 10000.0

/** Text that is not terminated. */
typedef struct ef__span {
  const char *text;
  size_t length;
} ef__span;

ef__span ef__span_of(const char *text);
/** Without blanks and tabs at both ends. */
ef__span ef__span_trim(ef__span span);

/** Room for ef__quote. */
#define EF__QUOTED 64
/** "'text'" for a message, cut at a whole character where it is long. */
const char *ef__quote(ef__span span, char out[EF__QUOTED]);

/* ---- Numbers (decimal.c) ----------------------------------------------- */

/** Reads the number that starts at `at`, as ef_number_parse would, and returns
 * the first byte behind it; NULL when there is none. The byte at `end` must
 * exist and be no part of a number (a separator, a line end). */
const char *ef__decimal_scan(const char *at, const char *end, char mark,
                             double *value);

/** Why a text is no number. */
typedef enum ef__decimal_fault {
  EF__DECIMAL_GOOD,
  EF__DECIMAL_EMPTY,
  EF__DECIMAL_TEXT,      /**< not a number */
  EF__DECIMAL_ENDLESS,   /**< nan, inf and their like */
  EF__DECIMAL_TOO_LARGE, /**< beyond the range of a double */
  EF__DECIMAL_MARK       /**< a number, with the other decimal mark */
} ef__decimal_fault;

/** All of `span` as a number; `*value` is set when it is good. `mark` 0: whole
 * numbers only, EF__DECIMAL_MARK for others. */
ef__decimal_fault ef__decimal_read(ef__span span, char mark, double *value);

/* ---- Bytes (input.c) --------------------------------------------------- */

/** A window on a file, standard input or a text. The window is
 * buffer[begin .. end); buffer[end] is a line feed that is not part of it. */
typedef struct ef__input {
  char *name;
  int descriptor; /**< -1: memory */
  bool owns_descriptor;
  bool is_file; /**< regular: what is asked for comes */
  const char *memory;
  size_t memory_left;
  char *buffer;
  size_t room;
  size_t begin, end;
  size_t n_read; /**< bytes taken from the source so far */
  bool at_end;   /**< the source has no more */
} ef__input;

/** Share `i` of `n` of some bytes, in whole bytes. */
size_t ef__byte_share(size_t n_bytes, size_t i, size_t n);
/** Opens a file for reading; -1 and the reason in words else. */
int ef__open_file(const char *path, ef_error *error);
ef__input *ef__input_open(const char *path, ef_error *error);
ef__input *ef__input_from_text(const char *name, const char *text,
                               size_t length, ef_error *error);
void ef__input_free(ef__input *input);
/** Reads on behind the window, which moves and grows as needed; nothing once
 * `at_end`. Refuses NUL bytes and, at the start, what is plainly no text. */
ef_status ef__input_more(ef__input *input, ef_error *error);

/* ---- The built-in scenario (demo.c) ------------------------------------ */

typedef enum ef__demo_search {
  EF__DEMO_NONE, /**< the path does not start with demo: */
  EF__DEMO_FOUND,
  EF__DEMO_UNKNOWN /**< the error lists near names */
} ef__demo_search;

ef__demo_search ef__demo_find(const char *path, ef__span *text,
                              ef_error *error);

/** Data of a file in the text form of CGATS.17 (cgats.c). */
typedef struct ef__cgats ef__cgats;

/* ---- Records (csv.c) --------------------------------------------------- */

typedef enum ef__record_kind {
  EF__RECORD_END,
  EF__RECORD_COMMENT, /**< `text` starts behind the '#' */
  EF__RECORD_ROW
} ef__record_kind;

/** Records of a file, one at a time. Spans point into the window of the input
 * and are good until the next record. */
typedef struct ef__records {
  ef__input *input; /**< owned */
  char separator;   /**< 0 until ef__records_detect */
  size_t line;      /**< first line of this record, 1-based */
  size_t n_lines;   /**< lines of this record */
  size_t offset;    /**< of its first byte in the file; of a file held whole
                         its share of the bytes */
  char *text;       /**< without the line end; text[length] is readable and no
                         part of a field */
  size_t length;
  bool has_quotes;
  bool is_split;
  size_t n_fields; /**< of all, also those without room in `field` */
  ef__span *field;
  size_t field_room;
  ef__cgats *cgats; /**< owned; NULL: the file is CSV */
} ef__records;

/** Takes the input over, also when it fails. */
ef_status ef__records_new(ef__input *input, ef__records *records,
                          ef_error *error);
void ef__records_clear(ef__records *records);
/** Next record; blank lines are passed over. */
ef_status ef__records_next(ef__records *records, ef__record_kind *kind,
                           ef_error *error);
/** Chooses the separator from this record: tab, else semicolon, else comma,
 * whichever stands outside quotes. */
void ef__records_detect(ef__records *records);
/** Cuts the record into fields, quotes resolved (in place: once). */
ef_status ef__records_split(ef__records *records, ef_error *error);
/** An error at a field of this record, 0-based; no field for SIZE_MAX. */
ef_status ef__records_error(const ef__records *records, size_t field,
                            const char *name, ef_error *error,
                            const char *format, ...) EF_PRINTF(5, 6);

/* ---- Columns (table.c) ------------------------------------------------- */

/** What "# key: text" lines above the header row say; "" where nothing. */
typedef struct ef__remarks {
  char *title, *quantity, *unit, *device_max, *illuminant, *observer;
  size_t device_max_line;
} ef__remarks;

/** A table whose header row has been read. */
typedef struct ef__table {
  ef__records records;
  ef__remarks remarks;
  size_t header_line;
  size_t n_columns;
  char **column; /**< names, one block with their texts */
  char mark;     /**< decimal mark; 0 as long as no number has shown it */
  size_t mark_line;
  const ef_notes *notes;
} ef__table;

/** Takes the input over, also when it fails. */
ef_status ef__table_open(ef__input *input, const ef_notes *notes,
                         ef__table *table, ef_error *error);
void ef__table_clear(ef__table *table);
/** Next row; false at the end. */
ef_status ef__table_next(ef__table *table, bool *has_row, ef_error *error);
/** Cuts the row into fields, as many as there are columns. */
ef_status ef__table_split(ef__table *table, ef_error *error);
/** Field `column` of the split row as a number. */
ef_status ef__table_number(ef__table *table, size_t column, double *value,
                           ef_error *error);
/** An error at a column of this row. Status EF_MALFORMED. */
#define ef__table_error(table, at, error, ...)                                 \
  ef__records_error(&(table)->records, (at), (table)->column[at], (error),     \
                    __VA_ARGS__)
/* ---- CGATS.17 and ISO 28178 (cgats.c) ----------------------------------- */

/** True when what has been read of a file is the text form of CGATS.17. */
bool ef__cgats_is_one(const ef__input *input);
/** Reads the whole file, checks it and fills the table's remarks and columns,
 * under our names. */
ef_status ef__cgats_open(ef__table *table, ef_error *error);
/** The next row of such a file, already split. */
ef_status ef__cgats_next(ef__records *records, ef__record_kind *kind,
                         ef_error *error);
void ef__cgats_free(ef__cgats *cgats);

/** An error at a column of the header row. */
ef_status ef__header_error(const ef__table *table, size_t column,
                           ef_error *error, const char *format, ...)
    EF_PRINTF(4, 5);

/* ---- Meaning (header.c) ------------------------------------------------ */

/** Where the number of a column goes: a slot of the row, or nowhere. */
#define EF__SLOT_NONE SIZE_MAX
#define EF__SLOT_NAME (SIZE_MAX - 1)
#define EF__SLOT_ANGLE (SIZE_MAX - 2)

typedef struct ef__layout {
  ef_content content;
  bool is_long;
  size_t n_values;  /**< of a row; for long tables wavelength and spectra */
  size_t n_device;  /**< device values behind them */
  const char *const *device_name;
  const char *const *device_letter;
  size_t *slot;     /**< by column */
  size_t *column;   /**< by slot */
  size_t name_column;  /**< SIZE_MAX if none */
  size_t angle_column; /**< likewise */
  double *wavelength_nm; /**< of the values of wide spectra */
} ef__layout;

ef_status ef__layout_new(const ef__table *table, ef__layout *layout,
                         ef_error *error);
void ef__layout_clear(ef__layout *layout);

/** What a quantity or unit line says: 1 surface, -1 light, 0 neither. */
int ef__quantity_kind(const char *text);
/** True for percent, by word or sign. */
bool ef__unit_is_percent(const char *text);
/** True for W sr^-1 m^-2 nm^-1 in any of its usual spellings. */
bool ef__unit_is_radiance(const char *text);
/** True for cd/m2 in any of its usual spellings. */
bool ef__unit_is_luminance(const char *text);

/* ---- One row (row.c) --------------------------------------------------- */

/** What a row says of itself beside its numbers. */
typedef struct ef__label {
  ef__span name;    /**< empty if it has none */
  double angle_deg; /**< NaN if it has none */
} ef__label;

/** Reads the numbers of the current row into value[n_values] and
 * device[n_device], and its label. */
ef_status ef__row_read(ef__table *table, const ef__layout *layout,
                       double *value, double *device, ef__label *label,
                       ef_error *error);

/** What the values of a file must keep to, and why. */
typedef struct ef__limits {
  ef_kind kind;
  bool kind_is_assumed;
  bool is_percent;     /**< surfaces: values become ratios as they are read */
  bool any_sign;       /**< functions: no limits at all */
  double largest_light; /**< long spectra: of the file; 0: take the row's */
  double device_max;
  bool device_max_is_assumed;
} ef__limits;

/** Checks one row read from `line`. */
ef_status ef__row_check(const ef__table *table, const ef__layout *layout,
                        const ef__limits *limits, size_t line,
                        const double *value, const double *device,
                        ef_error *error);

/* ---- Rows in memory (rows.c) ------------------------------------------- */

/** Some rows. Names are offsets until ef__rows_name_all, as their texts may
 * move while rows are added. */
typedef struct ef__rows {
  size_t width, n_device;
  bool has_angles;
  size_t n, room;
  double *value;     /**< room x width */
  double *device;    /**< room x n_device, NULL if none */
  double *angle_deg; /**< room, NULL if none */
  size_t *line, *offset;
  size_t *name_at;
  const char **name;
  char *texts;
  size_t texts_used, texts_room;
} ef__rows;

/** Room for `room` rows in all; what is there stays. */
ef_status ef__rows_reserve(ef__rows *rows, size_t room, ef_error *error);
/** Gives row `n` its line, offset and label and counts it; its values are in
 * place. */
ef_status ef__rows_add(ef__rows *rows, size_t line, size_t offset,
                       ef__label label, ef_error *error);
/** Moves row `from` to the lower place `to`. */
void ef__rows_move(ef__rows *rows, size_t from, size_t to);
/** Sets `name` from the offsets. */
void ef__rows_name_all(ef__rows *rows);
void ef__rows_clear(ef__rows *rows);

/** Smallest and largest of some values. */
typedef struct ef__range {
  double lowest, highest;
} ef__range;
ef__range ef__range_none(void);
void ef__range_add(ef__range *range, size_t n, const double *value);

/* ---- Reading ahead (ahead.c) ------------------------------------------- */

/** A thread beside the caller's. */
typedef struct ef__ahead ef__ahead;
/** NULL when no thread can be had. */
ef__ahead *ef__ahead_new(void (*work)(void *cookie), void *cookie);
/** Has the work done once. */
void ef__ahead_ask(ef__ahead *ahead);
/** Until the work that was asked for is done. */
void ef__ahead_wait(ef__ahead *ahead);
/** Waits as well; NULL is fine. */
void ef__ahead_free(ef__ahead *ahead);

/** Notes that are kept until those of earlier rows have been given. */
typedef struct ef__said {
  char *lines; /**< each with its terminator */
  size_t used, room;
} ef__said;

/* ---- The readers (reader.c, decide.c, long.c) -------------------------- */

struct ef_reader {
  ef__table table;
  ef__layout layout;
  ef_reader_settings settings;
  ef__limits limits;
  ef_reader_head head;
  ef__rows rows;
  double *wavelength_nm; /**< of long spectra */
  size_t next_row;       /**< of `rows`, the first not yet handed out */
  size_t n_rows_seen;    /**< data rows of the file so far, faulty ones too */
  size_t n_skipped;      /**< of the range */
  bool keeps_to_range;   /**< the first rows have decided what they do */
  bool source_ended;     /**< nothing more to be read */
  /** The rest is not touched while the next rows are read ahead. */
  size_t n_skipped_told; /**< up to the rows handed out */
  bool at_end;           /**< likewise */
  const ef_notes *told;  /**< of the caller, where settings.notes keeps them */
  ef__ahead *ahead;      /**< NULL: none */
  /** What is read ahead, and how that ended. */
  ef__rows next;
  size_t next_wanted;
  ef_status next_status;
  ef_error next_error;
  ef__said said;
  ef_notes kept;
  bool end_is_noted;
};

/** A row at fault, which begins at `offset`: with skip_bad it is noted and
 * counted, if it is of the range, and EF_OK comes back; else the fault goes to
 * `error`. */
ef_status ef__reader_fault(ef_reader *reader, size_t offset,
                           const ef_error *fault, ef_error *error);
/** Next row into value and device, passing over faulty ones as the settings
 * say; its range is checked when `with_limits`. */
ef_status ef__reader_row(ef_reader *reader, bool with_limits, double *value,
                         double *device, ef__label *label, bool *has_row,
                         ef_error *error);
/** Reads a long table whole and turns it into rows. */
ef_status ef__long_read(ef_reader *reader, ef_error *error);

/** What is known before any value: kind and device maximum as far as the
 * settings and the file say them. */
ef_status ef__decide_from_remarks(ef_reader *reader, ef_error *error);
/** Decides the rest from the first rows, with notes. */
void ef__decide_from_values(ef_reader *reader, size_t n_rows, ef__range value,
                            ef__range device);

/* ---- Pictures (png.c) ------------------------------------------------- */

/** Like ef_png_write_rows, into an output that goes on. */
ef_status ef__png_write_to(ef_output *output, size_t width, size_t height,
                           int bits, const ef_png_rows *rows,
                           const ef_png_tags *tags, ef_error *error);

/** Colours of 8 bits, in the encoding that the tags tell. */
enum { EF__PNG_COLOURS = 256 };
typedef struct ef__png_palette {
  size_t n;
  unsigned char rgb[EF__PNG_COLOURS][3];
} ef__png_palette;

/** A picture of few colours, whole or not at all: `index` holds height x width
 * places in the palette. */
ef_status ef__png_write_indexed(const char *path, bool overwrite, size_t width,
                                size_t height, const unsigned char *index,
                                const ef__png_palette *palette,
                                const ef_png_tags *tags, ef_error *error);

/* ---- Headers of spectral images (cube_header.c) ------------------------ */

/** A header, read and checked; owns what `head` points to, but for the names of
 * the files. */
typedef struct ef__cube_header {
  ef_cube_head head;
  char *description;
  void *block; /**< band, gain, offset and wavelengths */
} ef__cube_header;

/** Reads the text of a header, called `name` in messages. Clear in every case. */
ef_status ef__cube_header_read(const char *name, const char *text,
                               size_t length, const ef_notes *notes,
                               ef__cube_header *header, ef_error *error);
void ef__cube_header_clear(ef__cube_header *header);
/** Bytes of the values of all bands. */
size_t ef__cube_header_bytes(const ef_cube_head *head);

#endif
