#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-2.0-or-later
# Checks the order of the stages: a stage includes only earlier ones, each outside library is
# included only in its home, and no two types share a name. Prints every violation; exit 1 if
# there is any.
set -euo pipefail
cd "$(dirname "$0")/.."

# Where git is not at hand, what lies there, but for build folders.
entries=$(git ls-files 2> /dev/null || ls -d [!b]* b[!u]* 2> /dev/null || true)
odd=$(echo "$entries" | grep -vE '^\.' | cut -d/ -f1 | sort -u |
    grep -vxE 'CMakeLists.txt|README.md|DEVELOPERS.md|src|include|tests|chains-demo|priors' || true)

find include/deviascope src -name '*.h' -o -name '*.cpp' | LC_ALL=C sort |
    xargs awk -v odd="$odd" '
function report(text) { print text > "/dev/stderr"; ++violations }
function allowed(stage, included) {
    if (stage == "ensemble") return included == "core" || included == "ensemble"
    if (stage == "mock") return included ~ /^(core|sky|catalogue|mock)$/
    return place[included] <= place[stage]
}
BEGIN {
    n = split("core sky catalogue counts weights model ensemble chain summary figures mock job app", order)
    for (i = 1; i <= n; ++i) place[order[i]] = i
    # header of an outside library -> the only paths that may include it
    home["H5|hdf5"] = "^src/core/h5/";      home["fitsio"] = "^src/core/fits/"
    home["zlib"] = "^src/core/";            home["omp[.]h"] = "^src/core/"
    home["Random123"] = "^src/core/";       home["healpix"] = "^src/sky/"
    home["erfa"] = "^src/sky/";             home["toml"] = "^src/job/"
    home["nlohmann"] = "^src/summary/";     home["CLI"] = "^src/app/"
    home["cairo|ft2build"] = "^src/figures/"
    if (odd != "") report("top level: also holds " odd)
}
FNR == 1 {
    stage = FILENAME
    sub("^(include/deviascope|src)/", "", stage)
    sub("/.*", "", stage)
    if (!(stage in place))
        report(FILENAME ": is in no known stage; move it into one of them")
    if ($0 !~ /SPDX-License-Identifier: GPL-2.0-or-later/)
        report(FILENAME ": has no licence line; the first line of each file is the SPDX identifier")
}
/^#include "/ {
    included = $2
    gsub(/"/, "", included)
    sub("^deviascope/", "", included)
    sub("/.*", "", included)
    if (!(included in place) || !allowed(stage, included))
        report(FILENAME ":" FNR ": stage " stage " includes " $2 "; only earlier stages are allowed; move the code to the earlier one")
}
/^#include </ {
    for (library in home)
        if ($2 ~ "^<(" library ")" && FILENAME !~ home[library])
            report(FILENAME ":" FNR ": includes " $2 ", whose home is " substr(home[library], 2))
}
# The linker takes two types of one name for the same, and mixes their functions.
/^(struct|class|enum class) [A-Za-z0-9_]+( final)?( *:[^:].*)? *[{]/ && FILENAME ~ /[.]h$/ {
    name = $1 == "enum" ? $3 : $2
    if (name in type_home)
        report(FILENAME ":" FNR ": " name " is also a type of " type_home[name] "; each type has a name of its own")
    type_home[name] = FILENAME
}
END {
    if (violations) { print violations " violation(s) of the order of the stages" > "/dev/stderr"; exit 1 }
}'
