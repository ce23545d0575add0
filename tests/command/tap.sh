# SPDX-License-Identifier: GPL-3.0-or-later
# Sourced first by the tests that are scripts, with the built command as $1:
# goes to a folder that ends with the script, and counts what is told.
set -u
evenfield=$(cd "$(dirname "$1")" && pwd)/$(basename "$1")
scratch=$(mktemp -d) || exit 1
trap 'rm -rf "$scratch"' EXIT
cd "$scratch" || exit 1
LC_ALL=C
export LC_ALL
number=0
failed=0

# ef_tell NAME STATUS
ef_tell() {
  number=$((number + 1))
  if [ "$2" -eq 0 ]; then
    echo "ok $number - $1"
  else
    failed=$((failed + 1))
    echo "not ok $number - $1"
  fi
}

# ef_check NAME FOUND EXPECTED
ef_check() {
  [ "$2" = "$3" ]
  ef_tell "$1" $?
  [ "$2" = "$3" ] || echo "#   found $2, expected $3"
}

# ef_try NAME COMMAND...: the command says what is wrong.
ef_try() {
  name=$1
  shift
  why=$("$@" 2>&1)
  status=$?
  ef_tell "$name" "$status"
  [ "$status" -eq 0 ] || echo "$why" | sed 's/^/#   /'
}

# ef_skip NAME TOOL
ef_skip() {
  number=$((number + 1))
  echo "ok $number - $1 # SKIP $2 is not on this machine"
}

# The plan and the verdict, last.
ef_end() {
  echo "1..$number"
  [ "$failed" -eq 0 ]
}
