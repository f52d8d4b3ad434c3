//! rainward says where, when and how well a rainbow will stand in the sky.
//!
//! The rooms, each using only those above it:
//! - [`bounds`]: the table of ranges, by which everything from outside is checked; [`clock`]: the time, handed in.
//! - [`optics`]: light in one drop and in rain: refractive index, rays, extinction.
//! - [`sky`]: directions for an observer: Sun, refraction, antisolar point, bow circle, horizon, skyline, searches in time.
//! - [`weather`]: feeds (fetch, cache, formats) and fields (what they say at a place and time).
//! - [`outlook`]: sky and weather into chance, prominence, timeline and windows.
//! - [`demo`]: an invented coast under invented showers; [`config`]: the one reader of configuration.
//! - [`service`]: HTTP: routes, problems, page.

pub mod bounds;
pub mod clock;
pub mod config;
pub mod demo;
pub mod optics;
pub mod outlook;
pub mod service;
pub mod sky;
pub mod weather;
