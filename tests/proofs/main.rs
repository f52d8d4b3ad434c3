//! What the computations are held against: figures from outside, kept in `tests/reference` with their sources.

#![allow(
    clippy::expect_used,
    clippy::panic,
    clippy::print_stdout,
    clippy::unwrap_used,
    missing_docs,
    reason = "tests fail by panicking and tell how close they came"
)]

mod light;
mod profiles;
mod reference_colour;
mod reference_optics;
mod reference_spheres;
mod table;
