//! What the library promises, shown through its public doors: against sources, over random input, over real sockets.

#![allow(
    clippy::expect_used,
    clippy::panic,
    clippy::print_stdout,
    clippy::unwrap_used,
    missing_docs,
    reason = "a test fails by panicking and tells how close it came or what it skips"
)]

mod command_line;
mod feeds_care;
mod feeds_coverages;
mod feeds_documents;
mod feeds_faults;
mod feeds_random;
mod light;
mod misbehaving;
mod outlook;
mod profiles;
mod properties_sky;
mod reference_colour;
mod reference_optics;
mod reference_sky;
mod reference_spheres;
mod served;
mod service_bow;
mod service_conduct;
mod service_light;
mod service_outlook;
mod table;
