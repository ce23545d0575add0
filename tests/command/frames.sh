#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Frames of `isolate`: a record alone makes the same bytes again, a folder
# appears whole or not at all, pictures are untagged.
#   frames.sh EVENFIELD
. "$(dirname "$0")/tap.sh"

# Five lights and a tone curve as files.
awk 'BEGIN {
  print "# unit: W sr-1 m-2 nm-1"
  print "wavelength_nm,violet,blue,cyan,amber,red,black"
  split("420 465 505 590 640", peak, " ")
  for (w = 380; w <= 780; w += 5) {
    printf "%d", w
    for (i = 1; i <= 5; ++i) {
      z = (w - peak[i]) / 10
      printf ",%.6g", 0.02 * exp(-z * z / 2) + 1e-7
    }
    print ",1e-7"
  }
}' > five.csv
awk 'BEGIN {
  print "R,G,B,X,Y,Z"
  for (i = 0; i <= 8; ++i) {
    y = (i / 8) ^ 2.1 * 100
    printf "%g,%g,%g,%g,%g,%g\n", i / 8, i / 8, i / 8, y, y, y
  }
}' > ramp.csv

# The same with what editors leave in files.
{ printf '\357\273\277'; sed 's/$/\r/' five.csv; } > editor.csv
printf '# who came\tto the laboratory\nage,share\n25,0.25\n60,0.75\n' > ages.csv
"$evenfield" observer build model:age=40,field=4 --quiet --output eyes.csv ||
  exit 1

small="--frame-size 48x36 --pixels-per-mm 1 --distance-mm 400 --quiet"

# replay NAME OPTION...: the record of NAME in an empty folder, without the
# files it was made of.
replay() {
  name=$1
  shift
  # shellcheck disable=SC2086
  "$evenfield" isolate $small --frames "$name" "$@" > "$name.text" || return 1
  mkdir "$name.again" && cp "$name/stimulus.json" "$name.again/" &&
    cd "$name.again" || return 1
  "$evenfield" isolate --replay stimulus.json --quiet > text || return 1
  cd ..
  diff -r "$name" "$name.again/frames" || return 1
  # But for the folder's name, which may break lines elsewhere.
  tr -s ' \n' '  ' < "$name.text" | sed "s/frames\{0,1\} in $name as/in DIR/" > a
  tr -s ' \n' '  ' < "$name.again/text" |
    sed 's/frames\{0,1\} in frames as/in DIR/' > b
  diff a b
}

ef_try "a record alone makes the same bytes: demo, sinusoid" \
  replay demo --waveform gabor --hz 10 --duration 0.2
ef_try "five primaries from a file, 10 bits" \
  replay five --display five.csv --change mel --silence rod --bits 10 \
  --waveform grating --size-deg 0
ef_try "16 bits, a ramp from a file, a file of ages, people" \
  replay sixteen --display demo:lab-display --tone ramp.csv --bits 16 \
  --population 20 --ages 30 --robust --contrast 0.3 --modulation pulse
ef_try "files of ages, eyes and room light, with marks of editors" \
  replay editor --display editor.csv --population 9 --ages ages.csv \
  --observer eyes.csv --ambient 50 --reflectance 0.05 \
  --ambient-illuminant five.csv:amber --change "isoluminant:200"
ef_try "dithering with a seed" \
  replay dither --dither ordered --seed 7 --contrast 0.01 --duration 0.1

told() {
  "$evenfield" isolate --replay five/stimulus.json --frames told \
    --report told.html --chart told.svg --plane lm > /dev/null 2> said ||
    { cat said; return 1; }
  [ -s told.html ] && [ -s told.svg ] || return 1
  diff five/stimulus.json told/stimulus.json || return 1
  grep -q 'every picture (2) is as recorded in five/stimulus.json' said ||
    { cat said; return 1; }
}
ef_try "a replay tells that all is as recorded" told

from_standard_input() {
  # shellcheck disable=SC2086
  "$evenfield" isolate $small --frames piped --display - < five.csv \
    > /dev/null || return 1
  "$evenfield" isolate --replay piped/stimulus.json --frames piped-again \
    --quiet > /dev/null < /dev/null || return 1
  diff -r piped piped-again
}
ef_try "a display from standard input" from_standard_input

untagged() {
  for picture in demo/frame-00001.png five/frame-00001-b.png; do
    for chunk in cICP iCCP sRGB gAMA cHRM sBIT pHYs; do
      if grep -q "$chunk" "$picture"; then
        echo "$picture has $chunk"
        return 1
      fi
    done
  done
}
ef_try "pictures are untagged" untagged

files_of() {
  # shellcheck disable=SC2012
  ls "$1" | tr '\n' ' '
}
names() {
  [ "$(files_of five)" = "frame-00001-a.png frame-00001-b.png \
inverse-tone.csv stimulus.json " ] || { files_of five; return 1; }
  [ "$(wc -l < five/inverse-tone.csv)" = 1026 ] || wc -l five/inverse-tone.csv
}
ef_try "names of the files, a row for each code" names

# refused STATUS WORDS OPTION...: nothing is left behind.
refused() {
  status=$1
  words=$2
  shift 2
  before=$(find . | sort)
  said=$("$evenfield" isolate --quiet "$@" 2>&1 > /dev/null)
  found=$?
  after=$(find . | sort)
  [ "$found" = "$status" ] || { echo "status $found: $said"; return 1; }
  case $said in
  *"$words"*) ;;
  *) echo "$said"; return 1 ;;
  esac
  [ "$before" = "$after" ] || { echo "left behind: $after"; return 1; }
  [ "$(echo "$said" | wc -l)" = 1 ] || { echo "$said"; return 1; }
}
ef_try "a folder that holds files is not written to" \
  refused 5 "five: holds files already" --frames five
ef_try "a file in its place" \
  refused 5 "five.csv: is no folder" --frames five.csv
ef_try "a parent that is not there" \
  refused 5 "the folder it is to be in does not exist" --frames no/such
ef_try "more than is allowed" \
  refused 3 "bytes; at most" --frames big --hz 5 --duration 3600
ef_try "more than the disk holds" \
  refused 5 "the disk has" --frames big --hz 5 --duration 3600 \
  --frame-size 8192x4096 --most-gb 1e6
ef_try "above half of the frame rate" \
  refused 3 "31 Hz cannot be shown with 60 frames a second" --frames fast \
  --hz 31
ef_try "finer than two pixels a cycle" \
  refused 3 "cycles per degree cannot be shown" --frames fine \
  --waveform grating --cycles-per-degree 60
ef_try "an output that cannot be written takes the frames along" \
  refused 5 "does not exist" --frames lost --output no/such/file

forced() {
  cp -r demo forced
  echo mine > forced/notes.txt
  # shellcheck disable=SC2086
  "$evenfield" isolate $small --frames forced --force > /dev/null || return 1
  [ "$(files_of forced)" = "frame-00001.png inverse-tone.csv notes.txt \
stimulus.json " ] || { files_of forced; return 1; }
}
ef_try "--force replaces all frames and leaves other files alone" forced

changed() {
  sed 's/--hz=10/--hz=12/' demo/stimulus.json > changed.json
  "$evenfield" isolate --replay changed.json --frames changed --quiet \
    > /dev/null 2> said
  [ $? = 1 ] || return 1
  grep -q 'frame-00001.png is not as recorded in changed.json' said ||
    { cat said; return 1; }
}
ef_try "a replay that comes out otherwise is told" changed

spoil() {
  sed "$1" demo/stimulus.json > "$2"
}
spoil 's/evenfield stimulus/other/' other.json
spoil 's/"--hz=10"/10/' argument.json
spoil 's/--hz=10/--hz=fast/' value.json
spoil 's/"name": "demo:lab-display"/"name": "x"/' without.json
spoil 's/"text":/"words":/' textless.json
head -c 3000 demo/stimulus.json > cut.json
ef_try "no record" refused 3 "other.json: is no record of a stimulus" \
  --replay other.json
ef_try "a record that is cut off" refused 3 "cut.json:" --replay cut.json
ef_try "an argument that is no option" \
  refused 3 "argument 5 of the record is no option" --replay argument.json
ef_try "an option out of its range" refused 3 "--hz is a number" \
  --replay value.json
ef_try "a file that the record lacks" refused 3 "demo:lab-display" \
  --replay without.json
ef_try "a file without text" refused 3 "has no name or no text" \
  --replay textless.json
ef_try "an option beside a replay" refused 2 "--contrast cannot be changed" \
  --replay demo/stimulus.json --contrast 0.1
printf '# title: caf\351\n' | cat - five.csv > latin.csv
ef_try "a file that is not UTF-8" refused 3 "latin.csv:1: holds bytes" \
  --frames latin --display latin.csv

ef_end
