#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-2.0-or-later
# Checks the order of the stages: a stage includes only earlier ones, and each outside library is
# included only in its home. Prints every violation; exit 1 if there is any.
set -euo pipefail
cd "$(dirname "$0")/.."

order="core sky catalogue counts weights model ensemble chain summary figures mock job app"
violations=0
report() { echo "$1" >&2; violations=$((violations + 1)); }

position() {  # of a stage in the order; empty if unknown
    local index=0 stage
    for stage in $order; do
        [ "$stage" = "$1" ] && { echo $index; return; }
        index=$((index + 1))
    done
}

allowed() {  # may stage $1 include stage $2?
    case "$1" in
        ensemble) [ "$2" = core ] || [ "$2" = ensemble ] ;;
        mock) case "$2" in core | sky | catalogue | mock) true ;; *) false ;; esac ;;
        *) [ "$(position "$2")" -le "$(position "$1")" ] ;;
    esac
}

files() { find include/deviascope src -name '*.h' -o -name '*.cpp' | LC_ALL=C sort; }

while read -r file; do
    stage=$(echo "$file" | sed -E 's#^(include/deviascope|src)/([a-z]+)/.*#\2#')
    if [ -z "$(position "$stage")" ]; then
        report "$file: is in no known stage; stages are: $order; move it into one"
        continue
    fi
    while read -r included; do
        if [ -z "$(position "$included")" ] || ! allowed "$stage" "$included"; then
            report "$file: includes stage $included; $stage may include only what comes before it; move the code to the earlier stage"
        fi
    done < <(sed -nE 's#^\#include "(deviascope/)?([a-z]+)/.*#\2#p' "$file" | LC_ALL=C sort -u)
done < <(files)

home() {  # the libraries whose headers match $1 live only in paths that match $2
    local file
    while read -r file; do
        echo "$file" | grep -qE "$2" || report "$file: includes a header like $1, whose home is $2"
    done < <(files | xargs grep -lE "^#include <($1)" || true)
}
home 'H5|hdf5' '^src/core/h5/'
home 'fitsio' '^src/core/fits/'
home 'zlib' '^src/core/'
home 'omp\.h' '^src/core/'
home 'Random123' '^src/core/'
home 'healpix' '^src/sky/'
home 'erfa' '^src/sky/'
home 'toml' '^src/job/'
home 'nlohmann' '^src/summary/'
home 'CLI' '^src/app/'
home 'cairo|ft2build' '^src/figures/'

for file in $(files); do
    head -n 1 "$file" | grep -q 'SPDX-License-Identifier: GPL-2.0-or-later' ||
        report "$file: has no licence line; the first line of each file is the SPDX identifier"
done

odd=$(git ls-files | grep -vE '^\.' | cut -d/ -f1 | sort -u |
    grep -vxE 'CMakeLists.txt|README.md|DEVELOPERS.md|src|include|tests|chains-demo|priors' || true)
[ -z "$odd" ] || report "top level: also holds $odd"

[ "$violations" -eq 0 ] || { echo "$violations violation(s) of the order of the stages" >&2; exit 1; }
