#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-2.0-or-later
# Installs what is missing, builds and runs the tests. With --long: the long forms too.
set -euo pipefail
cd "$(dirname "$0")/.."
selection=(--label-exclude long)
[ "${1:-}" = --long ] && selection=()

./.ci/install.sh build test
echo "Building (a few minutes the first time) …"
./.ci/build.sh build -DDEVIASCOPE_TESTS=ON
echo "Testing …"
log=$(mktemp)
trap 'rm -f "$log"' EXIT
if ! ctest --test-dir build --output-on-failure --no-tests=error -j "$(($(nproc) + 1))" "${selection[@]}" > "$log" 2>&1; then
    grep -v -E '^ *[0-9]+/[0-9]+ Test .* Passed|^ +Start +[0-9]+' "$log" | head -n 300 >&2
    exit 1
fi
tail -n 12 "$log"
