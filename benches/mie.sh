#!/bin/sh
# Lorenz-Mie beside miepython's numba kernel, the same spheres and angles on one core, as ratios in one run.
# Needs the Python that tests/all.sh sets up; PYTHON=path/to/python takes another with tests/peers/requirements.txt installed.
set -eu
cd "$(dirname "$0")/.."
cargo build --quiet --release --example light_rows
exec "${PYTHON:-tests/peers/.venv/bin/python}" tests/peers/light.py "${CARGO_TARGET_DIR:-target}/release/examples/light_rows" --speed
