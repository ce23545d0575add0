#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# The checks of layers and names find what they are for: each is run on a small
# tree with one fault, and on one without.
#
#   test_checks.sh TOOLS
set -u
tools=$1
work=$(mktemp -d) || exit 99
trap 'rm -rf "$work"' EXIT
n=0
licence='/* SPDX-License-Identifier: GPL-3.0-or-later */'

# tree FILE LINE...: a tree with a sound public header and one more file.
tree() {
  rm -rf "$work/tree"
  mkdir -p "$work/tree/src/base" "$work/tree/src/device" \
    "$work/tree/src/spectrum" "$work/tree/src/exchange" \
    "$work/tree/src/colour" "$work/tree/src/novelty" \
    "$work/tree/include/evenfield" "$work/tree/tools/evenfield" \
    "$work/tree/tests" "$work/tree/spectra"
  printf '%s\nEF_API int ef_count(double step_nm);\n' "$licence" \
    >"$work/tree/include/evenfield/base.h"
  file=$1
  shift
  printf '%s\n' "$licence" "$@" >"$work/tree/$file"
}

# expect STATUS TEXT CHECK: runs CHECK on the tree.
expect() {
  n=$((n + 1))
  "$tools/$3" "$work/tree" >"$work/out" 2>&1
  status=$?
  if [ "$status" = "$1" ] && grep -qF -e "$2" "$work/out"; then
    printf 'ok %d - %s: %s\n' "$n" "$3" "$2"
  else
    printf 'not ok %d - %s: %s\n# status %d\n' "$n" "$3" "$2" "$status"
    sed 's/^/# /' "$work/out"
  fi
}

tree src/device/display.c '#include <evenfield/colour.h>' \
  '#include "spectrum/spectrum_private.h"' '#include <math.h>'
expect 0 'layers: no fault' check_layers
expect 0 'names: no fault' check_names
tree src/spectrum/fold.c '#include "device/device_private.h"'
expect 1 'src/spectrum/fold.c:2: spectrum may not include device' check_layers
tree src/spectrum/fold.c '#include <evenfield/device.h>'
expect 1 'src/spectrum/fold.c:2: spectrum may not include device' check_layers
tree src/spectrum/fold.c '#include <evenfield.h>'
expect 1 'the library includes its own evenfield.h' check_layers
tree src/colour/lab.c '#include <evenfield/observer.h>'
expect 1 'colour may not include observer' check_layers
tree src/colour/rendering.c '#include <evenfield/observer.h>'
expect 0 'layers: no fault' check_layers
tree src/novelty/new.c 'int ef__x;'
expect 1 'folder "novelty" has no place in the order' check_layers
tree tools/evenfield/main.c '#include "base/base_private.h"'
expect 1 'which is not public' check_layers
tree src/device/display.c '#include <lcms2.h>'
expect 1 'only src/device/profile_private.h may include lcms2.h' check_layers
tree src/device/display.c '#include "device/profile_private.h"'
expect 1 'only src/device/profile*.c may include device/profile_private.h' \
  check_layers
tree src/device/profile_open.c '#include "device/profile_private.h"'
expect 0 'layers: no fault' check_layers
tree src/base/base_private.h '#include <gsl/gsl_math.h>'
expect 1 'only .c files of src may include gsl/gsl_math.h' check_layers
tree src/device/display.c 'void f(void) { printf("x"); }'
expect 1 'may not print or end the process: printf()' check_layers
tree src/device/display.c 'void f(void) { exit (1); }'
expect 1 'may not print or end the process: exit ()' check_layers
tree src/device/display.c 'void f(void) { fopen("x", "r"); }'
expect 1 'only exchange and picture touch files: fopen()' check_layers
tree src/exchange/input.c 'void f(void) { fopen("x", "r"); }'
expect 0 'layers: no fault' check_layers
tree src/device/display.c '/* not printf("x"), nor' ' * exit(1) */' \
  'const char *ef__text = "abort()";' 'int ef__snprintf(void);'
expect 0 'layers: no fault' check_layers
tree include/evenfield/device.h 'EF_API int' '    ef__hidden(int x);'
expect 1 'ef__hidden is private by its name' check_names
tree include/evenfield/device.h 'EF_API int ef_find(double wavelength);'
expect 1 'call it wavelength_nm' check_names
tree include/evenfield/device.h 'EF_API double ef_wavelength(double at_nm);'
expect 0 'names: no fault' check_names
tree src/base/error.c 'int ef__x;'
sed -i 1d "$work/tree/src/base/error.c"
expect 1 'src/base/error.c: does not begin with its licence' check_names
printf '1..%d\n' "$n"
