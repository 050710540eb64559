#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-2.0-or-later
# Builds the fuzz targets with clang, address and undefined-behaviour sanitizers, and runs each for
# some seconds, one after the other: tests/fuzz/run.sh [SECONDS] [TARGET …]. Finds land in
# tests/fuzz/found/TARGET, where the ordinary tests replay them.
set -euo pipefail
cd "$(dirname "$0")/../.."
seconds=${1:-60}
shift || true
targets=("$@")
[ ${#targets[@]} -gt 0 ] || targets=(job csv fits_table hdf5_table healpix_map moc counts chain)

CC=clang CXX=clang++ ./.ci/build.sh build-fuzz -DDEVIASCOPE_FUZZ=ON -DDEVIASCOPE_TESTS=OFF \
    -DDEVIASCOPE_PRECOMPILE=OFF -- deviascope_fuzz
# CFITSIO asks for as much memory as a header claims, and lives with being refused.
export ASAN_OPTIONS=allocator_may_return_null=1
status=0
for target in "${targets[@]}"; do
    work=build-fuzz/corpus/$target
    mkdir -p "$work" "tests/fuzz/found/$target"
    log=build-fuzz/$target.log
    DEVIASCOPE_FUZZ_TARGET=$target nice build-fuzz/fuzz/deviascope_fuzz "$work" "tests/fuzz/corpus/$target" \
        -max_total_time="$seconds" -max_len=100000 -timeout=20 -rss_limit_mb=3000 -malloc_limit_mb=1000000000 \
        -artifact_prefix="tests/fuzz/found/$target/" -print_final_stats=1 > "$log" 2>&1 || status=1
    rmdir --ignore-fail-on-non-empty "tests/fuzz/found/$target"
    printf '%s: %s executions, %s finds\n' "$target" \
        "$(sed -n 's/^stat::number_of_executed_units: *//p' "$log")" \
        "$(find tests/fuzz/found -path "*/$target/*" -type f | wc -l)"
done
exit $status
