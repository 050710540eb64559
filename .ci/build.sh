#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-2.0-or-later
# Configures and builds quietly: .ci/build.sh BUILD_FOLDER [cmake option …] [-- target …]
set -euo pipefail
top=$(cd "$(dirname "$0")/.." && pwd)
folder=$1
shift
options=()
while [ $# -gt 0 ] && [ "$1" != "--" ]; do options+=("$1"); shift; done
[ $# -gt 0 ] && shift
targets=()
[ $# -gt 0 ] && targets=(--target "$@")

log=$(mktemp)
trap 'rm -f "$log"' EXIT
if ! { cmake -S "$top" -B "$folder" -G Ninja "${options[@]}" &&
       cmake --build "$folder" "${targets[@]}"; } > "$log" 2>&1; then
    grep -E 'error|Error|FAILED|warning' "$log" | head -n 40 >&2 || true
    tail -n 20 "$log" >&2
    echo "The build failed; the lines above are the compiler's and CMake's." >&2
    exit 1
fi
