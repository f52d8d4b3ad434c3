#!/usr/bin/env bash
# Requests per second of the service beside an empty axum handler that returns a body of the same size, in turns on the
# same machine, as ratios; besides: processor time per request, idle memory, and time from start to ready.
# Needs wrk and curl (Debian). ROUNDS, SECONDS_EACH and CONNECTIONS change the length and the load.
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.."
rounds=${ROUNDS:-7} seconds=${SECONDS_EACH:-4} connections=${CONNECTIONS:-32}

command -v wrk curl >/dev/null || { echo 'needs: apt-get install wrk curl' >&2 && exit 2; }
cargo build --locked --release --quiet
cargo build --locked --release --quiet --example empty
release=${CARGO_TARGET_DIR:-target}/release

work=$(mktemp -d)
processes=()
finish() {
    [ ${#processes[@]} = 0 ] || kill "${processes[@]}" 2>/dev/null || true
    rm -rf "$work"
}
trap finish EXIT

now_ms() { date +%s%3N; }
ready() { until curl -sf -o /dev/null "$1"; do sleep 0.005; done; }
free_port() { python3 -c 'import socket; s = socket.socket(); s.bind(("127.0.0.1", 0)); print(s.getsockname()[1])'; }
median() { sort -g | awk '{ v[NR] = $1 } END { print NR % 2 ? v[(NR + 1) / 2] : (v[NR / 2] + v[NR / 2 + 1]) / 2 }'; }
# Processor time of a process so far, in clock ticks.
ticks() { awk '{ print $14 + $15 }' "/proc/$1/stat"; }

# The service as anyone starts it, its log going to a file; started several times for the time to ready.
port=$(free_port)
for _ in 1 2 3 4 5; do
    [ ${#processes[@]} = 0 ] || { kill "${processes[0]}" && wait "${processes[0]}"; }
    begin=$(now_ms)
    RAINWARD_LISTEN=127.0.0.1:$port "$release/rainward" >/dev/null 2>"$work/log" &
    processes=($!)
    ready "http://127.0.0.1:$port/readyz"
    echo $(($(now_ms) - begin)) >>"$work/ready"
done
service=${processes[0]}
echo "ready after $(median <"$work/ready") ms (median of 5, from exec to the first 200 on /readyz, with one curl)"
sleep 1
echo "idle memory $(awk '/VmRSS/ { print $2 / 1000 }' "/proc/$service/status") MB"

# measure PID URL: appends requests per second and processor microseconds per request.
measure() {
    local before after
    before=$(ticks "$1")
    wrk -t1 -c"$connections" -d"${seconds}s" "$2" >"$work/wrk"
    after=$(ticks "$1")
    if grep -E 'Non-2xx|Socket errors' "$work/wrk" >&2; then exit 1; fi
    awk -v ticks=$((after - before)) -v hz="$(getconf CLK_TCK)" \
        '/requests in/ { n = $1 } /Requests\/sec/ { print $2, ticks / hz / n * 1e6 }' "$work/wrk" >>"$work/$3"
}

compare() {
    local name=$1 url=http://127.0.0.1:$port$2 size yard_port yard
    curl -sf -o "$work/body" "$url"
    size=$(stat -c %s "$work/body")
    yard_port=$(free_port)
    "$release/examples/empty" "$yard_port" "$size" &
    yard=$!
    processes+=("$yard")
    ready "http://127.0.0.1:$yard_port/"
    for _ in $(seq "$rounds"); do
        measure "$service" "$url" "$name"
        measure "$yard" "http://127.0.0.1:$yard_port/" "$name.empty"
    done
    kill "$yard"
    paste -d ' ' "$work/$name" "$work/$name.empty" >"$work/pairs"
    printf '%s, %s bytes: ' "$name" "$size"
    printf '%.0f requests/s, ' "$(cut -d ' ' -f 1 "$work/pairs" | median)"
    printf 'empty handler %.0f, ' "$(cut -d ' ' -f 3 "$work/pairs" | median)"
    printf 'ratio %.2f (median of %s pairs); ' "$(awk '{ print $1 / $3 }' "$work/pairs" | median)" "$rounds"
    printf 'processor time %.1f us a request, ' "$(cut -d ' ' -f 2 "$work/pairs" | median)"
    printf 'empty handler %.1f, ratio %.2f\n' "$(cut -d ' ' -f 4 "$work/pairs" | median)" \
        "$(awk '{ print $4 / $2 }' "$work/pairs" | median)"
}

compare bow '/v1/bow?lat=47.36&lon=-31.12&time=2031-05-04T17:40:00Z'
compare outlook '/v1/outlook?site=gull-stairs'
compare light '/v1/light?sun_elevation_deg=20'
