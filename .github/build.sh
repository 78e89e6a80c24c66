#!/usr/bin/env bash
# Builds the program so that one source and one Go version give the same bytes
# on every machine: no paths, no build id, no state of the clone.
# usage: build.sh OUTPUT            for this machine
#        GOOS=.. GOARCH=.. build.sh OUTPUT
set -euo pipefail
out=$1
[ "$(go env GOOS)" != windows ] || case $out in *.exe) ;; *) out=$out.exe ;; esac
mkdir -p "$(dirname "$out")"
out=$(cd "$(dirname "$out")" && pwd)/$(basename "$out")
cd "$(dirname "${BASH_SOURCE[0]}")/.."
CGO_ENABLED=0 GOWORK=off go build -trimpath -buildvcs=false -ldflags '-s -w -buildid=' -o "$out" ./cmd/budgetcheck
[ -z "${GITHUB_OUTPUT:-}" ] || printf 'program=%s\n' "$out" >> "$GITHUB_OUTPUT"
