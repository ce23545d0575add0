/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One row an option: its commands, its field, its range, its words. */
#include "option_rows.h"

#include <limits.h>
#include <math.h>

#include <evenfield/observer.h>

static const char *const kinds[] = {"surface", "light", NULL};
static const char *const units[] = {"energy", "quantal", NULL};
static const char *const dichromats[] = {"protanope", "deuteranope",
                                         "tritanope", NULL};
static const char *const planes[] = {"uv", "xy", "ab", "lc", NULL};
static const char *const match_planes[] = {"uv", "xy", "ab",
                                           "lc", "people", NULL};
static const char *const aims[] = {"colour", "spectrum", "lights", NULL};
static const char *const specular[] = {"included", "excluded", NULL};
static const char *const match_formats[] = {"text", "csv", "json", "cgats",
                                            NULL};
static const char *const difference_planes[] = {"ab", "lc", NULL};
static const char *const contrast_planes[] = {"lm", "opponent", NULL};
static const char *const formats[] = {"text", "csv", "json", NULL};
static const char *const figures[] = {"section", "projection", "ellipsoid",
                                      NULL};
static const char *const modulations[] = {"symmetric", "pulse", NULL};
static const char *const patterns[] = {"uniform", "disc",  "annulus",
                                       "grating", "gabor", NULL};
static const char *const time_courses[] = {"steady", "sinusoid", "square",
                                           NULL};
static const char *const dithers[] = {"none", "ordered", NULL};
static const char *const bases[] = {
    "formula",       "macadam-1942",    "n-step",     "lamp-colours",
    "luo-rigg-1986", "rit-dupont-1997", "huang-2012", NULL};

static const char *const models[] = {"gaussian", "logistic", "weibull",
                                     "detection", NULL};
static const char *const axes[] = {"linear", "log", NULL};
static const char *const interval_methods[] = {"profile", "bootstrap", NULL};

/* Every whole number up to this is a double. */
#define LARGEST_SEED 9007199254740991.0

#define FIELD(name) offsetof(command_options, name)
#define SEEING                                                                 \
  (COMMAND_DESCRIBE | COMMAND_MATCH | COMMAND_SWATCH | COMMAND_ELLIPSE)
#define REPORTING                                                              \
  (COMMAND_MATCH | COMMAND_COMPARE | COMMAND_ELLIPSE | COMMAND_ISOLATE |       \
   COMMAND_PANEL)
#define MATCHING (COMMAND_MATCH | COMMAND_SWATCH)
#define SHOWING (MATCHING | COMMAND_ISOLATE)
#define DIFFERING (MATCHING | THRESHOLDS)
#define THRESHOLDS (COMMAND_ELLIPSE | COMMAND_COMPARE)
#define READING (SEEING | COMMAND_COMPARE)
#define PEOPLE                                                                 \
  (COMMAND_MATCH | COMMAND_OBSERVER | COMMAND_COMPARE | COMMAND_ISOLATE)
#define EVERY                                                                  \
  (READING | COMMAND_TABLES | COMMAND_OBSERVER | COMMAND_ISOLATE |             \
   COMMAND_PANEL | COMMAND_PROFILE | COMMAND_IMAGE)
/* A display and the light on it. */
#define LIT (SHOWING | COMMAND_PROFILE | COMMAND_IMAGE)

static const option_row table[] = {
    {"change", "DIRECTION", COMMAND_ISOLATE, TYPE_TEXT, FIELD(change), 0, 0,
     NULL,
     "what is to change: receptors as in S, L,-M or L=0.1,mel=-0.2 (of L, M, "
     "S, rod, mel); luminance; \"isoluminant red-green\", \"isoluminant "
     "tritan\" or isoluminant:DEGREES (0 is red-green with L up, 90 tritan "
     "with S up); dkl:ACHROMATIC,RED-GREEN,TRITAN (one unit of each axis is a "
     "pooled cone contrast of 1); or macleod-boynton:L,S (steps of the "
     "chromaticity); default S"},
    {"silence", "LIST", COMMAND_ISOLATE, TYPE_TEXT, FIELD(silence), 0, 0, NULL,
     "receptors that must not change; default the cones that --change leaves "
     "out"},
    {"ignore", "LIST", COMMAND_ISOLATE, TYPE_TEXT, FIELD(ignore), 0, 0, NULL,
     "receptors that do not matter; default rod and mel, unless --change or "
     "--silence names them"},
    {"contrast", "C", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(contrast), 1e-9, 1e9,
     NULL,
     "how far to go along the direction: 0.2 with --change S changes S by "
     "20 %; default: as far as the display allows, and 1 where --change gives "
     "numbers"},
    {"background", "PLACE", COMMAND_ISOLATE, TYPE_TEXT, FIELD(background), 0, 0,
     NULL,
     "what the eye is adapted to: amounts of the primaries, shares of their "
     "light at full drive, as in 0.5,0.5,0.5 or 0.5 for all; drive:LIST or "
     "codes:LIST in front of the tone curve; largest (chosen for the largest "
     "contrast, no darker than half of full drive) or largest:SHARE; or "
     "metamer:LIST (the same L, M and S, chosen for the largest contrast); "
     "default 0.5"},
    {"modulation", "symmetric|pulse", COMMAND_ISOLATE, TYPE_CHOICE,
     FIELD(modulation), 0, 0, modulations,
     "symmetric: to both sides of the background; pulse: to one side; default "
     "symmetric"},
    {"luminance-weights", "L:M[:S]", COMMAND_ISOLATE, TYPE_TEXT,
     FIELD(luminance_weights), 0, 0, NULL,
     "what L, M and S count in this person's luminance, as flicker photometry "
     "gives them; only their ratios matter; default those of CIE 170-2"},
    {"robust", NULL, COMMAND_ISOLATE, TYPE_FLAG, FIELD(robust), 0, 0, NULL,
     "of all modulations of the wanted contrast the one that leaves least in "
     "the silent receptors of a population"},
    {"size-deg", "DEG", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(size_deg), 0, 120,
     NULL,
     "diameter of the field that changes, or of the disc that a grating is "
     "cut to (0: not cut); default 2"},
    {"frames", "DIR", COMMAND_ISOLATE, TYPE_TEXT, FIELD(frames), 0, 0, NULL,
     "a new folder for the frames to show (PNG in device codes, untagged), the "
     "inverse tone table and the record, stimulus.json"},
    {"replay", "FILE", COMMAND_ISOLATE, TYPE_TEXT, FIELD(replay), 0, 0, NULL,
     "makes the frames of a record, stimulus.json, once more, byte by byte, "
     "into the folder `frames` unless --frames names another"},
    {"waveform", "PATTERN", COMMAND_ISOLATE, TYPE_CHOICE, FIELD(pattern), 0, 0,
     patterns,
     "the form in space: uniform (the whole frame), disc, annulus, grating or "
     "gabor; default disc"},
    {"cycles-per-degree", "N", COMMAND_ISOLATE, TYPE_NUMBER,
     FIELD(cycles_per_deg), 1e-6, 1e6, NULL,
     "of a grating or gabor; default 2"},
    {"hole-deg", "DEG", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(hole_deg), 1e-6,
     179, NULL, "inner diameter of an annulus; default half of its size"},
    {"edge-deg", "DEG", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(edge_deg), 0, 179,
     NULL,
     "width of the raised-cosine edges; default 0.2, or a tenth of a size "
     "below 2"},
    {"sigma-deg", "DEG", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(sigma_deg), 1e-6,
     179, NULL,
     "standard deviation of a gabor's Gaussian; default a quarter of its size"},
    {"orientation-deg", "DEG", COMMAND_ISOLATE, TYPE_NUMBER,
     FIELD(orientation_deg), -360, 360, NULL,
     "direction in which a grating changes, anticlockwise from the right; "
     "default 0, upright bars"},
    {"phase-deg", "DEG", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(phase_deg), -360,
     360, NULL, "of a grating: 0, the default, has a peak in the middle"},
    {"drift-hz", "HZ", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(drift_hz), -1e6, 1e6,
     NULL, "cycles a second that a grating moves in its direction; default 0"},
    {"centre-deg", "X,Y", COMMAND_ISOLATE, TYPE_TEXT, FIELD(centre), 0, 0, NULL,
     "middle of the form, right of and above the middle of the frame; default "
     "0,0"},
    {"frame-size", "WxH", COMMAND_ISOLATE, TYPE_TEXT, FIELD(frame_size), 0, 0,
     NULL, "pixels of a frame; default 1920x1080"},
    {"distance-mm", "MM", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(distance_mm), 1,
     1e6, NULL, "from the eye to the screen; default 700"},
    {"pixels-per-mm", "N", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(pixels_per_mm),
     1e-3, 1e4, NULL, "of the screen; default 4"},
    {"time-course", "NAME", COMMAND_ISOLATE, TYPE_CHOICE, FIELD(time_course), 0,
     0, time_courses,
     "steady, sinusoid or square; default sinusoid with --hz, else steady"},
    {"hz", "HZ", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(frequency_hz), 1e-6, 1e6,
     NULL, "cycles a second of the time course"},
    {"time-phase-deg", "DEG", COMMAND_ISOLATE, TYPE_NUMBER,
     FIELD(time_phase_deg), -360, 360, NULL,
     "of the time course: 0, the default, starts a sinusoid at the background, "
     "rising, and a square up"},
    {"duty", "SHARE", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(duty), 1e-6, 0.999999,
     NULL, "share of its cycle that a square is up; default 0.5"},
    {"duration", "S", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(duration_s), 1e-6,
     1e5, NULL,
     "seconds of the frames; default 1 with --hz or --drift-hz, else a single "
     "frame that stands"},
    {"ramp", "S", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(ramp_s), 0, 1e5, NULL,
     "raised-cosine rise and fall at the ends, within the duration; default 0"},
    {"frame-rate", "HZ", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(frame_rate_hz),
     1e-3, 1e5, NULL, "frames a second of the display; default 60"},
    {"dither", "none|ordered", COMMAND_ISOLATE, TYPE_CHOICE, FIELD(dither), 0,
     0, dithers,
     "ordered: codes scatter over pixels and frames so that their mean is what "
     "was wanted; default none, codes that keep silent receptors quiet"},
    {"most-gb", "GB", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(most_gb), 1e-6, 1e6,
     NULL, "refuses frames that take more than that, uncompressed; default 4"},
    {"pupil", "MM|FORMULA", COMMAND_ISOLATE, TYPE_TEXT, FIELD(pupil), 0, 0,
     NULL,
     "the pupil's diameter in mm, or moon-spencer, stanley-davies, "
     "watson-yellott or watson-yellott:AGE; default watson-yellott"},
    {"exposure", "S", COMMAND_ISOLATE, TYPE_NUMBER, FIELD(exposure_s), 1e-6,
     1e6, NULL,
     "seconds that somebody looks at it in a day, for the blue-light caution; "
     "default 28800, eight hours"},
    {"at", "COLOUR", COMMAND_ELLIPSE, TYPE_TEXTS, FIELD(at), 0, 0, NULL,
     "a colour as lab:L,a,b, xyz:X,Y,Z, xyy:x,y,Y or xy:x,y, or three numbers "
     "alone, which are x,y,Y when the first two lie in 0 to 1 and L,a,b "
     "otherwise; may be given more than once"},
    {"pairs", "FILE", COMMAND_COMPARE, TYPE_TEXT, FIELD(pairs), 0, 0, NULL,
     "which samples are compared: CSV with the columns reference and sample, "
     "names of the one file or of the two"},
    {"space", "SPACE", COMMAND_ELLIPSE, TYPE_TEXT, FIELD(space), 0, 0, NULL,
     "the plane of the ellipses: xy, uv, lab (a*, b*), mb (MacLeod-Boynton), "
     "cone (contrasts of the L and S cones) or cone-lm (L and M); default xy"},
    {"figure", "section|projection|ellipsoid", COMMAND_ELLIPSE, TYPE_CHOICE,
     FIELD(figure), 0, 0, figures,
     "section: the colours of the same luminance; projection: the shadow of "
     "the whole ellipsoid, all colours it holds; ellipsoid: the section with "
     "the solid it is cut from; default section"},
    {"basis", "BASIS", COMMAND_ELLIPSE, TYPE_CHOICE, FIELD(basis), 0, 0, bases,
     "where the ellipses come from: formula (see --metric), macadam-1942 (the "
     "matching experiment, interpolated between its 25 centres), n-step (the "
     "circles of CIE TN 001), lamp-colours (the standard colours of "
     "fluorescent lamps, --at F4000), or experiments on surface colours, "
     "interpolated between their centres, which are all listed without --at "
     "and FILE: luo-rigg-1986, rit-dupont-1997 (ellipsoids) and huang-2012; "
     "default formula"},
    {"steps", "N", COMMAND_ELLIPSE, TYPE_NUMBER, FIELD(steps), 1e-6, 1e6, NULL,
     "how many just-noticeable differences, standard deviations "
     "(macadam-1942), steps or published sizes the ellipses are large; default "
     "1"},
    {"size", "VALUE", COMMAND_ELLIPSE, TYPE_NUMBER, FIELD(size), 1e-9, 1e6,
     NULL, "the size of the ellipses in units of the metric, instead of a JND"},
    {"contrast-from", "COLOUR", COMMAND_ELLIPSE, TYPE_TEXT,
     FIELD(contrast_from), 0, 0, NULL,
     "the background that cone contrasts are taken from, written like --at; "
     "default the white"},
    {"assume", "PROFILE", COMMAND_IMAGE, TYPE_TEXT, FIELD(assume), 0, 0, NULL,
     "what the samples of a picture stand for, a profile or a published "
     "encoding such as srgb; needed where it has no colour tags, and, but for "
     "compare, taken in the place of those it has"},
    {"check", NULL, COMMAND_IMAGE, TYPE_FLAG, FIELD(check), 0, 0, NULL,
     "exit with status 1 when a pixel is off by more than the tolerance"},
    {"display", "DISPLAY", COMMAND_IMAGE, TYPE_TEXT, FIELD(display), 0, 0, NULL,
     "a file with the spectra of the primaries at full drive or with measured "
     "rows (R,G,B and X,Y,Z or a spectrum), a published encoding such as "
     "bt709, or demo:NAME"},
    {"to", "ENCODING|xyz|lms", COMMAND_IMAGE, TYPE_TEXT, FIELD(to), 0, 0, NULL,
     "render: the published encoding of a picture, xyz, or lms, the "
     "observer's cone excitations; default srgb for pictures, else xyz"},
    {"data", "FILE", COMMAND_IMAGE, TYPE_TEXT, FIELD(data), 0, 0, NULL,
     "render: the file with the values of the spectral image; default: the one "
     "beside its header"},
    {"observer", "OBSERVER", COMMAND_IMAGE, TYPE_TEXT, FIELD(observer), 0, 0,
     NULL,
     "render: who looks: a name from `evenfield observer list`, with settings "
     "as in model:age=45,field=4, or a file with three colour-matching "
     "functions; default cie-1931"},
    {"illuminant", "LIGHT", COMMAND_IMAGE, TYPE_TEXT, FIELD(illuminant), 0, 0,
     NULL,
     "render: the light on surfaces: a name from `evenfield tables "
     "illuminants`, daylight:K, planck:K, FILE or FILE:COLUMN; default D65"},
    {"adaptation", "NAME", COMMAND_IMAGE, TYPE_TEXT, FIELD(adaptation), 0, 0,
     NULL,
     "render: from that light to the white of the encoding: cat16, bradford or "
     "none; default cat16"},
    {"white-level", "Y", COMMAND_IMAGE, TYPE_NUMBER, FIELD(white_level), 1e-12,
     1e12, NULL,
     "render: the Y that a picture shows as its white; default 100 for "
     "surfaces, for lights the largest of all pixels, which a first pass finds"},
    {"bits", "8|16", COMMAND_IMAGE, TYPE_INTEGER, FIELD(swatch_bits), 8, 16,
     NULL, "render: bits per channel of a picture; default 8"},
    {"from", "PROFILE", COMMAND_PROFILE, TYPE_TEXT, FIELD(from), 0, 0, NULL,
     "convert: the profile that the device values belong to, a file or a "
     "published encoding such as srgb; default: the file holds colours"},
    {"to", "PROFILE|xyz|lab", COMMAND_PROFILE, TYPE_TEXT, FIELD(to), 0, 0, NULL,
     "convert: the profile to convert to, a file or a published encoding, or "
     "X, Y, Z or L*, a*, b* under D50"},
    {"intent", "INTENT", COMMAND_PROFILE, TYPE_TEXT, FIELD(intent), 0, 0, NULL,
     "check, convert: perceptual, relative, saturation or absolute; default "
     "relative"},
    {"scale-black", NULL, COMMAND_PROFILE, TYPE_FLAG, FIELD(scale_black), 0, 0,
     NULL,
     "check, convert: scale lightness so that the darkest colour of one side "
     "goes to that of the other (black point compensation)"},
    {"description", "TEXT", COMMAND_PROFILE, TYPE_TEXT, FIELD(description), 0,
     0, NULL,
     "make: what the profile calls itself; default: the title of the "
     "display's file"},
    {"display", "DISPLAY", COMMAND_PROFILE, TYPE_TEXT, FIELD(display), 0, 0,
     NULL,
     "make: a file with the spectra of the primaries at full drive or with "
     "measured rows (R,G,B and X,Y,Z or a spectrum), a published encoding such "
     "as bt709, or demo:NAME"},
    {"illuminant", "LIGHT", COMMAND_PROFILE, TYPE_TEXT, FIELD(illuminant), 0, 0,
     NULL,
     "convert: the white of the file's colours and the light on its surfaces, "
     "a name from `evenfield tables illuminants`, daylight:K, planck:K, FILE "
     "or FILE:COLUMN; default D50"},
    {"adaptation", "NAME", COMMAND_PROFILE, TYPE_TEXT, FIELD(adaptation), 0, 0,
     NULL,
     "convert: from that white to D50: cat16, bradford or none; default "
     "bradford"},
    {"check", NULL, COMMAND_PROFILE, TYPE_FLAG, FIELD(check), 0, 0, NULL,
     "exit with status 1 when a colour is off by more than the tolerance, or "
     "the profile lacks a required tag"},
    {"display", "DISPLAY", MATCHING, TYPE_TEXT, FIELD(display), 0, 0, NULL,
     "a file with the spectra of the primaries at full drive or with measured "
     "rows (R,G,B and X,Y,Z or a spectrum), a published encoding such as "
     "bt709, or demo:NAME; default demo:kiosk-measurements"},
    {"display", "DISPLAY", COMMAND_ISOLATE, TYPE_TEXT, FIELD(display), 0, 0,
     NULL,
     "a file with the spectra of 3 to 8 primaries at full drive, or with "
     "measured rows (R,G,B and a spectrum), or demo:NAME; default "
     "demo:lab-display"},
    {"tone", "CURVE", LIT, TYPE_TEXT, FIELD(tone), 0, 0, NULL,
     "from drive to light: linear, power:G, iec61966-2-1, or a file with "
     "measured ramps; default: what the display's file or encoding says"},
    {"profile", "PROFILE", MATCHING, TYPE_TEXT, FIELD(profile), 0, 0, NULL,
     "any device in the place of a display, as its ICC profile describes it: an "
     "RGB, CMY or CMYK profile, a file or a published encoding"},
    {"intent", "INTENT", MATCHING, TYPE_TEXT, FIELD(intent), 0, 0, NULL,
     "of --profile: perceptual, relative, saturation or absolute; default "
     "relative"},
    {"scale-black", NULL, MATCHING, TYPE_FLAG, FIELD(scale_black), 0, 0, NULL,
     "of --profile: scale lightness so that its darkest colour counts as black "
     "(black point compensation)"},
    {"inks", "FILE", MATCHING, TYPE_TEXT, FIELD(inks), 0, 0, NULL,
     "a three-ink press in the place of a display: its characterisation, rows "
     "of C,M,Y and X,Y,Z, L,a,b or a spectrum, with the eight full overprints "
     "and a ramp of each ink among them; demo:leaflet-press is one"},
    {"colourants", "FILE", MATCHING, TYPE_TEXT, FIELD(colourants), 0, 0, NULL,
     "colourants to mix in the place of a display: spectra of their absorption "
     "and scattering, NAME_k and NAME_s (or NAME_ks, of single-constant "
     "theory), or with --weighed the reflectances of drawdowns; "
     "demo:livery-colourants is one"},
    {"weighed", "FILE", MATCHING, TYPE_TEXT, FIELD(weighed), 0, 0, NULL,
     "of what the drawdowns of --colourants were mixed: a line for each "
     "colourant in each sample with the columns sample, colourant and parts, "
     "and for films thickness and over, the sample that lies under it"},
    {"single-constant", NULL, MATCHING, TYPE_FLAG, FIELD(single_constant), 0, 0,
     NULL, "fits one constant, K/S, to the drawdowns of each colourant"},
    {"base", "NAME", MATCHING, TYPE_TEXT, FIELD(base), 0, 0, NULL,
     "the colourant that is the rest of every mixture, or none; default the "
     "first of the file"},
    {"use", "NAMES", MATCHING, TYPE_TEXT, FIELD(use), 0, 0, NULL,
     "the colourants to mix with the base, such as red,yellow,blue; default "
     "all of the file"},
    {"total-loading", "PERCENT", MATCHING, TYPE_NUMBER, FIELD(total_loading),
     0.01, 1e6, NULL,
     "the most that all but the base may be of a mixture; default 100"},
    {"film", "THICKNESS", MATCHING, TYPE_NUMBER, FIELD(film), 1e-9, 1e9, NULL,
     "thickness of the film, in the unit of the drawdowns or of absorption and "
     "scattering; goes with --substrate; default opaque"},
    {"substrate", "FILE", MATCHING, TYPE_TEXT, FIELD(substrate), 0, 0, NULL,
     "reflectance of what the film lies on: FILE, or FILE:SAMPLE of several"},
    {"refractive-index", "N", MATCHING, TYPE_NUMBER, FIELD(refractive_index), 1,
     3, NULL,
     "of the binder: what its surface reflects is then taken into account "
     "(Saunderson); default: no surface"},
    {"specular", "included|excluded", MATCHING, TYPE_CHOICE, FIELD(specular), 0,
     0, specular,
     "whether the instrument sees what the surface reflects; goes with "
     "--refractive-index; default excluded"},
    {"aim", "colour|spectrum|lights", MATCHING, TYPE_CHOICE, FIELD(aim), 0, 0,
     aims,
     "what a recipe makes least: the difference in the first light, what is to "
     "be expected in any light by the spectra, or the differences in all lights "
     "alike; default colour"},
    {"batch-g", "GRAMS", MATCHING, TYPE_NUMBER, FIELD(batch_g), 1e-6, 1e12,
     NULL, "weight of the batch: recipes are told in grams"},
    {"step-g", "GRAMS", MATCHING, TYPE_NUMBER, FIELD(step_g), 1e-9, 1e12, NULL,
     "what the scales tell apart: the best recipe of whole steps is sought; "
     "goes with --batch-g"},
    {"bits", "N", COMMAND_ISOLATE, TYPE_INTEGER, FIELD(bits), 1, 16, NULL,
     "bits of a code value, 1 to 16; default 8"},
    {"bits", "N", MATCHING, TYPE_INTEGER, FIELD(match_bits), 1, 16, NULL,
     "bits of a code value, 1 to 16; default 8, and --step for inks"},
    {"step", "PERCENT", MATCHING, TYPE_NUMBER, FIELD(step_percent), 0.01, 100,
     NULL,
     "ink values are multiples of this: 100 over a whole number, such as 5, 1 "
     "or 0.5; default 1"},
    {"yule-nielsen", "N", MATCHING, TYPE_NUMBER, FIELD(yule_nielsen), 1, 10,
     NULL,
     "Yule-Nielsen factor of the print, 1 to 10; default: fitted to the ramps"},
    {"black", "PERCENT", MATCHING, TYPE_NUMBER, FIELD(black_percent), 0, 100,
     NULL,
     "the black of --inks with four inks or of a CMYK --profile, which stays "
     "fixed; default 0, and rows with black are left out"},
    {"ambient", "LUX", LIT, TYPE_NUMBER, FIELD(ambient_lux), 0, 1e6, NULL,
     "illuminance on the screen; default 0, a dark room"},
    {"reflectance", "R", LIT, TYPE_NUMBER, FIELD(reflectance), 0, 1, NULL,
     "diffuse reflectance of the screen, 0 to 1; goes with --ambient"},
    {"ambient-illuminant", "LIGHT", LIT, TYPE_TEXT,
     FIELD(ambient_illuminant), 0, 0, NULL,
     "what falls on the screen, named like --illuminant; default D65"},
    {"luminance", "CD", MATCHING, TYPE_NUMBER, FIELD(luminance_cd_m2), 1e-6,
     1e9, NULL,
     "luminance of the display's white in cd/m2; X,Y,Z and x,y,Y targets are "
     "then in cd/m2 too"},
    {"observer", "OBSERVER", SEEING, TYPE_TEXT, FIELD(observer), 0, 0, NULL,
     "who looks: a name from `evenfield observer list`, with settings as in "
     "model:age=45,field=4, or a file with three colour-matching functions; "
     "default cie-1931"},
    {"observer", "OBSERVER", COMMAND_ISOLATE, TYPE_TEXT, FIELD(observer), 0, 0,
     NULL,
     "whose cones: a name from `evenfield observer list`, with settings as in "
     "model:age=45,field=10; default cie-2015-2"},
    {"illuminant", "LIGHT", SEEING & ~(unsigned)MATCHING, TYPE_TEXT,
     FIELD(illuminant), 0, 0, NULL,
     "the light on surfaces and the white of colours: a name from `evenfield "
     "tables illuminants`, daylight:K, planck:K, FILE or FILE:COLUMN; default "
     "D65"},
    {"illuminant", "LIGHT", MATCHING, TYPE_TEXTS, FIELD(lights), 0, 0, NULL,
     "the light on surfaces and the white of colours: a name from `evenfield "
     "tables illuminants`, daylight:K, planck:K, FILE or FILE:COLUMN; default "
     "D65, with --inks D50. For --inks and --colourants it may be given more "
     "than once: the match is made in the first, and told in the others, A, "
     "FL11 and LED-B3 unless it is given"},
    {"illuminant", "LIGHT", COMMAND_COMPARE, TYPE_TEXTS, FIELD(lights), 0, 0,
     NULL,
     "a light on the samples: a name from `evenfield tables illuminants`, "
     "daylight:K, planck:K, FILE or FILE:COLUMN; may be given more than once, "
     "the first being the one in which a pair should match; default D65, A, "
     "FL11 (a fluorescent lamp of shops) and LED-B3 (a neutral white LED)"},
    {"observer", "OBSERVER", COMMAND_COMPARE, TYPE_TEXTS, FIELD(observers), 0,
     0, NULL,
     "who looks: a name from `evenfield observer list`, with settings as in "
     "model:age=45,field=4, or a file with three colour-matching functions; "
     "may be given more than once; default cie-1931"},
    {"kind", "surface|light", READING | COMMAND_PROFILE | COMMAND_IMAGE, TYPE_CHOICE, FIELD(kind), 0, 0, kinds,
     "what the spectra in the files are; default: what the file says"},
    {"adaptation", "NAME", COMMAND_COMPARE, TYPE_TEXT, FIELD(adaptation), 0, 0,
     NULL,
     "from one light to another, for colour inconstancy: cat16, bradford or "
     "none; default cat16"},
    {"adaptation", "NAME", MATCHING, TYPE_TEXT, FIELD(adaptation), 0, 0, NULL,
     "from the targets' white to the display's: cat16, bradford or none; "
     "default cat16, none for lights and for targets in cd/m2"},
    {"metric", "NAME", DIFFERING | COMMAND_PROFILE | COMMAND_IMAGE, TYPE_TEXT, FIELD(metric), 0, 0, NULL,
     "how differences are measured, a name from `evenfield tables metrics`, "
     "with parameters as in ciede2000:kl=2; default ciede2000"},
    {"jnd", "VALUE|FILE", THRESHOLDS, TYPE_TEXT, FIELD(jnd_text), 0, 0, NULL,
     "the difference that is just noticed: a number in units of the metric, "
     "NUMBER:CRITERION where it was not taken at 75 % right answers of two "
     "intervals, or a file with a panel's JND; default: the published one of "
     "the metric"},
    {"criterion", "CRITERION", THRESHOLDS, TYPE_TEXT, FIELD(criterion), 0, 0,
     NULL,
     "the answers at which a difference counts as noticed: 50%, 75%, 84%, "
     "d-prime:N, or a task with its share as in triangle:60%; the JND is "
     "converted to it"},
    {"exponent", "BETA", THRESHOLDS, TYPE_NUMBER, FIELD(exponent), 0.1, 10,
     NULL,
     "the power of the difference that d' grows with; default 1, or what the "
     "file of the JND says"},
    {"spread", "SD", COMMAND_COMPARE | COMMAND_IMAGE, TYPE_NUMBER, FIELD(spread), 0, 3, NULL,
     "how JNDs differ from person to person: the standard deviation of their "
     "natural logarithm; default 0.28, or what the file of the JND says"},
    {"jnd", "VALUE", MATCHING | COMMAND_PROFILE | COMMAND_IMAGE, TYPE_NUMBER, FIELD(jnd), 1e-6, 1e6, NULL,
     "the difference that is just noticed, in units of the metric; default: "
     "the published one of the metric"},
    {"white-luminance", "CD", THRESHOLDS, TYPE_NUMBER, FIELD(white_cd_m2), 1e-6,
     1e9, NULL,
     "luminance of the white the eye is adapted to, in cd/m2, for cam02-ucs, "
     "cam16-ucs, itp and colours in cd/m2; default 318, a perfect diffuser "
     "under 1000 lx"},
    {"background", "Y", THRESHOLDS, TYPE_NUMBER, FIELD(background_Y), 1e-3, 100,
     NULL,
     "luminance of the background in percent of the white's, for cam02-ucs and "
     "cam16-ucs; default 20"},
    {"surround", "NAME", THRESHOLDS, TYPE_TEXT, FIELD(surround), 0, 0, NULL,
     "average, dim or dark, for cam02-ucs and cam16-ucs; default average"},
    {"task", "TASK", COMMAND_COMPARE, TYPE_TEXT, FIELD(task), 0, 0, NULL,
     "whose share of right answers is the proportion_correct of csv and json: "
     "2ifc, same-different or triangle; default 2ifc; all three are always "
     "given"},
    {"batch-sd", "VALUE", COMMAND_COMPARE, TYPE_NUMBER, FIELD(batch_sd), 0, 1e6,
     NULL,
     "how far pieces of a batch scatter about the one measured, a standard "
     "deviation in units of the metric; default 0"},
    {"samples", "N", COMMAND_COMPARE, TYPE_WHOLE, FIELD(samples), 0, 1e7, NULL,
     "draws behind an interval, 0 for first order; default 10000, and first "
     "order where the uncertainty is small"},
    {"correction", "NAME", COMMAND_COMPARE, TYPE_TEXT, FIELD(correction), 0, 0,
     NULL,
     "how a difference in the first light is taken out of the index of "
     "metamerism: multiplicative, additive, spectral or none; default "
     "multiplicative"},
    {"worst-case", NULL, COMMAND_COMPARE, TYPE_FLAG, FIELD(worst_case), 0, 0,
     NULL,
     "also tells how far any surface that matches the standard in the first "
     "light may part from it in the others; text and json only"},
    {"boundary", "PATH", COMMAND_COMPARE, TYPE_TEXT, FIELD(boundary), 0, 0,
     NULL,
     "--worst-case, with points all over the boundary of the colours that such "
     "surfaces take in each other light: a file of X, Y, Z and L*, a*, b* as "
     "csv, or as json with the triangles between them if PATH ends in .json"},
    {"grade-simulators", NULL, COMMAND_COMPARE, TYPE_FLAG,
     FIELD(grade_simulators), 0, 0, NULL,
     "the pairs are the virtual metamers of ISO/CIE 23603 for the first light: "
     "grades the others as simulators of it; needs --metric cielab and "
     "--observer cie-1964"},
    {"angle-weights", "LIST", COMMAND_COMPARE, TYPE_TEXT, FIELD(angle_weights),
     0, 0, NULL,
     "weights of measuring angles in the total of a finish, such as "
     "15:2,45:1; default 1 each"},
    {"check", NULL, COMMAND_COMPARE, TYPE_FLAG, FIELD(check), 0, 0, NULL,
     "exit with status 1 when a pair is not within the tolerance in every "
     "light, or could not be computed"},
    {"tolerance", "VALUE", COMMAND_COMPARE, TYPE_TEXT, FIELD(tolerance_text), 0,
     0, NULL,
     "the largest difference that passes, in units of the metric, or "
     "FORMULA:VALUE; default one JND"},
    {"check", NULL, COMMAND_MATCH, TYPE_FLAG, FIELD(check), 0, 0, NULL,
     "exit with status 1 when a target's difference exceeds the tolerance"},
    {"tolerance", "VALUE", COMMAND_MATCH | COMMAND_PROFILE | COMMAND_IMAGE, TYPE_NUMBER, FIELD(tolerance), 0, 1e6,
     NULL, "for --check, in units of the metric; default one JND"},
    {"population", "N", COMMAND_OBSERVER, TYPE_WHOLE, FIELD(population), 1,
     EF_POPULATION_MOST, NULL,
     "how many people --categories chooses from, at most 100000; default "
     "10000"},
    {"population", "N", COMMAND_MATCH, TYPE_WHOLE, FIELD(population), 1,
     EF_POPULATION_MOST, NULL,
     "what N people would see, drawn at random by age and by how eyes vary; "
     "needs spectra of display and targets"},
    {"population", "N", COMMAND_COMPARE, TYPE_WHOLE, FIELD(population), 1,
     EF_POPULATION_MOST, NULL,
     "who would tell pairs apart of N people, drawn at random by age and by "
     "how "
     "eyes vary, each with a JND of their own; needs spectra"},
    {"population", "N", COMMAND_ISOLATE, TYPE_WHOLE, FIELD(population), 1,
     EF_POPULATION_MOST, NULL,
     "what N people get in the receptors that should be silent, drawn at "
     "random by age and by how eyes vary; default 500 with --robust"},
    {"ages", "FROM-TO|FILE", PEOPLE, TYPE_TEXT, FIELD(ages), 0, 0, NULL,
     "their ages, 20 to 80 years: evenly from FROM to TO, all of one AGE, or a "
     "CSV file with columns age and share; default 20-70"},
    {"seed", "N", PEOPLE, TYPE_WHOLE, FIELD(seed), 0, LARGEST_SEED, NULL,
     "chooses which people are drawn; the same N gives the same people; "
     "default 1"},
    {"field", "DEG", PEOPLE, TYPE_NUMBER, FIELD(field_deg), 1, 10, NULL,
     "diameter of the field they look at, 1 to 10 degrees; default that of the "
     "observer"},
    {"categories", "K", COMMAND_OBSERVER, TYPE_INTEGER, FIELD(categories), 1,
     100, NULL, "the K observers that stand best for a population"},
    {"categories", "K", COMMAND_MATCH, TYPE_INTEGER, FIELD(categories), 1, 100,
     NULL,
     "asks only the K observers that stand best for the population, each with "
     "the share it stands for; of 10000 people unless --population says "
     "otherwise"},
    {"units", "energy|quantal", COMMAND_OBSERVER, TYPE_CHOICE, FIELD(units), 0,
     0, units,
     "cone fundamentals for equal power or for equal numbers of quanta at each "
     "wavelength; default energy"},
    {"seen-by", "DICHROMAT", MATCHING, TYPE_CHOICE, FIELD(seen_by), 0, 0,
     dichromats,
     "draws the pictures as a protanope, deuteranope or tritanope is taken to "
     "see them"},
    {"pictures", "DIR", MATCHING, TYPE_TEXT, FIELD(pictures), 0, 0, NULL,
     "the folder for a split field of every target and a sheet of all (PNG)"},
    {"swatch-bits", "8|16", MATCHING, TYPE_INTEGER, FIELD(swatch_bits), 8, 16,
     NULL, "bits per channel of the pictures; default 8"},
    {"report", "FILE.html", REPORTING, TYPE_TEXT, FIELD(report), 0, 0, NULL,
     "writes the answer with pictures, charts, tables and all it rests on as "
     "one page for a browser or for paper"},
    {"chart", "FILE", COMMAND_ISOLATE, TYPE_TEXT, FIELD(chart), 0, 0, NULL,
     "draws the spectra of the background and of the extremes, as the codes "
     "show them, or with --plane the contrasts: FILE.svg, FILE.pdf or FILE.png"},
    {"chart", "FILE", COMMAND_MATCH, TYPE_TEXT, FIELD(chart), 0, 0, NULL,
     "draws the targets and what is shown for them, with the gamut: FILE ends "
     "in .svg, .pdf or .png"},
    {"chart", "FILE", COMMAND_COMPARE, TYPE_TEXT, FIELD(chart), 0, 0, NULL,
     "draws how the samples differ from their standard in each light: FILE "
     "ends in .svg, .pdf or .png"},
    {"chart", "FILE", COMMAND_ELLIPSE, TYPE_TEXT, FIELD(chart), 0, 0, NULL,
     "draws the ellipses in their plane: FILE ends in .svg, .pdf or .png"},
    {"chart", "FILE", COMMAND_DESCRIBE, TYPE_TEXT, FIELD(chart), 0, 0, NULL,
     "draws where the colours lie: FILE ends in .svg, .pdf or .png"},
    {"chart", "FILE", COMMAND_PANEL, TYPE_TEXT, FIELD(chart), 0, 0, NULL,
     "draws the answers and the curve of all observers (fit, calibrate), the "
     "thresholds that are possible (next), or the precision or power that more "
     "trials bring (plan): FILE ends in .svg, .pdf or .png"},
    {"plane", "uv|xy|ab|lc|people", COMMAND_MATCH, TYPE_CHOICE, FIELD(plane), 0,
     0, match_planes,
     "the plane of the chart: u', v'; x, y; a*, b*; C*, L*; or, with "
     "--population, how what is shown differs from the target for each of the "
     "people; default uv"},
    {"lightness", "L", COMMAND_MATCH, TYPE_NUMBER, FIELD(lightness), 0, 100,
     NULL,
     "the chart shows a*, b* of a section through the gamut at L* = L, and the "
     "targets within 5 of it"},
    {"plane", "uv|xy|ab|lc", COMMAND_DESCRIBE, TYPE_CHOICE, FIELD(plane), 0, 0,
     planes,
     "the plane of the chart: u', v'; x, y; a*, b*; or C*, L*; default uv"},
    {"plane", "ab|lc", COMMAND_COMPARE, TYPE_CHOICE, FIELD(plane), 0, 0,
     difference_planes, "the plane of the chart: a*, b* or C*, L*; default ab"},
    {"plane", "lm|opponent", COMMAND_ISOLATE, TYPE_CHOICE, FIELD(plane), 0, 0,
     contrast_planes,
     "draws contrasts instead of spectra: of L and M, or those that red-green "
     "and tritan mechanisms get"},
    {"magnification", "N", COMMAND_ELLIPSE, TYPE_NUMBER, FIELD(magnification),
     1e-6, 1e6, NULL,
     "how many times as large the chart draws the ellipses; default 1 of one "
     "alone, else as it takes to see them"},
    {"device-max", "VALUE", LIT, TYPE_NUMBER, FIELD(device_max), 1e-6, 1e9,
     NULL, "device value of full drive in the files; default: what they say"},
    {"task", "TASK", COMMAND_PANEL, TYPE_TEXT, FIELD(task), 0, 0, NULL,
     "what observers are asked: yes-no, 2ifc (in which of two is it?), "
     "same-different, triangle (which of three is odd?) or greater-less; "
     "default: the column task of the answers"},
    {"model", "MODEL", COMMAND_PANEL, TYPE_CHOICE, FIELD(model), 0, 0, models,
     "the curve: gaussian, logistic, weibull, or detection, in which d' grows "
     "with a power of the level; default weibull for 2ifc and triangle, "
     "detection for yes-no and same-different with trials at level 0, else "
     "gaussian"},
    {"axis", "linear|log", COMMAND_PANEL, TYPE_CHOICE, FIELD(axis), 0, 0, axes,
     "whether the curve is one of the level or of its logarithm; a level of 0 "
     "on a logarithmic axis shows nothing; default log for weibull and "
     "detection, else linear"},
    {"lapse", "SHARE", COMMAND_PANEL, TYPE_NUMBER, FIELD(lapse), 0, 0.5, NULL,
     "fixes the share of answers given without looking, 0 for none; default: "
     "estimated, up to 0.06. next: up to twice that is held possible; "
     "default 0.03. plan: that of the simulated observers, up to 0.06; "
     "default 0.01"},
    {"criterion", "SHARE", COMMAND_PANEL, TYPE_TEXT, FIELD(criterion), 0, 0,
     NULL,
     "fit, next: where the threshold is taken, as a share of positive answers (75%, "
     "0.84) or d-prime:N; default: the JND, or half of the way"},
    {"intervals", "profile|bootstrap", COMMAND_PANEL, TYPE_CHOICE,
     FIELD(intervals), 0, 0, interval_methods,
     "fit: intervals by profile likelihood or by refitting simulated answers; "
     "default profile"},
    {"samples", "N", COMMAND_PANEL, TYPE_WHOLE, FIELD(samples), 0, 1e7, NULL,
     "fit: simulated experiments behind p and the bootstrap, 0 for the "
     "chi-square distribution; default 2000. plan: experiments behind each "
     "row; default 400"},
    {"seed", "N", COMMAND_PANEL, TYPE_WHOLE, FIELD(seed), 0, LARGEST_SEED, NULL,
     "of all simulated answers; the same N gives the same; default 1"},
    {"exponent", "BETA|fitted", COMMAND_PANEL, TYPE_TEXT, FIELD(exponent_text),
     0, 0, NULL,
     "calibrate: the power of the difference that d' grows with; default 1"},
    {"levels", "N|FILE", COMMAND_PANEL, TYPE_TEXT, FIELD(levels), 0, 0, NULL,
     "next: the levels in hand, CSV with the columns level and, where pairs "
     "have names, name; default those of the answers. plan: how many constant "
     "levels are shown; default 7"},
    {"precision", "SHARE", COMMAND_PANEL, TYPE_NUMBER, FIELD(precision), 0.001,
     2, NULL,
     "next, plan: half of the 95 % interval that is wanted, as a share of the "
     "JND; default 0.1"},
    {"most", "N", COMMAND_PANEL, TYPE_WHOLE, FIELD(most), 1, 1e9, NULL,
     "next: an observer is done after N trials in any case"},
    {"expected-jnd", "VALUE", COMMAND_PANEL, TYPE_NUMBER, FIELD(expected_jnd),
     1e-9, 1e9, NULL, "plan: the JND to expect"},
    {"other-jnd", "VALUE", COMMAND_PANEL, TYPE_NUMBER, FIELD(other_jnd), 1e-9,
     1e9, NULL, "plan: a JND that is to be told from it, for the power"},
    {"spread", "SD", COMMAND_PANEL, TYPE_NUMBER, FIELD(spread), 0, 3, NULL,
     "plan: how JNDs differ from person to person, the standard deviation of "
     "their natural logarithm; default 0.3"},
    {"false-alarms", "SHARE", COMMAND_PANEL, TYPE_NUMBER, FIELD(false_alarms),
     0.001, 0.89, NULL,
     "next, plan: share of \"yes\" or \"different\" where there is nothing; "
     "default: next: that of the answers to level 0; plan: 0.1"},
    {"save", "FILE", COMMAND_PANEL, TYPE_TEXT, FIELD(save), 0, 0, NULL,
     "calibrate: also writes the panel's JND where `evenfield compare --jnd "
     "FILE` finds it"},
    {"pairs", "FILE", COMMAND_PANEL, TYPE_TEXT, FIELD(pairs), 0, 0, NULL,
     "calibrate: the pairs that answers name: CSV with the column pair and the "
     "colours reference_L, reference_a, reference_b, sample_L, sample_a, "
     "sample_b (or X, Y, Z likewise), or with reference and sample, names of "
     "rows of SAMPLES"},
    {"metric", "NAME", COMMAND_PANEL, TYPE_TEXT, FIELD(metric), 0, 0, NULL,
     "calibrate: how differences are measured, a name from `evenfield tables "
     "metrics`, with parameters as in ciede2000:kl=2; default ciede2000"},
    {"observer", "OBSERVER", COMMAND_PANEL, TYPE_TEXT, FIELD(observer), 0, 0,
     NULL,
     "calibrate: for spectra, the colour-matching functions; flicker: the cone "
     "fundamentals; a name from `evenfield observer list` or a file; default "
     "cie-1931, and cie-2015-2 for flicker"},
    {"illuminant", "LIGHT", COMMAND_PANEL, TYPE_TEXT, FIELD(illuminant), 0, 0,
     NULL,
     "calibrate: the light on the samples and the white of their colours, a "
     "name from `evenfield tables illuminants`, daylight:K, planck:K, FILE or "
     "FILE:COLUMN; default D65"},
    {"jobs", "N", COMMAND_PANEL, TYPE_INTEGER, FIELD(jobs), 0, 4096, NULL,
     "threads to use; default 0, one for each core; changes no result"},
    {"skip-bad", NULL, READING | COMMAND_PROFILE, TYPE_FLAG, FIELD(skip_bad), 0, 0, NULL,
     "leave out rows that are at fault, and count them"},
    {"part", "K/N", COMMAND_DESCRIBE | COMMAND_MATCH | COMMAND_COMPARE,
     TYPE_TEXT, FIELD(part), 0, 0, NULL,
     "answer the rows of part K of N only, with --format csv: joined in their "
     "order the parts are the whole answer, byte by byte"},
    {"jobs", "N", READING | COMMAND_OBSERVER | COMMAND_ISOLATE | COMMAND_PROFILE | COMMAND_IMAGE, TYPE_INTEGER,
     FIELD(jobs), 0, 4096, NULL,
     "threads to use; default 0, one for each core; changes no result"},
    {"format", "text|csv|json", COMMAND_OBSERVER, TYPE_CHOICE, FIELD(format), 0,
     0, formats,
     "text for people, csv and json for programs; default csv of build, text "
     "of list"},
    {"format", "text|csv|json|cgats", COMMAND_MATCH, TYPE_CHOICE, FIELD(format),
     0, 0, match_formats,
     "text for people, csv and json for programs; cgats: the values to show or "
     "print and their colours in the text form of CGATS.17 (ISO 28178); "
     "default text"},
    {"format", "text|csv|json|cgats", COMMAND_PROFILE, TYPE_CHOICE,
     FIELD(format), 0, 0, match_formats,
     "text for people, csv and json for programs; cgats: converted colours in "
     "the text form of CGATS.17 (ISO 28178); default text"},
    {"format", "text|csv|json",
     EVERY & ~(unsigned)(COMMAND_OBSERVER | COMMAND_MATCH | COMMAND_PROFILE),
     TYPE_CHOICE, FIELD(format), 0, 0, formats,
     "text for people, csv and json for programs; default text"},
    {"output", "PATH", EVERY, TYPE_TEXT, FIELD(output), 0, 0, NULL,
     "the file for the result; default standard output"},
    {"force", NULL, EVERY, TYPE_FLAG, FIELD(force), 0, 0, NULL,
     "overwrite files that are there"},
    {"quiet", NULL, EVERY, TYPE_FLAG, FIELD(quiet), 0, 0, NULL,
     "no notes and no progress on standard error"},
    {"help", NULL, EVERY, TYPE_FLAG, FIELD(help), 0, 0, NULL, "this text"},
    {"version", NULL, EVERY, TYPE_FLAG, FIELD(version), 0, 0, NULL,
     "the version of Evenfield"},
};
_Static_assert(sizeof table / sizeof table[0] <= MOST_OPTIONS,
               "MOST_OPTIONS is too small");

size_t option_rows(const option_row **rows) {
  *rows = table;
  return sizeof table / sizeof table[0];
}
