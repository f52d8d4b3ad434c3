#!/usr/bin/env bash
# Everything that can be checked, from any directory, on Debian with Rust: installs what it needs, runs every stage whatever
# the others said, and ends in one line. `--quick` leaves out the stages that need a release build.
# CI=true: what is absent fails instead of being skipped. PEERS_SEED=N repeats the random input of the peers.
set -uo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.." || exit 2

quick=
case "${1-}" in
    '') ;;
    --quick) quick=1 ;;
    *) echo "usage: tests/all.sh [--quick]" >&2 && exit 2 ;;
esac

venv=tests/peers/.venv
binary=${CARGO_TARGET_DIR:-target}/release/rainward
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
passed=0 failed=0 skipped=0
failures=()

# The sum over all lines of a stage's output that match a pattern, of the number in its group ($2, or the first).
sum() { sed -nE "s/$1/\\${2:-1}/p" "$work/log" | awk '{ n += $1 } END { print n + 0 }'; }

# stage KIND NAME COMMAND...: KIND tells whose counts the output ends in; `one` counts as a single check.
stage() {
    local kind=$1 name=$2 begin=$SECONDS status good=0 bad=0 out=0
    shift 2
    printf '\n== %s\n' "$name"
    "$@" </dev/null 2>&1 | tee "$work/log"
    status=${PIPESTATUS[0]}
    case $kind in
        cargo)
            good=$(sum '^test result: .* ([0-9]+) passed;.*')
            bad=$(sum '^test result: .* ([0-9]+) failed;.*')
            out=$(sum '^test result: .* ([0-9]+) ignored;.*')
            ;;
        node)
            good=$(sum '^[^ ]+ pass ([0-9]+)$')
            bad=$(sum '^[^ ]+ (fail|cancelled) ([0-9]+)$' 2)
            out=$(sum '^[^ ]+ skipped ([0-9]+)$')
            ;;
        pytest)
            good=$(sum '^(.*[ =])?([0-9]+) passed.* in [0-9.]+s.*' 2)
            bad=$(sum '^(.*[ =])?([0-9]+) (failed|errors?).* in [0-9.]+s.*' 2)
            out=$(sum '^(.*[ =])?([0-9]+) skipped.* in [0-9.]+s.*' 2)
            ;;
        one) [ "$status" != 0 ] || good=1 ;;
    esac
    # A stage that failed without a failed test, or ran no test, has failed.
    [ "$bad" != 0 ] || { [ "$status" = 0 ] && [ "$good" != 0 ]; } || bad=1
    passed=$((passed + good)) failed=$((failed + bad)) skipped=$((skipped + out))
    [ "$bad" = 0 ] || failures+=("$name")
    printf -- '-- %s: %s passed, %s failed, %s skipped in %s s\n' "$name" "$good" "$bad" "$out" $((SECONDS - begin))
}

skip() {
    if [ -n "${CI-}" ] && [ -z "$quick" ]; then
        stage one "$1" sh -c "echo 'absent: $2'; exit 1"
    else
        printf '\n== %s\n-- %s: skipped (%s)\n' "$1" "$1" "$2"
        skipped=$((skipped + 1))
    fi
}

provide() {
    local sudo='' packages=()
    [ "$(id -u)" = 0 ] || sudo=sudo
    command -v cc >/dev/null || packages+=(build-essential)
    command -v chromium >/dev/null || packages+=(chromium)
    command -v node >/dev/null || packages+=(nodejs)
    command -v npm >/dev/null || packages+=(npm)
    # /usr/bin: the interpreter that python3-venv belongs to.
    /usr/bin/python3 -c 'import ensurepip' 2>/dev/null || packages+=(python3-venv)
    if [ ${#packages[@]} != 0 ]; then
        $sudo apt-get update -qq &&
            $sudo env DEBIAN_FRONTEND=noninteractive apt-get install -y -qq --no-install-recommends "${packages[@]}" || return 1
    fi
    if [ -f tests/page/package-lock.json ]; then
        npm ci --prefix tests/page --no-audit --no-fund || return 1
    fi
    [ -n "$quick" ] && return
    [ -x $venv/bin/python ] || /usr/bin/python3 -m venv $venv || return 1
    $venv/bin/pip install -q --disable-pip-version-check -r tests/peers/requirements.txt
}

# The page against the release build, on a free port.
page_real() {
    local server url='' status
    RAINWARD_LISTEN=127.0.0.1:0 RAINWARD_LOG__LEVEL=warn "$binary" >"$work/greeting" 2>"$work/service" &
    server=$!
    trap 'kill "$server" 2>/dev/null' EXIT
    for _ in $(seq 100); do
        url=$(grep -oE 'http://127\.0\.0\.1:[0-9]+' "$work/greeting" | head -n 1)
        [ -z "$url" ] || break
        sleep 0.1
    done
    [ -n "$url" ] || { cat "$work/service" && return 1; }
    RAINWARD_URL=$url node --test --test-reporter=spec tests/page/*.test.mjs
    status=$?
    kill "$server" && wait "$server" || { echo 'the service did not stop cleanly' && status=1; }
    ! grep ERROR "$work/service" || status=1
    return $status
}

stage one 'what is needed' provide
stage one formatting cargo fmt --check
stage one lints cargo clippy --locked --all-targets -- -D warnings
stage cargo 'Rust tests' cargo test --locked --no-fail-fast
if [ -f tests/page/package.json ]; then
    stage node 'page on its stand-in' node --test --test-reporter=spec tests/page/*.test.mjs
else
    skip 'page on its stand-in' 'not here'
fi
if [ -n "$quick" ]; then
    for name in rustdoc 'release build' 'page on the service' peers benches; do skip "$name" quick; done
else
    stage one rustdoc env RUSTDOCFLAGS='-D warnings' cargo doc --locked --no-deps --document-private-items
    stage one 'release build' cargo build --locked --release --bin rainward --example light_rows
    if [ -f tests/page/package.json ]; then stage node 'page on the service' page_real; else skip 'page on the service' 'not here'; fi
    stage pytest peers $venv/bin/python -B -m pytest tests/peers
    if compgen -G 'benches/*.rs' >/dev/null; then
        stage one benches cargo bench --locked --bench '*' -- --test
    else
        skip benches 'not here'
    fi
fi

echo
for name in "${failures[@]}"; do echo "FAILED: $name"; done
echo "took $((SECONDS / 60)) min $((SECONDS % 60)) s"
echo "all: $passed passed, $failed failed, $skipped skipped"
[ "$failed" = 0 ]
