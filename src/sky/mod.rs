//! Directions for an observer: Sun, refraction, antisolar point, bow circle, horizon, skyline, and when things change.
//!
//! All geometry is done with unit vectors (east, north, up); angles appear only at the edges.

pub mod circle;
pub mod direction;
pub mod horizon;
pub mod magnetic;
pub mod observer;
pub mod refraction;
pub mod search;
pub mod sun;
