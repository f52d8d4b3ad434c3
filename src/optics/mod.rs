//! Light in one drop and in rain: what a bow looks like and how well it stands out.
//!
//! Everything here is a pure function of numbers: no clock, no I/O. Tables are made on first use and never change.
//! Wavelengths are in micrometres in vacuum, angles in degrees, rain in mm/h.
//!
//! The parts, each using only those above it:
//!
//! - [`air`], [`water`]: refractive index;
//! - [`ray`]: the stationary (Descartes) ray of a bow of any order; [`fresnel`]: what surfaces reflect and let through;
//! - [`airy`]: the bow of one drop by Airy's theory; [`uniform`]: the same, right away from the bow too;
//! - [`partial`], [`mie`], [`debye`]: a sphere exactly, all its light or one order alone;
//! - [`background`]: light that never was in the drop, and that of high orders;
//! - [`drops`], [`population`]: sizes of drops, and what they take from a beam;
//! - [`averages`], [`profile`]: many drops under the Sun's disc, in one wavelength;
//! - [`beam`], [`colour`], [`white`]: sunlight through the air, and the bow in its colours;
//! - [`scene`]: what stands beside and behind, and so how well the bow stands out;
//! - [`light`]: the whole answer on light.

pub mod air;
pub mod airy;
pub mod averages;
pub mod background;
pub mod beam;
pub mod colour;
pub mod debye;
pub mod drops;
pub mod fresnel;
pub mod light;
pub mod mie;
pub mod partial;
pub mod population;
pub mod profile;
pub mod ray;
pub mod scene;
pub mod uniform;
pub mod water;
pub mod white;
