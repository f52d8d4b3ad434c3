//! What the library promises, shown through its public doors: against sources, over random input, over real sockets.
#![allow(
    clippy::expect_used,
    clippy::float_cmp,
    clippy::panic,
    clippy::print_stdout,
    clippy::unwrap_used,
    reason = "a test fails by panicking, compares exact values and tells what it skips"
)]

mod feeds_care;
mod feeds_coverages;
mod feeds_documents;
mod feeds_faults;
mod feeds_random;
mod misbehaving;
