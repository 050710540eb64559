#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-2.0-or-later
# Installs what is missing of the packages for the purposes named: .ci/install.sh build [test]
set -euo pipefail
here=$(cd "$(dirname "$0")" && pwd)

missing=()
for purpose in "$@"; do
    while read -r package; do
        dpkg-query -W -f='${Status}' "$package" 2>/dev/null | grep -q 'install ok installed' ||
            missing+=("$package")
    done < <(awk -v purpose="$purpose" '$1 == purpose { print $2 }' "$here/packages.txt")
done
[ ${#missing[@]} -eq 0 ] && exit 0

as_root=()
if [ "$(id -u)" -ne 0 ]; then
    if ! command -v sudo > /dev/null; then
        echo "These Debian packages are missing, and neither root nor sudo is at hand to install them:" >&2
        echo "  ${missing[*]}" >&2
        exit 1
    fi
    as_root=(sudo)
fi
echo "Installing ${#missing[@]} missing packages: ${missing[*]}"
log=$(mktemp)
trap 'rm -f "$log"' EXIT
export DEBIAN_FRONTEND=noninteractive
if ! { "${as_root[@]}" apt-get -q update &&
       "${as_root[@]}" apt-get -q install -y --no-install-recommends "${missing[@]}"; } > "$log" 2>&1; then
    tail -n 30 "$log" >&2
    echo "The packages could not be installed; the lines above are apt-get's own." >&2
    exit 1
fi
