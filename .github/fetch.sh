#!/usr/bin/env bash
# Fetches the released program for this machine and checks it against the hash
# in release.sha256, which is part of the action's own tree. Where that names no
# asset for this machine, or the tree is not a release, it leaves the output
# `program` empty and the action builds from source. A hash that does not match
# is an error: never run what was not pinned.
set -euo pipefail
here=$(cd "$(dirname "${BASH_SOURCE[0]}")" && pwd)

# build_instead leaves the program to be built, with the Go version of go.mod.
build_instead() {
  echo "$1; building from source"
  printf 'go=%s\n' "$(sed -n 's/^go //p' "$here/../go.mod")" >> "$GITHUB_OUTPUT"
  exit 0
}

case ${RUNNER_OS:-} in Linux) os=linux ;; macOS) os=darwin ;; Windows) os=windows ;; *) os= ;; esac
case ${RUNNER_ARCH:-} in X64) arch=amd64 ;; ARM64) arch=arm64 ;; *) arch= ;; esac
exe=
[ "$os" != windows ] || exe=.exe
asset=budgetcheck_${os}_$arch$exe

tag=$(sed -n 's/^# tag //p' "$here/release.sha256")
pinned=$(awk -v asset="$asset" '$2 == asset { print $1 }' "$here/release.sha256")
if [ -z "$tag" ] || [ -z "$pinned" ] || [ -z "${ACTION_REPOSITORY:-}" ]; then
  build_instead "no released program is pinned here for $asset"
fi

program=$RUNNER_TEMP/$asset
url=$GITHUB_SERVER_URL/$ACTION_REPOSITORY/releases/download/$tag/$asset
if ! curl --fail --silent --show-error --location --retry 3 --max-time 120 --output "$program" "$url"; then
  build_instead "$asset of $tag cannot be fetched"
fi
if command -v sha256sum >/dev/null; then
  got=$(sha256sum "$program")
elif command -v shasum >/dev/null; then
  got=$(shasum -a 256 "$program")
else
  rm -f "$program"
  build_instead "there is neither sha256sum nor shasum to check $asset with"
fi
got=${got#\\} # marks an escaped path on Windows
if [ "${got%% *}" != "$pinned" ]; then
  echo "::error::$asset of $tag has the SHA-256 ${got%% *}, not $pinned as pinned; it was not run"
  exit 1
fi
chmod +x "$program"
printf 'program=%s\n' "$program" >> "$GITHUB_OUTPUT"
