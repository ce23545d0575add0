#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# The whole loop: a panel's answers become a JND, and the prediction of another
# command starts from it.
#
#   calibrate_loop.sh EVENFIELD
. "$(dirname "$0")/tap.sh"

# ef_jnd FILE KEY: a member of the object "jnd" of a document.
ef_jnd() {
  sed -n '/"jnd": {/,/}/s/.*"'"$2"'": "\{0,1\}\([^",]*\).*/\1/p' "$1" | head -1
}

"$evenfield" panel calibrate --save jnd.csv --quiet > /dev/null
ef_tell 'a panel is calibrated' $?
"$evenfield" compare --jnd jnd.csv --format json --quiet > predicted.json
ef_tell 'compare reads what was saved' $?
value=$(sed -n 2p jnd.csv | cut -d , -f 2)
[ -n "$value" ] && [ "$(ef_jnd predicted.json value)" = "$value" ]
ef_tell 'the JND of the prediction is that of the panel, to the last digit' $?
[ "$(ef_jnd predicted.json observer_log_sd)" = \
  "$(sed -n 2p jnd.csv | cut -d , -f 5)" ]
ef_tell 'so is the spread of the people' $?
# Of one observer nothing is known of others: compare says what it assumes.
{ echo observer,pair,n,k && "$evenfield" tables demo:pair-answers \
  --format csv | grep '^o01,'; } > one.csv
"$evenfield" panel calibrate one.csv --pairs demo:colour-pairs --task 2ifc \
  --save one-jnd.csv --quiet > /dev/null &&
  "$evenfield" compare --jnd one-jnd.csv 2>&1 > /dev/null |
    grep -q 'taken to spread over observers'
ef_tell 'what one observer cannot tell is said to be assumed' $?
ef_end
