# SPDX-License-Identifier: GPL-3.0-or-later
# Sourced by tools/check, tools/demo and tools/bench: installs the Debian
# packages they need. Asks nothing; says one line and ends when it cannot.

EF_PACKAGES="gcc libc6-dev meson ninja-build pkg-config libgsl-dev
  liblcms2-dev libpng-dev libjansson-dev libcairo2-dev"
EF_TEST_PACKAGES="g++ libcmocka-dev libglpk-dev"
# ICC profiles of displays and presses, 0.4 MB: tests do without them.
EF_PROFILE_PACKAGES="icc-profiles-free libgs-common"
# Contestants in the benches.
EF_BENCH_PACKAGES="libopenblas-dev libnlopt-dev valgrind"
# Labels on the sheet of swatches need cairo at run time and any font.
EF_RUN_PACKAGES="libcairo2 fonts-dejavu-core"

ef_die() {
  printf '%s: %s\n' "$(basename "$0")" "$*" >&2
  exit 1
}

ef_is_installed() {
  [ "$(dpkg-query -W -f '${db:Status-Abbrev}' "$1" 2>/dev/null | cut -c1-2)" \
    = ii ]
}

# ef_install PACKAGE...: what is missing of them, as root or through sudo.
ef_install() {
  missing=
  for package in "$@"; do
    ef_is_installed "$package" || missing="$missing $package"
  done
  [ -n "$missing" ] || return 0
  command -v apt-get >/dev/null 2>&1 ||
    ef_die "needs Debian's packages$missing, and apt-get is not here"
  as_root=
  if [ "$(id -u)" != 0 ]; then
    command -v sudo >/dev/null 2>&1 && sudo -n true 2>/dev/null ||
      ef_die "needs these packages, as root: apt-get install$missing"
    as_root="sudo -n"
  fi
  printf 'installing:%s\n' "$missing"
  log=$(mktemp)
  export DEBIAN_FRONTEND=noninteractive
  if ! { $as_root apt-get -q update &&
    $as_root apt-get -q -y --no-install-recommends install $missing; } \
    </dev/null >"$log" 2>&1; then
    reason=$(grep -m 1 '^E:' "$log" || tail -n 1 "$log")
    rm -f "$log"
    ef_die "could not install$missing: $reason"
  fi
  rm -f "$log"
}

# Started by `sudo`: install as root, then go on as the user who asked, so that
# the build folder stays theirs.
ef_step_down() {
  if [ "$(id -u)" = 0 ] && [ -n "${SUDO_USER:-}" ] &&
    [ "$SUDO_USER" != root ]; then
    exec runuser -u "$SUDO_USER" -- "$0" "$@"
  fi
}

# ef_build DIR [SETUP OPTION...]: configures once, compiles what changed, and
# shows the compiler's words only when it fails.
ef_build() {
  dir=$1
  shift
  log=$(mktemp)
  if [ ! -f "$dir/build.ninja" ]; then
    rm -rf "$dir"
    meson setup "$dir" "$@" >"$log" 2>&1 || {
      cat "$log" >&2
      rm -f "$log"
      ef_die "could not configure $dir (above)"
    }
  fi
  ninja -C "$dir" >"$log" 2>&1 || {
    cat "$log" >&2
    rm -f "$log"
    ef_die "could not build $dir (above)"
  }
  rm -f "$log"
}
