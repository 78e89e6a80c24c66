#!/usr/bin/env bash
# Builds the programs of a release and pins their hashes in release.sha256.
# The maintainer commits that and tags the commit; the release workflow builds
# again and refuses to publish anything that is not the same to the byte.
# usage: pin.sh vX.Y.Z [FOLDER, default dist]
set -euo pipefail
tag=$1
here=$(cd "$(dirname "${BASH_SOURCE[0]}")" && pwd)
# Another Go version makes other bytes: the one of go.mod builds every release.
GOTOOLCHAIN=go$(sed -n 's/^go //p' "$here/../go.mod")
export GOTOOLCHAIN
mkdir -p "${2:-dist}"
dist=$(cd "${2:-dist}" && pwd)
for target in linux/amd64 linux/arm64 darwin/amd64 darwin/arm64 windows/amd64 windows/arm64; do
  os=${target%/*} arch=${target#*/} exe=
  [ "$os" != windows ] || exe=.exe
  GITHUB_OUTPUT='' GOOS=$os GOARCH=$arch bash "$here/build.sh" "$dist/budgetcheck_${os}_$arch$exe"
done
{
  sed '/^# tag /d; /^#/!d' "$here/release.sha256"
  echo "# tag $tag"
  (cd "$dist" && sha256sum budgetcheck_*)
} > "$here/release.sha256.new"
mv "$here/release.sha256.new" "$here/release.sha256"
