//! Light in one drop and in rain: what a bow looks like and how well it stands out.
//!
//! Everything here is a pure function of numbers: no clock, no I/O, no state. Wavelengths are in micrometres in
//! vacuum, angles in degrees, rain in mm/h. The parts, each using only those above it:
//! - [`air`], [`water`]: refractive index;
//! - [`ray`]: the stationary (Descartes) ray of a bow of any order;
//! - [`drops`]: sizes of drops in rain, and what they take from a beam.
//! The parts, each using only those above it:
//!
//! - [`air`], [`water`]: refractive index;
//! - [`ray`]: the stationary (Descartes) ray of a bow of any order; [`fresnel`]: what surfaces reflect and let through;
//! - [`airy`]: the bow of one drop by Airy's theory; [`uniform`]: the same, right away from the bow too;
//! - [`background`]: light that never was in the drop, and that of high orders;
//! - [`partial`], [`mie`], [`debye`]: a sphere exactly, all its light or one order alone;
//! - [`drops`]: sizes of drops in rain, and what they take from a beam.

pub mod air;
pub mod airy;
pub mod background;
pub mod beam;
pub mod colour;
pub mod debye;
pub mod drops;
pub mod fresnel;
pub mod mie;
pub mod partial;
pub mod population;
pub mod profile;
pub mod ray;
pub mod uniform;
pub mod water;
