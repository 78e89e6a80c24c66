#!/usr/bin/env bash
# The tests, whole: formatting, vet, static analysis, all tests with the race
# detector, and a short run of every fuzz target. On a Debian machine it
# installs what is missing; elsewhere it says what that is.
# usage: .github/test.sh [FUZZ SECONDS, default 3]
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.."

# Packages that go's ./... passes over, for they are below testdata.
packages=(./... ./testdata/demo/gen)

install() {
  local missing=()
  for tool in gcc git python3 curl shellcheck ip:iproute2; do # command, and package where it is called otherwise
    command -v "${tool%:*}" >/dev/null || missing+=("${tool#*:}")
  done
  # The PostgreSQL server, whose programs Debian keeps off the path.
  command -v initdb >/dev/null || compgen -G '/usr/lib/postgresql/*/bin/initdb' >/dev/null || missing+=(postgresql)
  [ ${#missing[@]} -eq 0 ] || debian "${missing[@]}"
  # The linter of workflows, and the runner that the action is tried on.
  program actionlint github.com/rhysd/actionlint/cmd/actionlint@v1.7.12
  program act github.com/nektos/act@v0.2.89
}

debian() {
  if ! command -v apt-get >/dev/null; then
    echo "the tests need: $*; install them and run this again" >&2
    exit 2
  fi
  local sudo=""
  [ "$(id -u)" = 0 ] || sudo=sudo
  case " $* " in *" postgresql "*) # the tests start a server of their own; the package shall start none
    $sudo mkdir -p /etc/postgresql-common
    echo 'create_main_cluster = false' | $sudo tee /etc/postgresql-common/createcluster.conf >/dev/null ;;
  esac
  $sudo apt-get update
  $sudo env DEBIAN_FRONTEND=noninteractive apt-get install -y --no-install-recommends "$@" libc6-dev ca-certificates
}

program() {
  command -v "$1" >/dev/null || [ -x "$(go env GOPATH)/bin/$1" ] || go install "$2"
}

formatted() {
  local bad
  bad=$(gofmt -l cmd budget report testdata)
  [ -z "$bad" ] || { printf 'not formatted, run gofmt -w on:\n%s\n' "$bad" >&2; exit 1; }
}

fuzz() {
  local seconds=$1 package target
  while read -r package; do
    while read -r target; do
      case $target in Fuzz*) go test -run '^$' -fuzz "^$target\$" -fuzztime "${seconds}s" "$package" ;; esac
    done < <(go test -list '^Fuzz' "$package")
  done < <(go list "${packages[@]}")
}

install
go version
formatted
go mod verify
go vet "${packages[@]}"
go tool staticcheck "${packages[@]}"
# Crowds, kills and simulations, of which the race detector sees nothing, run at
# full size without it; it looks at the rest of these packages.
large=(./budget/compare ./budget/forecast ./budget/ledger)
mapfile -t others < <(go list "${packages[@]}" | grep -vE '/budget/(compare|forecast|ledger)$')
go test -race -timeout 30m "${others[@]}" # it builds the action and runs it
go test -race -short -timeout 10m "${large[@]}"
go test -timeout 20m "${large[@]}"
fuzz "${1:-3}"
