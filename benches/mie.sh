#!/bin/sh
# Lorenz-Mie beside miepython's numba kernel, the same spheres and angles on one core, as ratios in one run.
# Needs a Python with tests/peers/requirements-light.txt installed: PYTHON=path/to/python benches/mie.sh
set -eu
cd "$(dirname "$0")/.."
cargo build --quiet --release --example light_rows
exec "${PYTHON:-python3}" tests/peers/light.py "${CARGO_TARGET_DIR:-target}/release/examples/light_rows" --speed
