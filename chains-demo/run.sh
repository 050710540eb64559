#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-2.0-or-later
# Installs what is missing, builds the program, makes the demo's mock catalogues and runs the main
# job on them, from catalogues to a printed summary. Everything it makes is in chains-demo/output.
set -euo pipefail
cd "$(dirname "$0")/.."

./.ci/install.sh build
echo "Building (a few minutes the first time) …"
./.ci/build.sh build -- deviascope_program

output=chains-demo/output
rm -rf "$output"
./build/deviascope mock chains-demo/dunlin-lantern.scenario.toml -o "$output"
cp chains-demo/dunlin-lantern.toml "$output/"
./build/deviascope run "$output/dunlin-lantern.toml" -o "$output/results"
