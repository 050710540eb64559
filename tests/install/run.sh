#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-2.0-or-later
# Installs into a folder of its own and uses what is there: the program with its priors, completion
# for bash, the library from another CMake project, the Debian package. Called by CTest:
# tests/install/run.sh BUILD_FOLDER COMPILER
set -euo pipefail
build=$1
compiler=$2
here=$(cd "$(dirname "$0")" && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
export CMAKE_BUILD_PARALLEL_LEVEL=1

fail() { echo "$*" >&2; exit 1; }
quietly() { "$@" > "$work/log" 2>&1 || { cat "$work/log" >&2; fail "failed: $*"; }; }

cat > "$work/job.toml" <<'JOB'
[job]
title = "Installed"
seed = 1
nside = 1
[velocity]
prior = "only-installed"
[intrinsic]
prior = "no-intrinsic"
[[survey]]
name = "dunlin"
catalogue = "dunlin.csv"
frame = "icrs"
columns = { lon = "ra", lat = "dec" }
[[survey.bin]]
name = "all"
select = {}
weight = { mean = 4.0, sd = 0.0 }
JOB
printf 'ra,dec\n10,20\n100,-20\n200,60\n' > "$work/dunlin.csv"

# Uses the program under $1: a prior that only its own share folder holds must be found.
use_program() {
    "$1/bin/deviascope" --version | grep -q '^deviascope ' || fail "no version from $1"
    cp "$1/share/deviascope/priors/free-velocity.toml" "$1/share/deviascope/priors/only-installed.toml"
    "$1/bin/deviascope" check "$work/job.toml" > "$work/said" 2> "$work/warned" ||
        { cat "$work/warned" >&2; fail "check failed under $1"; }
    grep -q 'The job can run' "$work/said" || fail "check says nothing under $1"
}

quietly cmake --install "$build" --prefix "$work/usr"
use_program "$work/usr"
[ -f "$work/usr/share/man/man1/deviascope.1" ] || fail "no man page"
[ -f "$work/usr/share/zsh/vendor-completions/_deviascope" ] || fail "no completion for zsh"

# Completion for bash, asked as the shell asks it; every command and option must be known to it.
complete_words() { (
    source "$work/usr/share/bash-completion/completions/deviascope"
    COMP_WORDS=("$@"); COMP_CWORD=$(($# - 1)); _deviascope; printf '%s\n' "${COMPREPLY[@]}"
); }
[ "$(complete_words deviascope ch)" = check ] || fail "commands are not completed"
manual=$(tr -d '\\' < "$work/usr/share/man/man1/deviascope.1")
knows() { grep -qxF -e "$2" <<< "$1"; }
for command in run check count weigh sample summarise figures export compare sweep mock; do
    knows "$(complete_words deviascope '')" "$command" || fail "$command is not completed"
    completed=$(complete_words deviascope "$command" --)
    for option in $("$build/deviascope" "$command" --help | grep -E '^ +-' | grep -oE -- '--[a-z-]+' | sort -u); do
        knows "$completed" "$option" || fail "$option of $command is not completed"
        grep -qF -e "$option" <<< "$manual" || fail "$option of $command is not in the man page"
    done
done

quietly cmake -G Ninja -S "$here/consumer" -B "$work/consumer" -DCMAKE_PREFIX_PATH="$work/usr" \
    -DCMAKE_CXX_COMPILER="$compiler" -DCMAKE_CXX_FLAGS=-O0
quietly cmake --build "$work/consumer"
cp "$work/usr/share/deviascope/priors/free-velocity.toml" "$work/only-installed.toml"
[ "$("$work/consumer/consumer" "$work/job.toml")" = "Installed: 1 survey(s), nside 1" ] ||
    fail "the consumer of the library says something else"
rm "$work/only-installed.toml"

command -v dpkg-deb > /dev/null && command -v dpkg-shlibdeps > /dev/null || exit 0
quietly cpack --config "$build/CPackConfig.cmake" -G DEB -B "$work/package"
package=$(find "$work/package" -maxdepth 1 -name 'deviascope_*.deb')
dpkg-deb --field "$package" Depends | grep -q libhdf5 || fail "the package states no dependencies"
dpkg-deb --extract "$package" "$work/root"
use_program "$work/root/usr"
