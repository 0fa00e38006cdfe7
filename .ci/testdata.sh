#!/usr/bin/env bash
# Fetches data that tests compare with but whose licence keeps them out of the
# repository: .ci/testdata.sh DIR, then CISTERN_TEST_DATA=DIR go test ./...
# Needs a Debian-like system with apt and xz; no R, no root if apt's lists are fresh.
set -euo pipefail
dir=${1:?usage: .ci/testdata.sh DIR}
mkdir -p "$dir"
[ -s "$dir/eusilc.xdr" ] && exit 0

work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
chmod 755 "$work"
cd "$work"
apt-get download -qq r-cran-laeken 2>/dev/null || { apt-get update -qq && apt-get download -qq r-cran-laeken; }
dpkg-deb -x r-cran-laeken_*.deb .
cd - >/dev/null
# The data file is R's binary format under xz; the test reads the format itself.
xz -dc "$work"/usr/lib/R/site-library/laeken/data/eusilc.RData >"$dir/eusilc.tmp"
mv "$dir/eusilc.tmp" "$dir/eusilc.xdr"
