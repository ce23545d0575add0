/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "command.h"

#include <string.h>

static const command_entry table[] = {
    {"describe",
     COMMAND_DESCRIBE,
     "FILE...",
     "what a spectrum or a colour is, in the numbers of the trade",
     {"Colorimetry of every spectrum or colour in the files: tristimulus "
      "values, chromaticity, CIELAB, cone excitations; for surfaces whiteness, "
      "tint and yellowness under D65, C and D50 (observers cie-1931 and "
      "cie-1964); for lights colour temperature, colour rendering and "
      "luminance.",
      "A FILE is CSV: wavelength_nm and a column for each spectrum, or a row "
      "for each spectrum with columns named by wavelength, or colours as L,a,b "
      "or X,Y,Z or x,y,Y. The file - is standard input, demo:NAME is a file of "
      "the built-in scenario."},
     command_describe,
     {"evenfield describe demo:livery",
      "evenfield describe demo:shop-light --format json",
      "evenfield describe --observer cie-1964 --illuminant D50 demo:livery",
      "evenfield describe demo:livery --format csv --part 2/4"}},
    {"match",
     COMMAND_MATCH,
     "[TARGETS]",
     "can this display, press or paint show these colours, how well?",
     {"Matches every target with a display of three primaries (--display), a "
      "press of three inks (--inks) or three colourants and a base "
      "(--colourants): amounts, code values, ink values or recipes, in or out "
      "of gamut and which limit is in the way, the nearest colour there is and "
      "how visible the miss is; for prints and recipes also what other lights "
      "do to the match.",
      "TARGETS is CSV: colours as L,a,b or X,Y,Z or x,y,Y, reflectance spectra "
      "of surfaces, or for displays spectra of lights in the unit of the "
      "display's own spectra. Without it the ferry's painted colours are the "
      "targets (demo:livery). Without a device the ticket kiosk is the display "
      "(demo:kiosk-measurements, or demo:kiosk-primaries where spectra are "
      "needed: for another --observer and for --population)."},
     command_match,
     {"evenfield match",
      "evenfield match --display p3-d65 --bits 10 demo:livery",
      "evenfield match --population 1000 --ages 20-70 --seed 7",
      "evenfield match --inks demo:leaflet-press",
      "evenfield match --colourants demo:livery-colourants --batch-g 1000"}},
    {"compare",
     COMMAND_COMPARE,
     "[STANDARD BATCH]",
     "how different are two finishes, in which light, and who will notice?",
     {"Compares every sample of BATCH with the standard, under several lights: "
      "the difference and its direction, the share of customers who would tell "
      "the two apart with an interval, the right answers to expect of a panel, "
      "metamerism, and a verdict against a tolerance. Rows of one name are "
      "readings of one sample: their mean counts, and their scatter is the "
      "uncertainty of measurement. With a column angle_deg they are one finish "
      "seen at several angles.",
      "STANDARD and BATCH are CSV of reflectances, or of colours, which are "
      "compared in one light only. Where STANDARD holds several standards, "
      "each "
      "sample is compared with the one of its own name; --pairs names any "
      "pairs. Without files the seats of the demo are compared."},
     command_compare,
     {"evenfield compare",
      "evenfield compare --tolerance 1 --check demo:seats-standard "
      "demo:seats-deliveries",
      "evenfield compare --population 500 --format csv"}},
    {"ellipse",
     COMMAND_ELLIPSE,
     "--at COLOUR | FILE...",
     "how far can a colour move in each direction before it is noticed?",
     {"Discrimination ellipses and ellipsoids around any colours, in x, y, in "
      "u', v', in a*, b*, in MacLeod-Boynton coordinates or in cone contrasts: "
      "from any formula, from MacAdam's and other experiments, or the steps of "
      "the lighting trade. One ellipse is one just-noticeable difference unless "
      "--steps or --size says otherwise.",
      "A FILE is CSV as for describe: spectra, or colours as L,a,b or X,Y,Z or "
      "x,y,Y. A colour without an ellipse (black) is listed with the reason."},
     command_ellipse,
     {"evenfield ellipse --at 60,10,20",
      "evenfield ellipse --at xy:0.31,0.33 --space xy --basis macadam-1942",
      "evenfield ellipse --metric cam16-ucs --format csv demo:livery"}},
    {"isolate",
     COMMAND_ISOLATE,
     "",
     "lights that change only the receptors they are meant to change",
     {"Finds the background and the modulation of a display's primaries that "
      "change chosen receptors of the eye and leave others alone: amounts, "
      "drives and code values, the contrast of every receptor, the largest "
      "contrast the display holds, what code values and other people's eyes "
      "leave of the silence, what reaches the eye, and cautions.",
      "Receptors are the L, M and S cones, rods and melanopsin; contrast is "
      "the change of a receptor's excitation over its excitation by the "
      "background. Without --display the vision laboratory's stimulator is "
      "used (demo:lab-display)."},
     command_isolate,
     {"evenfield isolate",
      "evenfield isolate --change S --contrast 0.2 --frames shown --waveform "
      "gabor",
      "evenfield isolate --change \"isoluminant red-green\" --population 500"}},
    {"observer",
     COMMAND_OBSERVER,
     "list | build [OBSERVER]",
     "who looks: functions of an observer of any age, field and eyes",
     {"`evenfield observer list` says what --observer takes. `evenfield "
      "observer build OBSERVER` writes the colour-matching functions and the "
      "cone fundamentals of one of them at 1 nm, as CSV with all digits unless "
      "--format says otherwise; a file so written serves as an --observer. "
      "OBSERVER may be model:age=45,field=4, deuteranope, "
      "protanomalous:shift=8 ...",
      "`evenfield observer build --categories 10` draws a population and "
      "writes the observers that stand best for it, each with its name and the "
      "share of the people it stands for. An OBSERVER then is the mean from "
      "which people vary."},
     command_observer,
     {"evenfield observer list",
      "evenfield observer build model:age=70,field=4",
      "evenfield observer build --categories 3 --population 1000"}},
    {"panel",
     COMMAND_PANEL,
     "fit [RESPONSES] | calibrate [RESPONSES [SAMPLES]] | next [RESPONSES] | "
     "plan | flicker [SETTINGS [LIGHTS]] | adjust SETTINGS",
     "what a panel's answers say: thresholds, JND, points of equality",
     {"`evenfield panel fit RESPONSES` fits a curve to the answers of each "
      "observer and condition and to all together: threshold, point of "
      "equality, JND, slope and lapses with 95 % intervals, how well the curve "
      "fits, and how people differ. `evenfield panel calibrate RESPONSES "
      "--pairs PAIRS` gives the panel's JND in a colour-difference formula, "
      "which `evenfield compare --jnd FILE` reads, and how well each formula "
      "orders the pairs. "
      "`evenfield panel next RESPONSES --levels LEVELS` says which of the "
      "levels in hand to show next, from the answers so far; `evenfield panel "
      "plan --expected-jnd 0.9` how many observers, levels and trials a panel "
      "takes. `evenfield panel flicker SETTINGS LIGHTS` turns settings of least "
      "flicker (columns first, first_amount, second, second_amount: lights and "
      "shares of their full drive) into luminance weights for isolate. `evenfield "
      "panel adjust SETTINGS` sums up what observers set by hand until both "
      "sides looked alike (columns setting, standard, observer): point of "
      "equality, constant error, JND. Without a file all but plan and adjust "
      "work on the demo.",
      "RESPONSES is CSV with the column level, and for each trial answer (yes, "
      "no; right, wrong; same, different; greater, less; or 1 and 0), or "
      "counts n (shown) and k (of them positive); calibrate also takes "
      "a column pair in the place of level. The columns observer, "
      "condition, place (first or second: where the difference was) and task "
      "may be there. Trials at level 0 show no difference."},
     command_panel,
     {"evenfield panel fit", "evenfield panel calibrate", "evenfield panel next",
      "evenfield panel plan --expected-jnd 0.9 --samples 100"}},
    {"profile",
     COMMAND_PROFILE,
     "make PROFILE | check PROFILE [MEASUREMENTS] | convert COLOURS | convert "
     "PICTURE.png OUT.png",
     "ICC profiles: make one of a display, judge one, convert colours",
     {"`evenfield profile make PROFILE --display FILE` writes a display profile "
      "(ICC version 4, three curves and a matrix) from measured primaries and "
      "ramps. `evenfield profile check PROFILE MEASUREMENTS` says how well a "
      "profile describes measured rows (R,G,B or inks beside X,Y,Z, x,y,Y, "
      "L,a,b or a spectrum); without them, whether it can be read and holds "
      "the tags it must have.",
      "`evenfield profile convert COLOURS --from A --to B` converts a list of "
      "colours: device values of the profile A, or without --from the colours "
      "of the file, to device values of the profile B, to xyz or to lab. What "
      "comes out is judged by the profile's own way back. A PICTURE has the "
      "colours that its tags say, or --from, and is written to OUT with the "
      "profile B in it."},
     command_profile,
     {"evenfield profile make kiosk.icc --display demo:kiosk-measurements",
      "evenfield profile convert --to p3-d65 demo:livery",
      "evenfield profile convert --from srgb --to lab "
      "demo:kiosk-measurements"}},
    {"image",
     COMMAND_IMAGE,
     "gamut PICTURE.png [MAP.png] | compare A.png B.png [MAP.png] | render "
     "CUBE.hdr OUT",
     "pictures: out of gamut, told apart; spectral images rendered",
     {"`evenfield image gamut` reads a PNG picture by its own colour tags "
      "(cICP, iCCP, sRGB, gAMA with cHRM) and tells the share of its pixels "
      "that the display cannot show, how far its nearest colours are off, and "
      "where: MAP shows the picture in pale grey with lines over what is "
      "missed, the denser the more. A picture without tags needs --assume: its "
      "colours are not guessed. `evenfield image compare` takes two of one size and tells how far B is "
      "from A, pixel by pixel, and which share of observers would tell: MAP is "
      "the darker the larger the difference, with a key.",
      "`evenfield image render` takes a spectral image, as surfaces under a "
      "light or as lights, to OUT: FILE.png, a tagged picture, and how much of "
      "it was clipped; FILE.hdr with FILE.bip, X, Y, Z or cone excitations as "
      "a spectral image of 32-bit floating-point numbers; or FILE.csv, a row a "
      "pixel. CUBE.hdr is an ENVI-style header (bsq, bil or bip; data type 1, "
      "2, 3, 4, 5, 12 or 13; wavelengths in nm or micrometres), with the values "
      "in the file beside it: of any size, as some 16 MB a thread are held at "
      "a time. Bands marked as bad, of a wavelength that came before, or where "
      "eyes see nothing are left out, pixels without data are empty (in a "
      "picture black), and notes count them."},
     command_image,
     {"evenfield swatch",
      "evenfield image gamut --display bt709 swatches/sheet.png",
      "evenfield image compare swatches/005-rail-yellow.png "
      "swatches/004-mast-buff.png"}},
    {"swatch",
     COMMAND_SWATCH,
     "[TARGETS | LEFT RIGHT]",
     "pictures of target and match side by side, and a sheet of all",
     {"Draws a split field for every target: on the left the target, on the "
      "right the match for it. With two files of as many colours the pairs are "
      "drawn as they stand, without a device. What does not match has a "
      "striped corner.",
      "The pictures are PNG with BT.2020 primaries and the curve of IEC "
      "61966-2-1, and say so in their cICP and iCCP chunks. They go into the "
      "folder `swatches` unless --pictures names another."},
     command_swatch,
     {"evenfield swatch --pictures fields",
      "evenfield swatch --display bt709 --pictures fields-bt709 demo:livery"}},
    {"tables",
     COMMAND_TABLES,
     "[NAME]",
     "the built-in spectra, observers, illuminants, encodings and metrics",
     {"Without NAME lists the built-in tables of spectra. NAME is one of them, "
      "or demo:NAME for a file of the built-in scenario: its figures are "
      "printed with all digits.",
      "NAME may also be observers, illuminants, metrics, encodings or demo: "
      "the "
      "lists of what --observer, --illuminant, --metric, --display and file "
      "arguments take."},
     command_tables,
     {"evenfield tables", "evenfield tables observers",
      "evenfield tables demo:livery"}},
};
enum { N_COMMANDS = sizeof table / sizeof table[0] };

size_t command_all(const command_entry **commands) {
  *commands = table;
  return N_COMMANDS;
}

const command_entry *command_find(const char *name) {
  for (size_t i = 0; i < N_COMMANDS; ++i) {
    if (strcmp(table[i].name, name) == 0)
      return &table[i];
  }
  return NULL;
}
